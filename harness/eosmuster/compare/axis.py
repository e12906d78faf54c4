"""The temperatures at which a block's deviations are known before its windows are looked for."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass

import numpy as np

from eosmuster.compare.roots import Ints
from eosmuster.errors import InputError
from eosmuster.record import WINDOW_ENDS, Floats

END = {name: code for code, name in enumerate(WINDOW_ENDS)}

STEP_ENDS = ("undecided", "limit_step", "reference_limit")
"""What a step may be, the weaker first: where two steps coincide the stronger one names the end."""


@dataclass(frozen=True)
class Axis:
    """The nodes of a block along temperature.

    All states, and every step twice: once as the end of what lies below and once as the start of what lies
    above. A step is a temperature where the margin jumps for a known reason.

    Attributes
    ----------
    temperature : (N,), K, rising; equal only at the two nodes of a step
    lookup : (N,), K: the same, moved by 1e-9 of itself off a step to the side the node stands for. Look up
        limit and uncertainty here, and everything else at `temperature`
    state : (N,), number of the state; -1 where a step lies between states
    step : (N-1,), between node i and i + 1: -1, or at a step the code in `WINDOW_ENDS` of what it is
    """

    temperature: Floats
    lookup: Floats
    state: Ints
    step: Ints

    @classmethod
    def of(cls, states: Floats, steps: Iterable[tuple[float, str]] = ()) -> Axis:
        """Lay the nodes for given states and steps.

        Parameters
        ----------
        states : (n,), K, strictly rising
        steps : temperature and kind of each step: ``limit_step`` (the limit changes), ``undecided`` (only the
            uncertainty changes) or ``reference_limit`` (there are no reference values beyond). Steps outside
            the states are left out

        Raises
        ------
        InputError
            states that do not rise, or an unknown kind of step

        Examples
        --------
        >>> axis = Axis.of(np.array([300.0, 310.0, 320.0]), [(315.0, "limit_step"), (400.0, "limit_step")])
        >>> axis.temperature.tolist(), axis.state.tolist(), axis.step.tolist()
        ([300.0, 310.0, 315.0, 315.0, 320.0], [0, 1, -1, -1, 2], [-1, -1, 1, -1])
        """
        if not (len(states) and (np.diff(states) > 0).all()):
            raise InputError(f"states {states.tolist()} are not valid: strictly rising temperatures are")
        kinds = strongest(steps, STEP_ENDS)
        at = np.array([t for t in kinds if states[0] <= t <= states[-1]], float)
        inner = at[(at > states[0]) & (at < states[-1])]
        # a state at a step gives both of its nodes
        temperature = np.sort(np.concatenate([states[~np.isin(states, inner)], inner, inner]))
        step = np.full(len(temperature) - 1, -1, np.intp)
        doubled = np.flatnonzero(np.diff(temperature) == 0)
        step[doubled] = [END[kinds[t]] for t in temperature[doubled].tolist()]
        side = np.zeros(len(temperature))
        side[doubled], side[doubled + 1] = -1.0, 1.0
        side[0], side[-1] = side[0] + (states[0] in at), side[-1] - (states[-1] in at)
        state = np.searchsorted(states, temperature)
        return cls(temperature, temperature * (1 + 1e-9 * side), _known(state, states, temperature), step)


def strongest(steps: Iterable[tuple[float, str]], order: Sequence[str]) -> dict[float, str]:
    """Give the kind of the step at each place: of several the last in `order`; raise `InputError` for another one."""
    kinds: dict[float, str] = {}
    for place, kind in steps:
        if kind not in order:
            raise InputError(f"step kind {kind!r} is unknown (valid: {', '.join(order)})")
        kinds[float(place)] = max(kinds.get(float(place), kind), kind, key=order.index)
    return kinds


def _known(state: Ints, states: Floats, temperature: Floats) -> Ints:
    return np.where(states[np.minimum(state, len(states) - 1)] == temperature, state, -1)

"""Consistency of alpha functions: positive, falling, convex, and with a negative third derivative.

The conditions are those of Le Guennec, Lasala, Privat and Jaubert, Fluid Phase Equilib. 427 (2016) 513: alpha and
its first two derivatives exist and are continuous, alpha > 0, alpha' < 0, alpha'' > 0 and alpha''' < 0 at every
temperature.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from types import MappingProxyType
from typing import TypeAlias

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

Jet: TypeAlias = tuple[Floats, Floats, Floats]

RULES = ("positive", "falling", "convex", "third derivative negative", "continuous")
BROKEN = {
    "positive": "alpha is not positive",
    "falling": "alpha does not fall",
    "convex": "alpha is not convex",
    "third derivative negative": "alpha''' is not negative",
    "continuous": "alpha jumps",
}
"""How a broken rule is said."""

LOWEST, HIGHEST, STEP = 0.2, 10.0, 0.01

_SPREAD = 4e-3  # of Tr: wide enough that the third difference stands 1e5 above rounding
_NOISE = 1e-6  # a derivative smaller than this share of its scale says nothing

JUMP = 2e-4
"""Share of a derivative by which it has to jump at a joint to be reported (ours): where a publication prints other
constants above Tc, as Twu, Coon and Cunningham do, both sides meet to their printed digits only, within 1e-4."""

_DERIVATIVES = ("alpha", "alpha'", "alpha''")


@dataclass(frozen=True)
class Breach:
    """A rule that is broken, the reduced temperatures between which it is first broken, and how it is said."""

    rule: str
    from_reduced: float
    to_reduced: float
    what: str


def reduced_temperatures(highest: float = HIGHEST) -> Floats:
    """Grid on which the rules are checked."""
    return np.arange(LOWEST, highest + STEP / 2, STEP)


def breaches(
    alpha: Callable[[Floats], Floats],
    highest: float = HIGHEST,
    joints: Mapping[float, tuple[Jet, Jet]] = MappingProxyType({}),
) -> tuple[Breach, ...]:
    """Find the rules that an alpha function of Tr breaks, each with its first stretch.

    Parameters
    ----------
    alpha : reduced temperature -> alpha
    highest : reduced temperature up to which the function is meant to be used
    joints : reduced temperature at which one formula takes over from another -> alpha - 1 and its first and second
        derivative with respect to ln(T) of the one below and the one above. What jumps there is told with its size

    Examples
    --------
    >>> [b] = breaches(lambda tr: (1.0 + 0.5 * (1.0 - np.sqrt(tr))) ** 2, 20.0)   # turns up at (1 + 1/m)**2 = 9
    >>> b.rule, round(b.from_reduced, 2)
    ('falling', 9.0)
    """
    tr = reduced_temperatures(highest)
    for joint in joints:  # differences across a joint are no derivatives
        tr = tr[np.abs(tr - joint) > 2.0 * _SPREAD * tr]
    broken = _broken(alpha, tr)
    found = [Breach(rule, *_first_stretch(tr, broken[rule]), BROKEN[rule]) for rule in RULES if broken[rule].any()]
    return (
        *found,
        *(Breach("continuous", at, at, what) for at, pair in joints.items() if (what := _jump(at, *pair))),
    )


def _broken(alpha: Callable[[Floats], Floats], tr: Floats) -> dict[str, NDArray[np.bool_]]:
    """Mark by rule where it is broken, from differences over `_SPREAD`."""
    h = _SPREAD * tr
    below2, below, here, above, above2 = (alpha(tr + k * h) for k in (-2, -1, 0, 1, 2))
    first = (below2 - 8.0 * below + 8.0 * above - above2) / (12.0 * h)
    second = (above - 2.0 * here + below) / h**2
    third = (above2 - 2.0 * above + 2.0 * below - below2) / (2.0 * h**3)
    scale = np.abs(here)
    flat = np.abs(first) <= _NOISE * scale / tr  # where alpha is constant the higher rules say nothing more
    return {
        "positive": ~(here > 0.0),
        "falling": first > -_NOISE * scale / tr,
        "convex": (second < _NOISE * scale / tr**2) & ~flat,
        "third derivative negative": (third > -_NOISE * scale / tr**3) & ~flat,
        "continuous": _jumps(here),
    }


def _jump(at: float, below: Jet, above: Jet) -> str:
    """Say which of alpha and its first two derivatives with respect to Tr jump at a joint; "" if none does.

    Examples
    --------
    >>> _jump(1.0, (0.0, -0.8, 0.4), (0.0, -0.8, 0.4)), _jump(1.0, (0.0, -0.8, 0.4), (0.0, -0.7, 0.5))
    ('', "alpha' jumps by +0.1, from -0.8 to -0.7")
    """
    sides = [_derivatives(at, jet) for jet in (below, above)]
    sizes = [
        f"{name} jumps by {high - low:+.3g}, from {low:.4g} to {high:.4g}"
        for name, low, high in zip(_DERIVATIVES, *sides, strict=True)
        if abs(high - low) > JUMP * max(abs(low), abs(high))
    ]
    return "; ".join(sizes)


def _derivatives(at: float, jet: Jet) -> tuple[float, float, float]:
    """Turn derivatives with respect to ln(T) into those with respect to Tr."""
    excess, first, second = (float(x) for x in jet)
    return 1.0 + excess, first / at, (second - first) / at**2


def _jumps(values: Floats) -> NDArray[np.bool_]:
    """Mark steps between neighbours that stand out against both sides."""
    step = np.abs(np.diff(values))
    usual = np.maximum(np.r_[step[:1], step[:-1]], np.r_[step[1:], step[-1:]])
    jump = ~(step <= 5.0 * usual + 1e-12)
    return np.asarray(np.r_[False, jump], bool)


def _first_stretch(tr: Floats, broken: NDArray[np.bool_]) -> tuple[float, float]:
    start = int(np.argmax(broken))
    kept = np.flatnonzero(~broken[start:])
    stop = start + int(kept[0]) - 1 if kept.size else tr.size - 1
    return float(tr[start]), float(tr[stop])

"""Which limit governs a state: the most specific rule that covers it, and of equals the later one.

The order of precedence is `eosmuster.plan.schema.LEVELS`:
default < property < property and range < class < class and range < component < component and range.
"""

from __future__ import annotations

import itertools
import math
from collections.abc import Iterable, Sequence
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.plan.schema import LEVELS, Floats, Limit, ToleranceRule

BORDER_ROUNDING = 1e-12
"""A reduced temperature this close (relative) below a border counts as on it: 0.7 Tc / Tc need not be 0.7."""


def limit_pct(
    rules: Iterable[ToleranceRule],
    component: Component,
    property: str,  # noqa: A002 - the word of the plan
    reduced_temperature: Floats,
    reference: Floats,
) -> Floats:
    """Give the limit at each state in percent of the reference value.

    Parameters
    ----------
    rules : a plan's `tolerances` (its default rules included)
    component : for its name, class and molar mass
    property : a key of `eosmuster.quantities.PROPERTIES`
    reduced_temperature : T / Tc, shape (n,)
    reference : SI value, shape (n,); absolute limits are expressed in percent of it

    Returns
    -------
    shape (n,); NaN where no rule covers the state, where the state itself is NaN, and for an absolute limit
    where the reference is NaN

    Examples
    --------
    >>> c = Component("x", critical_temperature=400.0, critical_pressure=4e6, acentric_factor=0.1)
    >>> rule = ToleranceRule("saturation_pressure", Limit(2.0, "percent"), "property")
    >>> tr = np.array([0.5, 0.8])
    >>> limit_pct([rule], c, "saturation_pressure", tr, np.array([1e4, 1e5])).tolist()
    [2.0, 2.0]
    """
    reference = np.asarray(reference, dtype=np.float64)
    result = np.full(reference.shape, np.nan)
    for rule in _least_specific_first(rules, component, property):
        here = _covers(rule, np.asarray(reduced_temperature, dtype=np.float64))
        result[here] = rule.limit.molar(component).percent_of(reference[here])
    return result


def governing_rule(
    rules: Iterable[ToleranceRule],
    component: Component,
    property: str,  # noqa: A002
    reduced_temperature: float,
) -> ToleranceRule | None:
    """Return the one rule that governs a state, or None where no rule covers it."""
    at = np.array([reduced_temperature])
    covering = [r for r in _least_specific_first(rules, component, property) if _covers(r, at)[0]]
    return covering[-1] if covering else None


def limit_steps(
    rules: Iterable[ToleranceRule],
    component: Component,
    property: str,  # noqa: A002
) -> tuple[float, ...]:
    """Return the reduced temperatures at which the limit jumps, in ascending order.

    A border at which the governing limit stays the same is no step.

    Examples
    --------
    >>> from eosmuster.plan.limits import DEFAULT_RULES
    >>> c = Component("x", critical_temperature=400.0, critical_pressure=4e6, acentric_factor=0.1)
    >>> limit_steps(DEFAULT_RULES, c, "saturation_pressure")
    (0.55, 0.7)
    """
    mine = _least_specific_first(rules, component, property)
    borders = sorted({b for r in mine for b in _borders(r)})
    between = _midpoints(borders)
    limits = [_limit_of(governing_rule(mine, component, property, tr)) for tr in between]
    return tuple(b for b, lower, upper in zip(borders, limits, limits[1:], strict=False) if lower != upper)


def rules_in_use(
    rules: Iterable[ToleranceRule], components: Iterable[Component], properties: Iterable[str]
) -> tuple[ToleranceRule, ...]:
    """Return the rules that govern some state of some component and property, in the order given.

    Examples
    --------
    >>> from eosmuster.plan.limits import DEFAULT_RULES
    >>> c = Component("x", critical_temperature=400.0, critical_pressure=4e6, acentric_factor=0.1)
    >>> own = ToleranceRule("liquid_density", Limit(2.0, "percent"), "property")
    >>> [str(r.limit) for r in rules_in_use([*DEFAULT_RULES, own], [c], ["liquid_density"])]
    ['2 %']
    """
    rules = tuple(rules)
    used: set[int] = set()
    for component, name in itertools.product(tuple(components), tuple(properties)):
        mine = _least_specific_first(rules, component, name)
        for tr in _midpoints(sorted({b for r in mine for b in _borders(r)})) or [0.5]:
            governing = governing_rule(mine, component, name, tr)
            used |= {i for i, rule in enumerate(rules) if rule is governing}
    return tuple(rule for i, rule in enumerate(rules) if i in used)


def _least_specific_first(rules: Iterable[ToleranceRule], component: Component, name: str) -> list[ToleranceRule]:
    """Return the rules that can apply, so ordered that the last one covering a state governs it."""
    mine = [r for r in rules if r.property == name and _concerns(r, component)]
    return sorted(mine, key=lambda r: LEVELS.index(r.level))  # stable: of equals the later one stays later


def _concerns(rule: ToleranceRule, component: Component) -> bool:
    return rule.family in ("", component.family) and rule.component in ("", component.name)


def _covers(rule: ToleranceRule, reduced_temperature: Floats) -> NDArray[np.bool_]:
    nudged = reduced_temperature * (1.0 + BORDER_ROUNDING)
    covered: NDArray[np.bool_] = (nudged >= rule.above_reduced_temperature) & (
        nudged < rule.below_reduced_temperature
    )
    return covered


def _borders(rule: ToleranceRule) -> Iterable[float]:
    ends = (rule.above_reduced_temperature, rule.below_reduced_temperature)
    return (b for b in ends if 0.0 < b < math.inf)


def _midpoints(borders: Sequence[float]) -> list[float]:
    if not borders:
        return []
    edges = [0.0, *borders, 2.0 * borders[-1]]
    return [0.5 * (a + b) for a, b in pairwise(edges)]


def _limit_of(rule: ToleranceRule | None) -> Limit | None:
    return rule.limit if rule else None

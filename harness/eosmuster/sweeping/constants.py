"""Constants from a cited critical table instead of the reference library's record, where a plan asks for them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from eosmuster.components import Component, catalogue
from eosmuster.plan.constants import LIBRARY, critical_tables
from eosmuster.plan.schema import Plan
from eosmuster.sources import critical

_OF_CANDIDATES = ("critical_temperature", "critical_pressure", "acentric_factor")


@dataclass(frozen=True)
class Chosen:
    """The components as the candidates see them.

    Attributes
    ----------
    components : in the order of the plan
    replaced : names of those whose constants come from the cited table
    left : (name, why) of those that keep the library's constants although the plan asks for others
    """

    components: tuple[Component, ...]
    replaced: frozenset[str]
    left: tuple[tuple[str, str], ...]


def choose(plan: Plan) -> Chosen:
    """Give the components with the constants the plan asks for.

    The cited table has to give Tc and pc; where it has no acentric factor or critical density, the library's stay.
    Of a series of tables the first part that gives both is taken. A component of the user's own keeps what the plan
    says of it.
    """
    if plan.constants == LIBRARY:
        return Chosen(plan.components, frozenset(), ())
    tables = critical_tables()[plan.constants]
    chosen = [_replaced(component, tables) for component in plan.components]
    pairs = list(zip(plan.components, chosen, strict=True))
    left = tuple((c.name, f"no Tc and pc in {plan.constants}") for c, new in pairs if new is c and c.library_name)
    return Chosen(tuple(chosen), frozenset(c.name for c, new in pairs if new is not c), left)


def _replaced(component: Component, tables: Sequence[str]) -> Component:
    rows: Sequence[critical.CriticalConstants] = critical.critical_constants(component.cas) if component.cas else ()
    for row in rows:
        if row.citation in tables and row.critical_temperature and row.critical_pressure:
            names = ("critical_temperature", "critical_pressure", "critical_density", "acentric_factor")
            given = {name: getattr(row, name) for name in names if getattr(row, name) is not None}
            # it stays the fluid that the library knows: the ideal gas's part of caloric properties is the reference's
            return replace(component, **given, sources={**component.sources, **dict.fromkeys(given, row.source)})
    return component


def from_library(component: Component) -> bool:
    """Tell whether any of the constants that make a candidate, Tc, pc or omega, is the library's own.

    Examples
    --------
    >>> from eosmuster.components import find
    >>> propane = find("propane")
    >>> whole = dict.fromkeys(("critical_temperature", "critical_pressure", "acentric_factor"), "a table")
    >>> from_library(propane), from_library(replace(propane, sources={**propane.sources, **whole}))
    (True, False)
    """
    known = catalogue().get(component.library_name)
    return known is not None and any(component.sources.get(name) == known.sources[name] for name in _OF_CANDIDATES)

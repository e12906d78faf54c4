"""Constants from a cited critical table instead of the reference library's record, where a plan asks for them."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace

from eosmuster.components import Component
from eosmuster.errors import InputError, suggestion
from eosmuster.plan.schema import Plan
from eosmuster.sources import critical

LIBRARY = "library"
"""The reference library's own record: what a plan uses unless it says otherwise."""


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
    A component of the user's own keeps what the plan says of it.

    Raises
    ------
    InputError : no table has that name
    """
    if plan.constants == LIBRARY:
        return Chosen(plan.components, frozenset(), ())
    known = sorted({count.source.removeprefix("critical:") for count in critical.counts()})
    if not any(name.startswith(plan.constants) for name in known):
        valid = [LIBRARY, *known]
        raise InputError(
            f"{plan.path or plan.name}: constants.source = {plan.constants!r} is unknown; "
            f"{suggestion(plan.constants, valid, most=20)}"
        )
    chosen = [_replaced(component, plan.constants) for component in plan.components]
    pairs = list(zip(plan.components, chosen, strict=True))
    left = tuple((c.name, f"no Tc and pc in {plan.constants}") for c, new in pairs if new is c and c.library_name)
    return Chosen(tuple(chosen), frozenset(c.name for c, new in pairs if new is not c), left)


def _replaced(component: Component, source: str) -> Component:
    rows: Sequence[critical.CriticalConstants] = critical.critical_constants(component.cas) if component.cas else ()
    for row in rows:
        if row.citation.startswith(source) and row.critical_temperature and row.critical_pressure:
            names = ("critical_temperature", "critical_pressure", "critical_density", "acentric_factor")
            given = {name: getattr(row, name) for name in names if getattr(row, name) is not None}
            sources = {**component.sources, **dict.fromkeys(given, row.source)}
            whole = "acentric_factor" in given  # then nothing is left of the library's record
            library = "" if whole else component.library_name
            return replace(component, **given, sources=sources, library_name=library)
    return component

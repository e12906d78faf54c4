"""The small tables of a plan: ``[decision]``, ``[references]``, ``[gate]`` and ``[display]``."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import asdict

from eosmuster.errors import InputError, suggestion
from eosmuster.plan.contested import KEY as CONTESTED_KEY
from eosmuster.plan.schema import (
    DECISION_RULES,
    FIRST_REFERENCE,
    GATE_REASONS,
    MEASURED,
    REFERENCES,
    UNCERTAINTIES,
    Decision,
    Display,
    Gate,
    Plan,
)
from eosmuster.plan.selection import ALL, find_family
from eosmuster.plan.tables import Finder, Table
from eosmuster.quantities import UNITS, shown

_FAMILY = "family:"
_DISPLAY_UNITS = {
    "temperature": tuple(UNITS["temperature"]),
    "pressure": tuple(UNITS["pressure"]),
    "density": (*UNITS["mass_density"], *UNITS["density"]),
}


def read_decision(plan: Table) -> Decision:
    """Read the decision rule; what is not said stays as in `Decision`."""
    table, usual = plan.table("decision"), Decision()
    table.check_keys(asdict(usual))
    return Decision(
        rule=table.one_of("rule", DECISION_RULES, usual.rule),
        coverage_factor=table.number("coverage_factor", usual.coverage_factor, above=0.0, to=10.0),
        unfit_ratio=table.number("unfit_ratio", usual.unfit_ratio, above=0.0, to=1.0),
        uncertainty=table.one_of("uncertainty", UNCERTAINTIES, usual.uncertainty),
    )


def read_files(plan: Table) -> tuple[str, ...]:
    """Read the patterns of measured files."""
    return tuple(plan.table("references").texts("files"))


def read_references(plan: Table) -> tuple[str, ...]:
    """Read what the candidates are judged against."""
    table = plan.table("references")
    table.check_keys(("use", "files", CONTESTED_KEY))
    used = table.chosen("use", REFERENCES, REFERENCES)
    if not used:
        raise InputError(f"{table.at('use')}: no reference, so nothing can be judged; valid: {', '.join(REFERENCES)}")
    return used


def read_gate(plan: Table, swept: Plan, find_component: Finder) -> Gate:
    """Read what the gate fails on, and which rows it asks.

    Parameters
    ----------
    swept : the plan so far; a gate can name only what its plan sweeps
    find_component : (name as written, where) -> the component's own name

    Raises
    ------
    InputError : a name that the plan does not sweep, no reason to fail, or an empty list
    """
    table, usual = plan.table("gate"), Gate()
    table.check_keys(asdict(usual))
    reasons = table.chosen("fail_on", GATE_REASONS, usual.fail_on)
    if not reasons:
        raise InputError(f"{table.at('fail_on')}: a gate that cannot fail; valid: {', '.join(GATE_REASONS)}")
    references = (*swept.references_use, *((MEASURED,) if swept.reference_files else ()), FIRST_REFERENCE)
    components = {c.name: c.family for c in swept.components}

    def named(text: str) -> tuple[str, ...]:
        return _components(text, components, find_component, table.at("components"))

    return Gate(
        fail_on=reasons,
        components=_asked(table, "components", tuple(components), named),
        candidates=_asked(table, "candidates", swept.models),
        properties=_asked(table, "properties", swept.properties),
        references=_asked(table, "references", references),
    )


def _asked(
    table: Table, key: str, valid: tuple[str, ...], named: Callable[[str], tuple[str, ...]] | None = None
) -> tuple[str, ...]:
    """Read names out of the valid ones, in any case; "all" is what a missing key means: no restriction."""
    texts = table.texts(key)
    if key in table.data and not texts:
        raise InputError(f"{table.at(key)}: a gate that asks nothing; leave the key out, or name {key}")
    own = {name.casefold(): name for name in valid}
    found: dict[str, None] = {}
    for text in texts:
        if text.casefold() == ALL:
            return ()
        names = (own[text.casefold()],) if text.casefold() in own else (named(text) if named else ())
        if not names:
            what = f"{shown(text)} is none of the plan's {key}"
            raise InputError(f"{table.at(key)}: {what}; {suggestion(text[:60], valid, most=30)}")
        found |= dict.fromkeys(names)
    return tuple(found)


def _components(text: str, swept: Mapping[str, str], find_component: Finder, where: str) -> tuple[str, ...]:
    """Resolve a class, an alias or a CAS number to components of the plan (name -> class); none if there is none."""
    try:
        if text.casefold().startswith(_FAMILY):
            family = find_family(text[len(_FAMILY) :].strip(), where)
            return tuple(name for name, its in swept.items() if its == family)
        name = find_component(text, where)
    except InputError:
        return ()
    return (name,) if name in swept else ()


def read_display(plan: Table) -> Display:
    """Read the units that people see."""
    table, usual = plan.table("display"), asdict(Display())
    table.check_keys(usual)
    return Display(**{key: table.one_of(key, units, usual[key]) for key, units in _DISPLAY_UNITS.items()})

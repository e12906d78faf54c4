"""TOML -> Plan: every key is known, every name resolved, every number in SI, or one sentence says why not."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace
from pathlib import Path

from eosmuster.components import Component
from eosmuster.errors import InputError
from eosmuster.plan import own, selection, settings
from eosmuster.plan.files import parse_toml, read_text
from eosmuster.plan.limits import DEFAULT_RULES
from eosmuster.plan.rules import read_rules
from eosmuster.plan.schema import Plan, ToleranceRule
from eosmuster.plan.states import read_states
from eosmuster.plan.tables import Table
from eosmuster.quantities import PROPERTIES

MOST_POINTS = 20_000_000
"""Components x models x properties x states of one plan."""

_KEYS = (
    "title",
    "service",
    "components",
    "models",
    "properties",
    "states",
    "tolerance",
    "decision",
    "constants",
    "references",
    "gate",
    "display",
    "component",
    "model",
)


def load_plan(path: str | Path) -> Plan:
    """Read a plan from a file.

    Parameters
    ----------
    path : a UTF-8 TOML file of at most 5 MB; its stem becomes the plan's name

    Raises
    ------
    InputError : the file cannot be read, or anything `parse_plan` refuses
    """
    path = Path(path)
    return replace(parse_plan(read_text(path), path.stem, str(path)), path=str(path))


def parse_plan(text: str, name: str, where: str) -> Plan:
    """Read a plan from its text.

    Parameters
    ----------
    text : the TOML
    name : of the plan
    where : file or origin; every message begins with it

    Raises
    ------
    InputError : invalid TOML, an unknown key, name or unit, a value out of range, or an empty sweep
    """
    table = Table(parse_toml(text, where), where)
    table.check_keys(_KEYS)
    own_components = own.read_components(table, selection.find_family)
    find_component = selection.component_finder(own_components)
    own_models = own.read_models(table, find_component)
    components = selection.select_components(table, own_components)
    properties = _read_properties(table)
    rules = read_rules(table, find_component, selection.find_family)
    plan = Plan(
        name=name,
        title=table.text("title", "") or name,
        service=table.text("service", ""),
        path="",
        text=text,
        components=components,
        models=selection.select_models(table, tuple(m.name for m in own_models)),
        own_models=own_models,
        properties=properties,
        grid=read_states(table),
        tolerances=(*DEFAULT_RULES, *rules),
        decision=settings.read_decision(table),
        references_use=settings.read_references(table),
        gate_fail_on=settings.read_gate(table),
        display=settings.read_display(table),
        constants=settings.read_constants(table),
        reference_files=settings.read_files(table),
        left_out=(*selection.left_out(table), *_idle_rules(rules, components, properties)),
    )
    return _refuse_too_many(plan, where)


def _read_properties(plan: Table) -> tuple[str, ...]:
    found = plan.chosen("properties", (*PROPERTIES, selection.ALL), ())
    if not found:
        raise InputError(
            f"{plan.at('properties')}: an empty sweep: no property; name some out of {', '.join(PROPERTIES)}"
        )
    return tuple(PROPERTIES) if selection.ALL in found else found


def _idle_rules(
    rules: Iterable[ToleranceRule], components: tuple[Component, ...], properties: tuple[str, ...]
) -> Iterable[tuple[str, str]]:
    """Say which limits of the plan meet nothing that it sweeps: allowed, but not silently."""
    names, families = {c.name for c in components}, {c.family for c in components}
    for rule in rules:
        what = f"limit {rule.limit} for {rule.property}"
        if rule.property not in properties:
            yield what, "the plan does not judge this property"
        elif rule.component and rule.component not in names:
            yield f"{what} of {rule.component}", "the component is not in the plan"
        elif rule.family and rule.family not in families:
            yield f"{what} of class {rule.family}", "no component of the plan is of this class"


def _refuse_too_many(plan: Plan, where: str) -> Plan:
    sizes = (len(plan.components), len(plan.models), len(plan.properties), plan.grid.points)
    points = sizes[0] * sizes[1] * sizes[2] * sizes[3]
    if points > MOST_POINTS:
        product = "{} components x {} models x {} properties x {} states".format(*sizes)
        raise InputError(
            f"{where}: asks for {product} = {points} points; the most is {MOST_POINTS}, so split the plan"
        )
    return plan

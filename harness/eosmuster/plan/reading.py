"""TOML -> Plan: every key is known, every name resolved, every number in SI, or one sentence says why not."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import replace
from pathlib import Path

from eosmuster.components import Component
from eosmuster.errors import InputError
from eosmuster.plan import own, selection, settings
from eosmuster.plan.constants import read_constants
from eosmuster.plan.contested import read_contested_above
from eosmuster.plan.files import parse_toml, read_text
from eosmuster.plan.grids import Grid
from eosmuster.plan.limits import DEFAULT_RULES
from eosmuster.plan.rules import read_rules
from eosmuster.plan.schema import Plan, ToleranceRule
from eosmuster.plan.states import check_states, read_states
from eosmuster.plan.tables import Finder, Table
from eosmuster.quantities import PROPERTIES, SATURATION, SINGLE_PHASE

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
    path : a UTF-8 TOML file of at most 5 MB; its name without ``.toml`` or ``.eos.toml`` becomes the plan's

    Raises
    ------
    InputError : the file cannot be read, or anything `parse_plan` refuses
    """
    path = Path(path)
    name = path.stem.removesuffix(".eos") or path.stem
    return replace(parse_plan(read_text(path), name, str(path)), path=str(path))


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
    plan = replace(_swept(table, own_components, find_component), name=name, title=table.text("title", "") or name)
    plan = replace(plan, text=text, gate=settings.read_gate(table, plan, find_component))
    return _refuse_too_many(plan, where)


def _swept(table: Table, own_components: tuple[Component, ...], find_component: Finder) -> Plan:
    """Read all but the gate, which can name only what the plan sweeps; the caller gives the plan its name."""
    own_models = own.read_models(table, find_component)
    components = selection.select_components(table, own_components)
    saturated, single_phase = read_states(table)
    properties = _read_properties(table, saturated is not None, single_phase is not None)
    rules = read_rules(table, find_component, selection.find_family)
    return Plan(
        name="",
        title="",
        service=table.text("service", ""),
        path="",
        text="",
        components=components,
        models=selection.select_models(table, tuple(m.name for m in own_models)),
        own_models=own_models,
        properties=properties,
        grid=saturated or Grid(),
        tolerances=(*DEFAULT_RULES, *rules),
        decision=settings.read_decision(table),
        references_use=settings.read_references(table),
        display=settings.read_display(table),
        constants=read_constants(table),
        reference_files=settings.read_files(table),
        single_phase=single_phase,
        contested_above=read_contested_above(table.table("references")),
        left_out=(*selection.left_out(table), *_idle_rules(rules, components, properties)),
    )


def _read_properties(plan: Table, saturated: bool, single_phase: bool) -> tuple[str, ...]:
    """Read the properties; ``all`` means those of every kind of state that the plan has."""
    found = plan.chosen("properties", (*PROPERTIES, selection.ALL), ())
    if not found:
        raise InputError(
            f"{plan.at('properties')}: an empty sweep: no property; name some out of {', '.join(PROPERTIES)}"
        )
    if selection.ALL in found:
        return (*(SATURATION if saturated else ()), *(SINGLE_PHASE if single_phase else ()))
    check_states(found, saturated, single_phase, plan.at("properties"))
    return found


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
    pairs = len(plan.components) * len(plan.models)
    single = sum(PROPERTIES[name].kind == "single-phase" for name in plan.properties)
    kinds = [
        (len(plan.properties) - single, "properties", plan.grid.points),
        (single, "single-phase properties", plan.single_phase.points if plan.single_phase else 0),
    ]
    points = sum(pairs * count * states for count, _, states in kinds)
    if points > MOST_POINTS:
        product = " + ".join(f"{count} {what} x {states} states" for count, what, states in kinds if count)
        asked = f"{len(plan.components)} components x {len(plan.models)} models x {product} = {points} points"
        raise InputError(f"{where}: asks for {asked}; the most is {MOST_POINTS}, so split the plan")
    return plan

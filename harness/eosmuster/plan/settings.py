"""The small tables of a plan: ``[decision]``, ``[constants]``, ``[references]``, ``[gate]`` and ``[display]``."""

from __future__ import annotations

from dataclasses import asdict

from eosmuster.errors import InputError
from eosmuster.plan.schema import DECISION_RULES, GATE_REASONS, REFERENCES, UNCERTAINTIES, Decision, Display
from eosmuster.plan.tables import Table
from eosmuster.quantities import UNITS

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


def read_constants(plan: Table) -> str:
    """Read where the constants of catalogued components come from; the tables are known to the sweep."""
    table = plan.table("constants")
    table.check_keys(("source",))
    return table.text("source", "library")


def read_files(plan: Table) -> tuple[str, ...]:
    """Read the patterns of measured files."""
    return tuple(plan.table("references").texts("files"))


def read_references(plan: Table) -> tuple[str, ...]:
    """Read what the candidates are judged against."""
    table = plan.table("references")
    table.check_keys(("use", "files"))
    used = table.chosen("use", REFERENCES, REFERENCES)
    if not used:
        raise InputError(f"{table.at('use')}: no reference, so nothing can be judged; valid: {', '.join(REFERENCES)}")
    return used


def read_gate(plan: Table) -> tuple[str, ...]:
    """Read what the gate fails on."""
    table = plan.table("gate")
    table.check_keys(("fail_on",))
    reasons = table.chosen("fail_on", GATE_REASONS, ("outside", "unsolved"))
    if not reasons:
        raise InputError(f"{table.at('fail_on')}: a gate that cannot fail; valid: {', '.join(GATE_REASONS)}")
    return reasons


def read_display(plan: Table) -> Display:
    """Read the units that people see."""
    table, usual = plan.table("display"), asdict(Display())
    table.check_keys(usual)
    return Display(**{key: table.one_of(key, units, usual[key]) for key, units in _DISPLAY_UNITS.items()})

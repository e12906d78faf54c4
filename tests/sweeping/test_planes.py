"""Single-phase states of a plan: references, predictions, notes, and the phase rule's two coordinates."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

from eosmuster.components import find
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind
from eosmuster.quantities import PROPERTIES, SINGLE_PHASE
from eosmuster.record import POINT_VERDICTS, Block, Record
from eosmuster.singlephase import solver

Swept = Callable[[str], Any]

PLAN = """
components = ["propane"]
models = ["PR", "SRK", "tc-PR-2018"]
properties = {properties}
[states.single_phase]
temperature = [280.0, 300.0, 320.0, 340.0, 380.0, 420.0]
pressure = ["1 bar", "8 bar", "20 bar", "60 bar"]
phase = "{phase}"
supercritical_alpha = "{rule}"
regions = "no"
[references]
use = ["coolprop"]
"""

SOME = '["density", "compressibility_factor", "residual_enthalpy", "isobaric_heat_capacity", "speed_of_sound"]'

LIBRARY_OUTPUT = {
    "density": "Dmolar",
    "compressibility_factor": "Z",
    "isobaric_heat_capacity": "Cpmolar",
    "speed_of_sound": "speed_of_sound",
}
"""What the library's own high-level interface calls the same."""


@pytest.fixture(scope="module")
def records(swept: Swept) -> dict[str, Record]:
    found = {}
    for phase in ("liquid", "vapor", "supercritical", "stable"):
        names = '"all"' if phase == "liquid" else SOME
        found[phase] = swept(PLAN.format(phase=phase, rule="own", properties=names)).record
    return found


def block(record: Record, name: str) -> Block:
    [found] = [b for b in record.blocks if b.property == name]
    return found


@pytest.mark.parametrize("phase", ["liquid", "vapor", "supercritical", "stable"])
def test_every_temperature_meets_every_pressure(records: dict[str, Record], phase: str) -> None:
    record = records[phase]
    assert len(record.blocks) == len(SINGLE_PHASE if phase == "liquid" else SOME.split(","))
    for found in record.blocks:
        assert found.temperature.tolist() == [280.0, 300.0, 320.0, 340.0, 380.0, 420.0] * 4
        assert found.pressure.tolist() == np.repeat([1e5, 8e5, 20e5, 60e5], 6).tolist()
        assert (found.phase, found.unit) == (phase, PROPERTIES[found.property].unit)
        assert found.predicted.shape == (3, 24)


@pytest.mark.parametrize("name", LIBRARY_OUTPUT)
def test_the_reference_is_the_library(records: dict[str, Record], name: str) -> None:
    """1e-8: a flash of the high-level interface is converged to that, not further."""
    from CoolProp.CoolProp import PropsSI

    found = block(records["stable"], name)
    expected = [
        PropsSI(LIBRARY_OUTPUT[name], "T", t, "P", p, "Propane")
        for t, p in zip(found.temperature, found.pressure, strict=True)
    ]
    assert found.reference == pytest.approx(expected, rel=1e-8)


def test_where_the_stated_phase_is_not_stable_nothing_is_judged(records: dict[str, Record]) -> None:
    """Propane boils at 5.8, 10.0, 16.0 and 24.3 bar at 280, 300, 320 and 340 K, and its Tc is 369.89 K."""
    liquid = {(280.0, 8e5), (280.0, 20e5), (280.0, 60e5), (300.0, 20e5), (300.0, 60e5), (320.0, 20e5), (320.0, 60e5)}
    liquid |= {(340.0, 60e5)}
    subcritical = {(t, p) for t in (280.0, 300.0, 320.0, 340.0) for p in (1e5, 8e5, 20e5, 60e5)}
    hot = {(t, p) for t in (380.0, 420.0) for p in (1e5, 8e5, 20e5, 60e5)}
    gas = {(t, p) for t, p in hot if p < 42.5e5}  # propane's critical pressure
    judged = {
        "liquid": liquid,
        "vapor": subcritical - liquid | gas,
        "supercritical": hot,
        "stable": subcritical | hot,
    }
    for phase, states in judged.items():
        found = block(records[phase], "density")
        at = list(zip(found.temperature.tolist(), found.pressure.tolist(), strict=True))
        has = {state for state, value in zip(at, found.reference, strict=True) if not np.isnan(value)}
        assert has == states, phase
        missing = np.isnan(found.reference)
        assert {POINT_VERDICTS[v] for v in found.verdict[:, missing].ravel()} <= {"no_reference"}
        for at_once, name in ((found.temperature < 369.89, "stable one"), (found.temperature > 369.89, "beyond")):
            notes = {found.notes[n] for n in found.note[:, missing & at_once].ravel()}
            assert all(name in note for note in notes), phase
        for row in records[phase].summary:
            assert row.no_reference == 24 - len(states)
            assert row.points == 24


def test_predictions_are_the_models_own_with_the_ideal_gas_of_the_reference(records: dict[str, Record]) -> None:
    from CoolProp.CoolProp import PropsSI

    found = block(records["stable"], "isobaric_heat_capacity")
    parameters = bind(CATALOGUE["SRK"], [find("propane")]).parameters.take(0)
    states = solver.at_pressure(parameters, found.temperature, found.pressure, "stable")
    ideal = [PropsSI("Cp0molar", "T", t, "P", 1e5, "Propane") for t in found.temperature]
    assert found.predicted[1] == pytest.approx(ideal + states.residual_isobaric_heat_capacity, rel=1e-12)


def test_a_candidate_without_the_stated_phase_is_unsolved(swept: Swept) -> None:
    """Water boils at 149 bar at 0.95 Tc; van der Waals' boils so early that its liquid branch ends above."""
    record = swept("""
    components = ["water"]
    models = ["vdW", "PR"]
    properties = ["density", "speed_of_sound"]
    [states.single_phase]
    temperature = [614.7411999999999]
    pressure = ["150 bar"]
    phase = "liquid"
    [references]
    use = ["coolprop"]
    """).record
    for name in ("density", "speed_of_sound"):
        found = block(record, name)
        assert np.isnan(found.predicted[0]).all()
        assert POINT_VERDICTS[found.verdict[0, 0]] == "unsolved"
        assert found.notes[found.note[0, 0]] == "the candidate has no root of the stated phase there"
        assert not np.isnan(found.predicted[1]).any()
    [row] = [r for r in record.summary if (r.candidate, r.property) == ("vdW", "density")]
    assert (row.unsolved, row.verdict) == (1, "outside")


def test_the_rule_above_the_critical_temperature_changes_nothing_below_it(
    records: dict[str, Record], swept: Swept
) -> None:
    other = swept(
        PLAN.format(phase="stable", rule="Boston-Mathias", properties='["density", "isobaric_heat_capacity"]')
    ).record
    for name in ("density", "isobaric_heat_capacity"):
        own, boston = block(records["stable"], name), block(other, name)
        cold = own.temperature < 369.0
        assert np.array_equal(own.predicted[:, cold], boston.predicted[:, cold])
        assert not np.isclose(own.predicted[:, ~cold], boston.predicted[:, ~cold], rtol=1e-6).any()


def test_a_liquid_density_fit_owns_compressed_liquids_too(records: dict[str, Record]) -> None:
    for phase, expected in (("liquid", "fitted"), ("vapor", "constants")):
        found = block(records[phase], "density")
        assert dict(zip(found.candidates, found.independence, strict=True)) == {
            "PR": "constants",
            "SRK": "constants",
            "tc-PR-2018": expected,
        }


def test_absolute_limits_are_percent_of_the_reference(records: dict[str, Record]) -> None:
    found = block(records["stable"], "residual_enthalpy")
    assert found.limit_pct == pytest.approx(100.0 * 200.0 / np.abs(found.reference), rel=1e-14)


def test_statistics_name_the_pressure_of_the_largest_deviation(records: dict[str, Record]) -> None:
    found = block(records["stable"], "density")
    [row] = [r for r in records["stable"].summary if (r.property, r.candidate) == ("density", "PR")]
    worst = int(np.nanargmax(np.abs(found.deviation_pct[0])))
    assert (row.max_at_K, row.max_at_Pa) == (found.temperature[worst], found.pressure[worst])
    assert row.mean_predicted == pytest.approx(found.predicted[0].mean(), rel=1e-14)
    assert row.mean_reference == pytest.approx(found.reference.mean(), rel=1e-14)


def test_a_component_of_the_plans_own_has_no_single_phase_reference(swept: Swept) -> None:
    record = swept("""
    components = ["propane", "cut"]
    models = ["PR"]
    properties = ["density"]
    [states.single_phase]
    temperature = [300.0]
    pressure = ["1 bar"]
    [[component]]
    name = "cut"
    critical_temperature = 420.0
    critical_pressure = "37 bar"
    acentric_factor = 0.2
    molar_mass = "60 g/mol"
    source = "invented"
    """).record
    assert {b.component for b in record.blocks} == {"n-Propane"}
    why = "no reference for its single-phase states: neither the library's equations nor measured densities"
    assert ("cut", why) in record.left_out


def test_saturated_and_single_phase_states_live_in_one_plan(swept: Swept) -> None:
    record = swept("""
    components = ["propane"]
    models = ["PR"]
    properties = ["saturation_pressure", "density"]
    [states]
    temperature = [280.0, 300.0]
    [states.single_phase]
    temperature = [280.0, 300.0]
    pressure = ["1 bar", "60 bar"]
    phase = "liquid"
    [references]
    use = ["coolprop"]
    """).record
    assert [b.property for b in record.blocks] == ["saturation_pressure", "density"]
    assert {w.property for w in record.windows} == {"saturation_pressure"}

"""References as series: what is asked where, and how far each one reaches."""

from __future__ import annotations

import numpy as np
import pytest

from eosmuster.components import catalogue, find
from eosmuster.errors import NothingJudged
from eosmuster.plan.reading import parse_plan
from eosmuster.sources import handbook, library_gate
from eosmuster.sources.bibliography import bibliography
from eosmuster.sweeping.saturated import collect
from eosmuster.sweeping.series import Series, refuse_empty

PLAN = """
components = ["propane"]
models = ["PR"]
properties = [{properties}]
[states]
{states}
"""


def series(properties: str, states: str) -> dict[tuple[str, str], Series]:
    plan = parse_plan(PLAN.format(properties=properties, states=states), "p", "p.toml")
    return {(s.property, s.source): s for s in collect(plan, [])}


def test_states_and_steps_share_the_nodes() -> None:
    s = series('"saturation_pressure"', "temperature = [200.0, 250.0, 300.0]")["saturation_pressure", "coolprop"]
    tc = find("propane").critical_temperature
    assert s.nodes.temperature[s.nodes.state].tolist() == [200.0, 250.0, 300.0]
    for border in (0.55 * tc, 0.7 * tc):
        assert border in s.nodes.temperature
        assert (border, "limit_step") in s.steps
    assert (np.diff(s.nodes.temperature) > 0).all()
    assert np.isfinite(s.values).all()
    assert not s.independent_of_library


def test_states_given_by_temperature_state_no_pressure() -> None:
    for s in series('"saturation_pressure", "liquid_density"', "temperature = [250.0, 300.0]").values():
        assert not s.nodes.by_pressure
        assert np.isnan(s.nodes.pressure).all()


@pytest.mark.parametrize("name", ["saturation_pressure", "liquid_density", "boiling_temperature"])
def test_states_given_by_pressure_keep_it_to_the_last_bit(name: str) -> None:
    found = series(f'"{name}"', "pressure = ['1 bar', '10 bar']")
    own_states = {t.source for t in handbook.tables(find("propane").cas, name)}
    for (_, source), s in found.items():
        if source in own_states:
            continue
        expected = [1e5] if "antoine" in source else [1e5, 1e6]  # that correlation ends at 2 bar
        assert s.nodes.pressure[s.nodes.state].tolist() == expected, source
        # a saturation pressure cannot be asked for at a pressure: it is asked for at the temperature there
        assert s.nodes.by_pressure == (name != "saturation_pressure")


def test_correlations_keep_states_inside_their_range_only() -> None:
    found = series('"saturation_pressure"', "temperature = [160.0, 170.0, 240.0, 260.0]")
    s = found["saturation_pressure", "handbook:antoine-poling-2001"]
    assert s.nodes.temperature[s.nodes.state].tolist() == [170.0, 240.0]
    assert np.isnan(s.values[[0, -1]]).all()
    assert {168.90, 247.76} <= set(s.nodes.temperature)
    assert np.isfinite(s.values[(s.nodes.temperature >= 168.90) & (s.nodes.temperature <= 247.76)]).all()


def test_a_correlation_without_a_state_in_its_range_is_no_series() -> None:
    found = series('"saturation_pressure"', "temperature = [300.0, 340.0]")
    assert ("saturation_pressure", "handbook:antoine-poling-2001") not in found


@pytest.mark.parametrize("name", ["saturation_pressure", "boiling_temperature"])
def test_evaluators_repeat_the_values_at_the_nodes(name: str) -> None:
    for (_, source), s in series(f'"{name}"', "temperature = [200.0, 250.0, 300.0]").items():
        if s.evaluate is None:
            continue
        values, pressure = s.evaluate(s.nodes.temperature)
        assert np.array_equal(values, s.values, equal_nan=True), source
        assert np.array_equal(pressure, s.nodes.pressure, equal_nan=True) or name == "saturation_pressure", source


def test_tables_bring_their_own_states_and_have_no_windows() -> None:
    text = PLAN.replace("propane", "water").format(
        properties='"liquid_density"', states="temperature = [270.0, 500.0]"
    )
    [table] = [s for s in collect(parse_plan(text, "p", "p.toml"), []) if s.source == "handbook:iapws-r6-95"]
    # IAPWS R6-95, Table 8: saturation at 275, 450 and 625 K, of which two lie between the plan's states
    assert table.nodes.temperature.tolist() == [275.0, 450.0]
    assert table.evaluate is None
    assert not table.independent_of_library  # IAPWS-95 is the library's own equation of water
    assert table.citation in bibliography()


def test_normal_boiling_points_are_asked_at_one_atmosphere() -> None:
    found = series('"boiling_temperature"', "temperature = [200.0, 300.0]")
    s = found["boiling_temperature", "handbook:crc-95"]
    assert s.nodes.by_pressure
    assert s.nodes.pressure.tolist() == [101325.0]
    assert s.values == pytest.approx([231.04], abs=0.1)  # K; -42.1 degC


def test_the_library_is_asked_up_to_its_own_limits() -> None:
    s = series('"saturation_pressure"', "temperature = [50.0, 90.0, 360.0, 380.0]")["saturation_pressure", "coolprop"]
    limits = library_gate.limits(find("propane"))
    assert limits is not None
    assert {(limits.from_K, "reference_limit"), (limits.to_K, "reference_limit")} <= set(s.steps)
    assert {limits.from_K, limits.to_K} <= set(s.nodes.temperature)
    assert np.isfinite(s.values[s.nodes.state]).tolist() == [False, True, True, False]


def test_all_components_of_the_library_have_a_series() -> None:
    """130 pure fluids, two states each."""
    text = 'components = "all"\nmodels = ["PR"]\nproperties = ["saturation_pressure"]\n'
    text += '[states]\nreduced_temperature = [0.8, 0.9]\n[references]\nuse = ["coolprop"]\n'
    plan = parse_plan(text, "p", "p.toml")
    left_out: list[tuple[str, str]] = []
    found = list(collect(plan, left_out))
    assert [s.component.name for s in found] == list(catalogue())
    assert left_out == []
    assert all(np.isfinite(s.values[s.nodes.state]).all() for s in found)
    assert {what for what, _ in plan.left_out} >= {"Air", "R410A"}


def test_what_goes_by_temperature_is_named_where_a_plan_goes_by_pressure() -> None:
    """Propane has a formula and a table of the liquid density, which nothing gives a pressure to."""
    told: dict[str, list[tuple[str, str]]] = {}
    for states in ("pressure = ['1 bar', '10 bar']", "temperature = [250.0, 300.0]"):
        plan = parse_plan(PLAN.format(properties='"boiling_temperature", "liquid_density"', states=states), "p", "p")
        told[states.split()[0]] = []
        used = {s.source for s in collect(plan, told[states.split()[0]]) if s.property == "liquid_density"}
    [(component, why)] = told["pressure"]
    assert component == "n-Propane"
    assert why.startswith("cited values that go by temperature, and not by pressure as the plan does, are not used: ")
    assert all(source in why for source in used - {"coolprop"})
    assert "boiling temperature" not in why  # printed at one atmosphere, and formulas are read backwards
    assert told["temperature"] == []


def test_no_series_at_all_is_refused() -> None:
    with pytest.raises(NothingJudged, match="nothing could be judged: no reference"):
        refuse_empty([])

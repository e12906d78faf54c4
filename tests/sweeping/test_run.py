"""Small sweeps: own components and models, every coordinate, every property."""

from __future__ import annotations

import re
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

import eosmuster as em
from eosmuster import components
from eosmuster.components import equation_citations
from eosmuster.errors import InputError, NothingJudged
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.plan.reading import parse_plan
from eosmuster.plan.selection import model_records
from eosmuster.quantities import PROPERTIES, SATURATION
from eosmuster.record import POINT_VERDICTS, Block
from eosmuster.sources import handbook
from eosmuster.sweeping.run import run

Swept = Callable[[str], Any]

ALL_PROPERTIES = """
components = ["propane", "water"]
models = ["PR", "SRK+Peneloux", "PT"]
properties = "all"
"""

OWN = """
models = ["PR"]
properties = ["saturation_pressure", "liquid_density"]
components = ["propane"]

[states]
temperature = [250.0, 300.0, 350.0]

[[component]]
name = "plant cut 7"
critical_temperature = "540.2 K"
critical_pressure = "27.4 bar"
acentric_factor = 0.35
molar_mass = "100.2 g/mol"
source = "crude assay 2031-04, table 3"

[[model]]
name = "PR again"
form = "Peng-Robinson"
alpha = "Soave"
source = "the constants of 1976, written down once more"
parameters = { m = [0.37464, 1.54226, -0.26992] }

[[model]]
name = "PR shifted"
form = { delta1 = 2.414213562373095, delta2 = -0.41421356237309515 }
alpha = "Soave"
source = "the same, every liquid made heavier by 5 cm3/mol"
parameters = { m = [0.37464, 1.54226, -0.26992] }
translation = { volume = { propane = "5 cm3/mol" } }
"""


def block(results: Any, name: str, source: str = "coolprop", component: str = "n-Propane") -> Block:
    [found] = [
        b for b in results.record.blocks if (b.component, b.property, b.reference_source) == (component, name, source)
    ]
    return found


def row_of(b: Block, candidate: str) -> int:
    return b.candidates.index(candidate)


# ---------------------------------------------------------------- all properties


@pytest.fixture(scope="module")
def by_temperature(swept: Swept) -> Any:
    return swept(ALL_PROPERTIES)


def test_all_saturation_properties_are_judged(by_temperature: Any) -> None:
    points = by_temperature.points
    library = points[points["reference_source"] == "coolprop"]
    assert set(library["property"]) == set(SATURATION)
    assert set(library["verdict"]) <= set(POINT_VERDICTS)
    counts = library.groupby(["component", "candidate", "property"]).size()
    assert len(counts) == 2 * 3 * len(SATURATION)
    assert set(counts) == {41}
    units = {p.name: (p.unit, p.phase) for p in PROPERTIES.values()}
    for name, rows in points.groupby("property"):
        assert set(zip(rows["unit"], rows["phase"], strict=True)) == {units[name]}


@pytest.mark.parametrize(
    "name", ["saturation_pressure", "liquid_density", "vapor_density", "enthalpy_of_vaporization"]
)
@pytest.mark.parametrize("component", ["n-Propane", "Water"])
def test_predictions_are_those_of_saturate(by_temperature: Any, component: str, name: str) -> None:
    b = block(by_temperature, name, component=component)
    for i, candidate in enumerate(b.candidates):
        states = em.saturate(component, candidate, temperature=b.temperature)
        again = states.pressure if name == "saturation_pressure" else getattr(states, name)
        # many states at once are solved along another path than a few
        assert b.predicted[i] == pytest.approx(again, rel=1e-11)


@pytest.mark.parametrize("name", ["saturation_pressure", "liquid_density", "vapor_density"])
def test_references_are_those_of_the_library(by_temperature: Any, name: str) -> None:
    from CoolProp.CoolProp import PropsSI

    key, quality = {"saturation_pressure": ("P", 0), "liquid_density": ("Dmolar", 0), "vapor_density": ("Dmolar", 1)}[
        name
    ]
    b = block(by_temperature, name, component="Water")
    assert b.reference == pytest.approx(PropsSI(key, "T", b.temperature, "Q", quality, "Water"), rel=1e-10)


def test_boiling_temperatures_are_asked_at_the_reference_s_own_pressure(by_temperature: Any) -> None:
    pressures, boiling = block(by_temperature, "saturation_pressure"), block(by_temperature, "boiling_temperature")
    assert np.array_equal(boiling.pressure, pressures.reference)
    assert np.array_equal(boiling.reference, boiling.temperature)
    assert np.isnan(pressures.pressure).all()
    for i, candidate in enumerate(boiling.candidates):
        back = em.saturate("propane", candidate, temperature=boiling.predicted[i])
        assert back.pressure == pytest.approx(boiling.pressure, rel=1e-11)


def test_a_pressure_too_high_is_a_boiling_temperature_too_low(by_temperature: Any) -> None:
    """To first order dT/T = -(dp/p)/(dln p/dln T), with the candidate's own slope."""
    pressures, boiling = block(by_temperature, "saturation_pressure"), block(by_temperature, "boiling_temperature")
    for i, candidate in enumerate(boiling.candidates):
        slope = em.saturate("propane", candidate, temperature=pressures.temperature).log_slope
        small = np.abs(pressures.deviation_pct[i]) < 1.0
        assert small.sum() > 5
        expected = -pressures.deviation_pct[i] / slope
        # second order: a deviation of 1 % bends the curve by less than 1 % of the effect
        assert boiling.deviation_pct[i][small] == pytest.approx(expected[small], rel=0.01, abs=1e-12)


def test_absolute_limits_become_percent_of_the_reference(by_temperature: Any) -> None:
    """The default for boiling temperatures is 0.5 K, whatever the class: design, section 4."""
    for component in ("n-Propane", "Water"):
        b = block(by_temperature, "boiling_temperature", component=component)
        kelvin = b.limit_pct * b.reference / 100.0
        assert kelvin == pytest.approx(0.5, rel=1e-12)


def test_uncertainty_carries_the_coverage_factor_of_the_plan(swept: Swept) -> None:
    two, one = (
        block(swept(f"{ALL_PROPERTIES}[decision]\ncoverage_factor = {k}\n"), "liquid_density") for k in (2, 1)
    )
    known = ~np.isnan(two.reference_uncertainty_pct)
    assert known.any()
    assert two.reference_uncertainty_pct[known] == pytest.approx(
        2.0 * one.reference_uncertainty_pct[known], rel=1e-15
    )
    assert np.allclose(two.probability_inside, one.probability_inside, rtol=1e-12, equal_nan=True)


def test_the_simple_rule_asks_for_no_uncertainty(swept: Swept) -> None:
    b = block(swept(f"{ALL_PROPERTIES}[decision]\nrule = 'simple'\n"), "liquid_density")
    expected = np.where(np.abs(b.deviation_pct) <= b.limit_pct, "inside", "outside")
    assert (np.array(POINT_VERDICTS)[b.verdict] == expected).all()


# ---------------------------------------------------------------- coordinates


def test_a_grid_of_reduced_temperatures(swept: Swept) -> None:
    text = 'components = ["propane", "water"]\nmodels = ["PR"]\nproperties = ["saturation_pressure"]\n'
    results = swept(f"{text}[states]\nreduced_temperature = [0.6, 0.7, 0.8]\n")
    for component in ("n-Propane", "Water"):
        tc = components.catalogue()[component].critical_temperature
        b = block(results, "saturation_pressure", component=component)
        assert b.reduced_temperature == pytest.approx([0.6, 0.7, 0.8], rel=1e-15)
        assert np.array_equal(b.temperature, np.array([0.6, 0.7, 0.8]) * tc)
    # the definition of the acentric factor, of which four digits are stored
    b = block(results, "saturation_pressure")
    omega = components.find("propane").acentric_factor
    pc = components.find("propane").critical_pressure
    assert b.reference[1] == pytest.approx(pc * 10.0 ** (-1.0 - omega), rel=1e-3)


PRESSURES = [1e4, 1e5, 1e6, 3e6]


@pytest.fixture(scope="module")
def by_pressure(swept: Swept) -> Any:
    return swept(f"{ALL_PROPERTIES}[states]\npressure = ['0.1 bar', '1 bar', '10 bar', '30 bar']\n")


def test_pressures_of_the_plan_stand_in_every_row_they_give(by_pressure: Any) -> None:
    correlations = 0
    for b in by_pressure.record.blocks:
        if b.reference_source in ("handbook:vdi-2010", "handbook:crc-95", "handbook:iapws-r6-95"):
            continue  # tabulated values bring their own states
        assert np.isin(b.pressure, PRESSURES).all(), (b.property, b.reference_source)
        correlations += b.reference_source != "coolprop"
    assert correlations >= 10
    assert {b.property for b in by_pressure.record.blocks} == set(SATURATION)


def test_temperatures_at_given_pressures_are_the_reference_s_own(by_pressure: Any) -> None:
    from CoolProp.CoolProp import PropsSI

    for name in SATURATION:
        b = block(by_pressure, name)
        assert np.array_equal(b.pressure, PRESSURES)
        assert b.temperature == pytest.approx(PropsSI("T", "P", PRESSURES, "Q", 0, "n-Propane"), rel=1e-10)
    own = block(by_pressure, "boiling_temperature", "handbook:wagner-mcgarry-1983")
    assert not np.array_equal(own.temperature, b.temperature)
    assert np.array_equal(own.reference, own.temperature)
    [correlation] = [
        c for c in handbook.correlations(own.cas, "saturation_pressure") if c.source == "handbook:wagner-mcgarry-1983"
    ]
    assert correlation(own.temperature) == pytest.approx(own.pressure, rel=1e-12)


def test_candidates_are_asked_at_the_pressure(by_pressure: Any) -> None:
    for name in ("boiling_temperature", "liquid_density", "vapor_density", "enthalpy_of_vaporization"):
        b = block(by_pressure, name)
        for i, candidate in enumerate(b.candidates):
            states = em.saturate("propane", candidate, pressure=b.pressure)
            again = states.temperature if name == "boiling_temperature" else getattr(states, name)
            assert b.predicted[i] == pytest.approx(again, rel=1e-10)


def test_saturation_pressures_are_asked_at_the_reference_s_temperature(by_pressure: Any) -> None:
    b = block(by_pressure, "saturation_pressure")
    assert b.reference == pytest.approx(b.pressure, rel=1e-9)  # the library's own round trip p -> T -> p
    for i, candidate in enumerate(b.candidates):
        states = em.saturate("propane", candidate, temperature=b.temperature)
        assert b.predicted[i] == pytest.approx(states.pressure, rel=1e-10)


def test_pressures_beyond_the_library_are_left_out_and_said(swept: Swept) -> None:
    text = 'components = ["propane"]\nmodels = ["PR"]\nproperties = "all"\n[references]\nuse = ["coolprop"]\n'
    results = swept(f"{text}[states]\npressure = ['1 bar', '60 bar']\n")
    assert {b.temperature.size for b in results.record.blocks} == {1}
    [(what, why)] = results.record.left_out
    assert what == "n-Propane"
    assert why == "1 of 2 pressures lie outside the reference library's range"
    with pytest.raises(NothingJudged, match="no reference has a value"):
        swept(f"{text}[states]\npressure = ['60 bar']\n")


@pytest.mark.parametrize("states", ["temperature = [300.0]", "pressure = ['10 bar']", "reduced_temperature = [0.5]"])
def test_one_state_is_enough(swept: Swept, states: str) -> None:
    results = swept(f"{ALL_PROPERTIES}[states]\n{states}\n[references]\nuse = ['coolprop']\n")
    assert {b.temperature.size for b in results.record.blocks} == {1}
    assert len(results.record.blocks) == 2 * len(SATURATION)
    assert all(w.from_K == w.to_K for w in results.record.windows)


def test_states_beyond_every_reference_are_rows_without_one(swept: Swept) -> None:
    text = 'components = ["propane"]\nmodels = ["PR"]\nproperties = "all"\n[references]\nuse = ["coolprop"]\n'
    results = swept(f"{text}[states]\ntemperature = [50.0, 300.0, 400.0]\n")
    for name in SATURATION:
        b = block(results, name)
        assert [POINT_VERDICTS[v] for v in b.verdict[0]][::2] == ["no_reference", "no_reference"]
        assert [b.notes[n] for n in b.note[0]][::2] == ["the reference has no value here"] * 2
        assert np.isfinite(b.deviation_pct[0]).tolist() == [False, True, False]
    [summary] = [r for r in results.record.summary if r.property == "saturation_pressure"]
    assert (summary.points, summary.no_reference, summary.inside) == (3, 2, 1)
    assert summary.share_inside == 1.0
    assert summary.verdict == "inside"


def test_handbook_values_alone_can_judge(swept: Swept) -> None:
    text = 'components = ["water"]\nmodels = ["PR"]\nproperties = "all"\n[references]\nuse = ["handbook"]\n'
    results = swept(text)
    sources = {b.reference_source for b in results.record.blocks}
    assert "handbook:iapws-r6-95" in sources
    assert "coolprop" not in sources
    # IAPWS R6-95 is the library's equation, from which the constants are
    owed = results.points["reference_source"] == "handbook:iapws-r6-95"
    assert set(results.points["independence"][owed]) == {"constants"}
    assert set(results.points["independence"][~owed]) == {"independent"}
    # only a printed value has an uncertainty of its own: half its last digit
    known = results.points.loc[results.points["reference_uncertainty_pct"].notna(), "reference_source"]
    assert set(known) <= {"handbook:iapws-r6-95", "handbook:iapws-sr1-86", "handbook:crc-95", "handbook:vdi-2010"}
    assert "coolprop" not in results.record.citations
    judged = {
        key for b in results.record.blocks for key in results.record.citations if b.reference_source.endswith(key)
    }
    # the constants are those of the library's record all the same, by the equation that this names
    assert set(results.record.citations) == judged | {"Wagner-JPCRD-2002"}


# ---------------------------------------------------------------- a plan's own components and models


@pytest.fixture(scope="module")
def own(swept: Swept) -> Any:
    return swept(OWN)


def test_own_models_predict_what_they_say(own: Any) -> None:
    pressure, liquid = block(own, "saturation_pressure"), block(own, "liquid_density")
    pr, again, shifted = (row_of(liquid, name) for name in ("PR", "PR again", "PR shifted"))
    assert np.array_equal(pressure.predicted[pr], pressure.predicted[again])
    assert np.array_equal(liquid.predicted[pr], liquid.predicted[again])
    assert pressure.predicted[shifted] == pytest.approx(pressure.predicted[pr], rel=1e-13)
    volumes = 1.0 / liquid.predicted
    assert volumes[pr] - volumes[shifted] == pytest.approx(5e-6, rel=1e-9)


def test_own_models_are_told_apart_from_the_catalogue(own: Any) -> None:
    models = own.record.models
    assert models["PR again"]["status"] == "the user's own"
    assert models["PR shifted"]["translated"]
    assert models["PR"]["source"] == CATALOGUE["PR"].source
    assert [r.name for r in model_records(parse_plan(OWN, "own", "own.toml"))] == ["PR", "PR again", "PR shifted"]


def test_an_own_component_without_a_reference_is_said(own: Any) -> None:
    assert ("plant cut 7", "the reference library has no equation for it") in own.record.left_out
    assert "plant cut 7" not in set(own.summary["component"])
    constants = own.record.constants["plant cut 7"]
    assert constants["critical_temperature"] == {
        "value": 540.2,
        "unit": "K",
        "source": "crude assay 2031-04, table 3",
    }


def test_a_translation_for_other_components_only_leaves_the_model_unavailable(swept: Swept) -> None:
    results = swept(
        OWN.replace('components = ["propane"]', 'components = ["propane", "ethane"]').replace("350", "290")
    )
    rows = [r for r in results.record.summary if r.verdict == "unavailable"]
    assert [(r.component, r.candidate, r.property) for r in rows] == [
        ("Ethane", "PR shifted", "saturation_pressure"),
        ("Ethane", "PR shifted", "liquid_density"),
    ]
    assert {r.note for r in rows} == {"no volume translation"}


# ---------------------------------------------------------------- the record


def test_the_record_says_what_was_done(own: Any) -> None:
    record = own.record
    assert record.plan_text == OWN
    assert (record.plan_name, record.plan_title) == ("small", "small")
    assert record.decision["rule"] == "guarded"
    assert {t["property"] for t in record.decision["tolerances"]} == {"saturation_pressure", "liquid_density"}
    assert record.display == {"temperature": "degC", "pressure": "bar", "density": "kg/m3"}
    assert record.references == ("coolprop", "handbook")
    assert {"coolprop", "vdi-2010", "Lemmon-JCED-2009"} <= set(record.citations)
    assert all(record.citations.values())


def test_the_sources_of_constants_are_cited_in_full(swept: Swept) -> None:
    text = 'components = ["propane", "argon"]\nmodels = ["PR"]\nproperties = ["saturation_pressure"]\n'
    text += "[states]\nreduced_temperature = [0.8]\n[references]\nuse = ['coolprop']\n"
    cited = dict(swept(text).record.citations)
    assert list(cited) == ["coolprop", "Lemmon-JCED-2009", "Tegeler-JPCRD-1999"]
    assert cited["Lemmon-JCED-2009"] == equation_citations()["Lemmon-JCED-2009"]
    replaced = swept(text + "[constants]\nsource = 'crc-95'\n").record
    assert list(replaced.citations) == ["crc-95", *cited]
    for about in replaced.constants.values():
        keys = {
            re.split(r"[(:]", about[name]["source"])[-1].rstrip(")") for name in ("critical_pressure", "molar_mass")
        }
        assert keys <= set(replaced.citations)


def test_progress_is_told_in_order(swept: Swept) -> None:
    plan = parse_plan(ALL_PROPERTIES, "p", "p.toml")
    told: list[tuple[str, int, int]] = []
    run(plan, lambda *what: told.append(what))
    assert list(dict.fromkeys(what for what, _, _ in told)) == ["references", "models", "verdicts", "windows"]
    assert all(0 <= done <= of for _, done, of in told)
    for stage in ("references", "verdicts", "windows"):
        amounts = [done / of for what, done, of in told if what == stage]
        assert amounts == sorted(amounts)
        assert amounts[-1] == 1.0


def test_nothing_to_judge_against(swept: Swept) -> None:
    with pytest.raises(NothingJudged, match="no reference has a value for any component") as caught:
        swept(
            'components = ["R1234yf"]\nmodels = ["PR"]\nproperties = ["vapor_density"]\n'
            '[references]\nuse = ["handbook"]\n'
        )
    assert not isinstance(caught.value, InputError)
    assert caught.value.exit_status == 4

"""The daily question: every model, the library and the handbook, each with an answer or the reason for none."""

from __future__ import annotations

import math
from dataclasses import replace

import pytest

import eosmuster as em
from eosmuster.components import Component, catalogue, find
from eosmuster.inquiry import STATUS_NOTES, Answer, ask
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.saturation import solver
from eosmuster.sources import handbook, library_gate
from eosmuster.sources.cited import Correlation

PROPANE = find("propane")
CITED = ("saturation_pressure", "liquid_density", "vapor_density", "enthalpy_of_vaporization")


def by_source(answers: list[Answer]) -> dict[str, Answer]:
    found = {answer.source: answer for answer in answers}
    assert len(found) == len(answers)
    return found


def test_models_come_first_in_the_order_asked_then_references() -> None:
    answers = ask(PROPANE, ["SRK", "PR"], temperature=300.0)
    assert [a.source for a in answers[:3]] == ["SRK", "PR", f"coolprop {library_gate.version()}"]
    assert [a.kind for a in answers] == ["model", "model", *["reference"] * (len(answers) - 2)]
    cited = [c.source for name in CITED for c in handbook.correlations(PROPANE.cas, name)]
    assert [a.source for a in answers[3:]] == list(dict.fromkeys(cited))


@pytest.mark.parametrize("model", CATALOGUE)
def test_a_model_answers_as_saturate_does(model: str) -> None:
    [answer] = [a for a in ask(PROPANE, [model], temperature=300.0) if a.kind == "model"]
    states = em.saturate("propane", model, temperature=300.0)
    assert answer.status == "solved"
    assert (answer.temperature, answer.pressure) == (300.0, float(states.pressure))
    assert answer.liquid_density == float(states.liquid_density)
    assert answer.vapor_density == float(states.vapor_density)
    assert answer.enthalpy_of_vaporization == float(states.enthalpy_of_vaporization)
    assert 0.5 < answer.fugacity / answer.pressure < 1.0  # a real gas below its Boyle temperature


@pytest.mark.parametrize("model", ["vdW", "PR", "PT", "SRK+Peneloux"])
def test_temperature_and_pressure_ask_for_the_same_state(model: str) -> None:
    [there] = [a for a in ask(PROPANE, [model], temperature=300.0) if a.kind == "model"]
    [back] = [a for a in ask(PROPANE, [model], pressure=there.pressure) if a.kind == "model"]
    assert back.temperature == pytest.approx(300.0, rel=1e-13)
    for name in ("liquid_density", "vapor_density", "enthalpy_of_vaporization", "fugacity"):
        assert getattr(back, name) == pytest.approx(getattr(there, name), rel=1e-10)


def test_the_library_s_answer_at_the_normal_boiling_point_of_water() -> None:
    """IAPWS-95: 373.1243 K at 101325 Pa (Wagner and Pruss, J. Phys. Chem. Ref. Data 31 (2002) 387)."""
    [answer] = [a for a in ask(find("water"), [], pressure=101325.0) if a.source.startswith("coolprop")]
    assert answer.status == "answered"
    assert answer.temperature == pytest.approx(373.1243, abs=1e-4)
    assert answer.liquid_density * 0.018015268 == pytest.approx(958.367, abs=1e-3)


def test_handbook_answers_at_pressure_and_temperature_agree() -> None:
    at_temperature = by_source(ask(PROPANE, [], temperature=230.0))
    for curve in handbook.correlations(PROPANE.cas, "saturation_pressure"):
        answer = at_temperature[curve.source]
        [back] = [a for a in ask(PROPANE, [], pressure=answer.pressure) if a.source == curve.source]
        assert back.temperature == pytest.approx(230.0, abs=1e-9)


@pytest.mark.parametrize("name", ["liquid_density", "enthalpy_of_vaporization"])
def test_densities_and_enthalpies_stand_in_the_rows_of_their_own_sources(name: str) -> None:
    answers = [a for a in ask(PROPANE, [], temperature=230.0) if a.source.startswith("handbook:")]
    given = {a.source: getattr(a, name) for a in answers if math.isfinite(getattr(a, name))}
    assert given == {c.source: float(c(230.0)) for c in handbook.correlations(PROPANE.cas, name)}
    assert len(given) > 1
    for source in given:
        [row] = [a for a in answers if a.source == source]
        assert (row.status, row.note) == ("answered", "")
        assert math.isnan(row.pressure)  # by a correlation of something else


def test_a_source_without_a_boiling_temperature_says_where_it_was_asked() -> None:
    answers = by_source(ask(PROPANE, [], pressure=101325.0))
    of_library = answers[f"coolprop {library_gate.version()}"]
    for c in handbook.correlations(PROPANE.cas, "liquid_density"):
        row = answers[c.source]
        assert row.liquid_density == float(c(of_library.temperature))
        assert row.note == f"at the boiling temperature by {of_library.source}, {of_library.temperature:.2f} K"
        assert math.isnan(row.temperature)


def test_a_source_that_gives_several_properties_has_one_row(monkeypatch: pytest.MonkeyPatch) -> None:
    original = handbook.correlations

    def of_one_book(cas: str, name: str) -> list[Correlation]:
        return [replace(c, source="handbook:one book") for c in original(cas, name)[:1]]

    monkeypatch.setattr(handbook, "correlations", of_one_book)
    for given in ({"temperature": 230.0}, {"pressure": 1e5}):
        [row] = [a for a in ask(PROPANE, [], **given) if a.source == "handbook:one book"]
        values = (row.temperature, row.pressure, row.liquid_density, row.enthalpy_of_vaporization)
        assert all(map(math.isfinite, values))
        assert row.note == ""  # all of it at its own saturation pressure, or boiling temperature


def test_correlations_refuse_to_be_extrapolated_and_say_their_range() -> None:
    antoine = by_source(ask(PROPANE, [], temperature=300.0))["handbook:antoine-poling-2001"]
    assert (antoine.status, antoine.note) == ("refused", "extrapolation refused: valid from 168.90 to 247.76 K")
    assert math.isnan(antoine.pressure)
    [c] = [c for c in handbook.correlations(PROPANE.cas, "saturation_pressure") if c.source == antoine.source]
    low, high = (f"{float(c(t)) / 1e5:.4g}" for t in (c.from_K, c.to_K))
    at_pressure = by_source(ask(PROPANE, [], pressure=1e6))["handbook:antoine-poling-2001"]
    assert at_pressure.note == f"extrapolation refused: valid from {low} to {high} bar"


@pytest.mark.parametrize("given", [{"temperature": 400.0}, {"pressure": 6e6}])
def test_above_the_critical_point_everybody_says_why(given: dict[str, float]) -> None:
    for answer in ask(PROPANE, list(CATALOGUE), **given):
        assert answer.status in ("above_critical", "refused"), answer
        assert answer.note
        assert math.isnan(answer.pressure)
        if answer.kind == "model":
            assert answer.note.startswith("above the model's own critical point (Tc ")
    [of_library] = [a for a in ask(PROPANE, [], **given) if a.source.startswith("coolprop")]
    assert of_library.note.endswith("(85.53 to 369.89 K)")


def test_below_the_triple_point_the_library_refuses_and_models_answer() -> None:
    answers = by_source(ask(find("water"), ["PR"], temperature=260.0))
    assert answers["PR"].status == "solved"
    refused = answers[f"coolprop {library_gate.version()}"]
    assert refused.status == "refused"
    assert refused.note.startswith("below the range of the reference equation (273.16 to ")


@pytest.mark.parametrize("given", [{"temperature": 193.5}, {"pressure": 5e3}])
def test_below_the_triple_point_correlations_refuse_whatever_their_own_range(given: dict[str, float]) -> None:
    """Ammonia's Antoine correlation goes from 193.03 K, its triple point is at 195.495 K; a sweep refuses too."""
    [c] = [c for c in handbook.correlations("7664-41-7", "saturation_pressure") if "antoine-poling" in c.source]
    assert float(c(193.5)) > 5e3 > float(c(c.from_K))
    answer = by_source(ask(find("ammonia"), [], **given))[c.source]
    assert answer.status == "refused"
    at = "195.50 to 254.31 K" if "temperature" in given else f"{float(c(195.495)) / 1e5:.4g} to "
    assert answer.note.startswith(f"below the triple point: valid from {at}")
    assert math.isnan(answer.pressure)


def test_at_the_triple_point_itself_correlations_answer() -> None:
    """0.01 degC is 273.15999999999997 K, and water's triple point 273.16 K."""
    answers = ask(find("water"), [], temperature=273.15 + 0.01)
    [vdi] = [a for a in answers if a.source == "handbook:wagner-vdi-2010"]  # from 273.15 K by itself
    assert (vdi.status, vdi.note) == ("answered", "")


def test_a_model_without_parameters_is_unavailable() -> None:
    answers = by_source(ask(find("helium"), ["PR-Twu91", "PRSV", "RKPR"], temperature=4.0))
    assert {answers[m].status for m in ("PR-Twu91", "PRSV", "RKPR")} == {"unavailable"}
    assert answers["PRSV"].note == "no parameters"
    assert "compressibility factor" in answers["RKPR"].note


def test_a_component_of_one_s_own_has_models_alone() -> None:
    own = Component("plant cut", critical_temperature=540.2, critical_pressure=27.4e5, acentric_factor=0.35)
    pr, of_library = ask(own, ["PR"], temperature=400.0)
    assert pr.status == "solved"
    assert (of_library.status, of_library.note) == ("refused", "not a pure fluid of the library")


@pytest.mark.parametrize("name", catalogue())
def test_every_fluid_is_answered_for_at_08_tc(name: str) -> None:
    fluid = catalogue()[name]
    answers = ask(fluid, ["PR", "SRK"], temperature=0.8 * fluid.critical_temperature)
    assert [a.status for a in answers[:3]] == ["solved", "solved", "answered"]
    for answer in answers:
        values = (answer.pressure, answer.liquid_density, answer.vapor_density, answer.enthalpy_of_vaporization)
        assert (answer.status in ("solved", "answered")) == any(map(math.isfinite, values))
        assert bool(answer.note) == (not any(map(math.isfinite, values)))


def test_every_status_of_the_solver_has_words() -> None:
    assert set(STATUS_NOTES) == set(solver.STATUSES) - {"solved", "unavailable"}


def test_neither_temperature_nor_pressure_is_a_programming_error() -> None:
    with pytest.raises(ValueError, match="one of temperature and pressure"):
        ask(PROPANE, ["PR"])

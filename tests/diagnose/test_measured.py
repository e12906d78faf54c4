"""Why a measured set contradicts the references: each cause is planted in invented data, and found again.

The invented data are the reference library's own values, changed in the way the cause changes them.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray

from eosmuster.components import Component, find
from eosmuster.diagnose.measured import CAUSES, exchanged, exchanged_columns, suspicions
from eosmuster.diagnose.measured_set import Predictions, Suspicion
from eosmuster.diagnose.measured_temperatures import rescaled
from eosmuster.sources import library
from eosmuster.sources.measured.table import MeasuredSet, Source

Floats = NDArray[np.float64]
PROPANE, BUTANE, HEXANE, CYCLOHEXANE = map(find, ("propane", "butane", "hexane", "cyclohexane"))
T = np.linspace(250.0, 330.0, 9)
PHASES = {"liquid_density": "liquid", "vapor_density": "vapor"}
NOISE = 1.0 + 1e-3 * np.sin(np.arange(T.size) * 2.0)  # 0.1 %, as measured sets scatter


def reference(component: Component, name: str) -> Floats:
    return library.saturation(component, T, [name]).values[name]


def pressure_at(temperature: Floats) -> Floats:
    return library.saturation(PROPANE, temperature, ["saturation_pressure"]).values["saturation_pressure"]


def measured(component: Component, name: str, values: Floats, **changed: object) -> MeasuredSet:
    n = values.size
    nothing, none = np.full(n, np.nan), np.zeros(n, np.int64)
    one = MeasuredSet(
        source=Source("lab.xml"),
        block=1,
        series=1,
        component=component,
        written=component.name,
        property=name,
        phase=PHASES.get(name, "two-phase"),
        state="saturated",
        method="",
        rows=np.arange(1, n + 1),
        temperature=T[:n],
        pressure=nothing,
        values=values,
        standard_uncertainty=nothing,
        rounding=nothing,
        temperature_uncertainty=nothing,
        pressure_uncertainty=nothing,
        digits=none,
        origin=none.astype(np.int8),
        level_assumed=none.astype(np.bool_),
        repeats=none.astype(np.bool_),
    )
    return replace(one, **changed)  # type: ignore[arg-type]


def only(found: tuple[Suspicion, ...], cause: str) -> Suspicion:
    assert [one.cause for one in found] == [cause]
    assert cause in CAUSES
    return found[0]


@pytest.mark.parametrize(
    "name", ["saturation_pressure", "liquid_density", "vapor_density", "enthalpy_of_vaporization"]
)
def test_a_set_that_agrees_is_not_suspected(name: str) -> None:
    own = reference(PROPANE, name)
    assert suspicions(measured(PROPANE, name, own * NOISE * 1.005), Predictions(own)) == ()


def test_nothing_to_hold_against_is_no_suspicion() -> None:
    own = np.full(T.size, np.nan)
    assert suspicions(measured(PROPANE, "saturation_pressure", np.ones(T.size)), Predictions(own)) == ()


@pytest.mark.parametrize(
    ("name", "factor", "words"),
    [
        ("saturation_pressure", 1.01325, "bar stored as atm (1.01325)"),
        ("saturation_pressure", 1.0 / 1.01325, "atm stored as bar (0.986923)"),
        ("saturation_pressure", 0.980665, "bar stored as at (0.980665)"),
        ("saturation_pressure", 6.894757, "kPa stored as psi (6.89476)"),
        ("saturation_pressure", 1.0 / 6.894757, "psi stored as kPa (0.145038)"),
        ("saturation_pressure", 7.50062, "mmHg stored as kPa (7.50062)"),
        ("saturation_pressure", 100.0, "kPa stored as bar, or Pa as hPa (100)"),
        ("saturation_pressure", 1e3, "Pa stored as kPa, or hPa as bar (1000)"),
        ("liquid_density", 1e-3, "g/cm3 stored as kg/m3, or mol/L as mol/m3 (0.001)"),
        ("liquid_density", 0.1, "units a power of ten apart (0.1)"),
        ("liquid_density", 0.04409562, "kg/m3 stored as mol/m3, or g/cm3 as mol/L (0.0440956)"),
        ("liquid_density", 44.09562, "kg/m3 stored as mol/L (44.0956)"),
        ("vapor_density", 0.04409562**2, "the molar mass divided for multiplied"),
        ("enthalpy_of_vaporization", 1.0 / 4.184, "cal/g stored as kJ/kg, or kcal/mol as kJ/mol (0.239006)"),
    ],
)
def test_a_mistaken_unit(name: str, factor: float, words: str) -> None:
    own = reference(PROPANE, name)
    found = only(suspicions(measured(PROPANE, name, factor * own * NOISE), Predictions(own)), "unit")
    assert "all values are" in found.sentence
    assert words in found.sentence
    assert found.points.all()


@pytest.mark.parametrize(
    ("stored", "inner", "base", "words"),
    [
        (1e3, 1e3, np.log, "the values are ln(p/kPa), stored as a pressure in kPa"),
        (1e5, 1e5, np.log10, "the values are log10(p/bar), stored as a pressure in bar"),
        (1e3, 1.0, np.log10, "the values are log10(p/Pa), stored as a pressure in kPa"),
    ],
)
def test_a_logarithm_for_a_pressure(stored: float, inner: float, base: np.ufunc, words: str) -> None:
    own = reference(PROPANE, "saturation_pressure")
    values = stored * np.round(base(own / inner), 3)
    there = values > 0.0  # a reader leaves out what is not above 0
    one = measured(PROPANE, "saturation_pressure", values[there])
    assert words in only(suspicions(one, Predictions(own[there])), "logarithm").sentence


@pytest.mark.parametrize(
    ("offset", "words"),
    [
        (-101325.0, "101325 Pa below the reference: gauge pressure stored as absolute"),
        (-1e5, "1 bar below the reference: gauge pressure stored as absolute"),
        (101325.0, "101325 Pa above the reference: absolute pressure taken for gauge, and the atmosphere added"),
    ],
)
def test_a_constant_difference(offset: float, words: str) -> None:
    own = reference(PROPANE, "saturation_pressure")
    one = measured(PROPANE, "saturation_pressure", own + offset)
    assert f"the values are {words}" in only(suspicions(one, Predictions(own)), "offset").sentence


@pytest.mark.parametrize(("meant", "stored"), [("degF", "degC"), ("degC", "degF"), ("degC", "K"), ("K", "degC")])
def test_temperatures_of_another_scale(meant: str, stored: str) -> None:
    """Where the mistaken scale leads out of the reference's range, the reference says nothing at first."""
    true = np.linspace(290.0, 330.0, T.size)
    at = rescaled(true, stored, meant)  # the way back
    own, values = pressure_at(at), pressure_at(true) * NOISE
    one = measured(PROPANE, "saturation_pressure", values, temperature=at)
    found = only(suspicions(one, Predictions(own, at_temperatures=pressure_at)), "temperature")
    assert f"the values lie on the reference if the temperatures are in {meant}, stored as {stored}" in found.sentence
    boiling = measured(PROPANE, "boiling_temperature", at + 0.02)
    words = only(suspicions(boiling, Predictions(true)), "temperature").sentence
    assert f"the values are temperatures in {meant} stored as {stored}" in words


def test_a_point_that_two_scales_have_in_common_is_no_deviation() -> None:
    """-40 degF is -40 degC: what a fresh user planted, values rounded to 0.1 kPa."""
    at, values = np.array([233.15, 305.15, 341.15]), np.array([111.1e3, 474.5e3, 836.5e3])
    one = measured(PROPANE, "saturation_pressure", values, temperature=at)
    own = pressure_at(at)
    found = only(suspicions(one, Predictions(own, at_temperatures=pressure_at)), "temperature")
    assert found.points.all()
    [unknown] = suspicions(one, Predictions(own))
    assert (unknown.cause, unknown.points.tolist()) == ("apart", [False, True, True])
    assert "2 of 3 points lie apart" in unknown.sentence


def test_273_for_the_ice_point() -> None:
    own = reference(PROPANE, "saturation_pressure")
    values = pressure_at(T + 0.15) * (1.0 + (NOISE - 1.0) / 50.0)  # to 0.002 %: else nothing could be told
    one = measured(PROPANE, "saturation_pressure", values)
    found = only(suspicions(one, Predictions(own, at_temperatures=pressure_at)), "ice point")
    assert "as if their temperatures were 0.150 K too low, as they are with 273 for 273.15" in found.sentence
    for other in (own * 1.005, pressure_at(T + 0.2), pressure_at(T + 0.15) * NOISE**4):
        noisy = measured(PROPANE, "saturation_pressure", other)
        assert suspicions(noisy, Predictions(own, at_temperatures=pressure_at)) == ()


def test_stated_pressures_of_boiling_points() -> None:
    pressure = reference(PROPANE, "saturation_pressure")
    for stated, cause, words in (
        (pressure / 1.01325, "unit", "the stated pressures of all values are 0.9869 times the reference"),
        (pressure - 101325.0, "offset", "the stated pressures of the values are 101325 Pa below the reference"),
    ):
        one = measured(PROPANE, "boiling_temperature", T, pressure=stated)
        own = library.at_pressure(PROPANE, stated, ["boiling_temperature"]).values["boiling_temperature"]
        found = suspicions(one, Predictions(own, saturation_pressure=pressure))
        assert words in only(found, cause).sentence


def test_a_cause_explains_nearly_all_that_deviates_and_says_how_much() -> None:
    own = reference(PROPANE, "saturation_pressure")
    some = np.where(T > 285.0, own / 6.894757, own) * NOISE
    found = only(suspicions(measured(PROPANE, "saturation_pressure", some), Predictions(own)), "unit")
    assert "5 of 9 values are 0.145 times the reference, as with psi stored as kPa" in found.sentence
    assert found.points.tolist() == (T > 285.0).tolist()
    others = np.where(T < 275.0, own * 1.3, some)  # three more that psi do not explain
    told = suspicions(measured(PROPANE, "saturation_pressure", others), Predictions(own))
    assert "unit" not in {one.cause for one in told}


def test_exchanged_columns_of_one_substance() -> None:
    """Pressures in bar and densities in kg/m3: a value is the other's number in the column's own unit."""
    pressure, density = (reference(PROPANE, name) for name in ("saturation_pressure", "liquid_density"))
    per = 1e-5 / (PROPANE.molar_mass or 1.0)
    pair = [
        (measured(PROPANE, "saturation_pressure", density / per), Predictions(pressure)),
        (measured(PROPANE, "liquid_density", pressure * per * NOISE), Predictions(density)),
    ]
    [(one, first), (other, second)] = exchanged_columns(pair)
    assert (one, other) == (pair[0][0], pair[1][0])
    assert "the values are those of liquid_density: the two columns are exchanged" in first.sentence
    assert "the values are those of saturation_pressure: the two columns are exchanged" in second.sentence
    right = measured(PROPANE, "liquid_density", density)
    assert exchanged_columns([pair[0], (right, Predictions(density))]) == []
    elsewhere = measured(PROPANE, "liquid_density", pressure * per, block=2)
    assert exchanged_columns([pair[0], (elsewhere, Predictions(density))]) == []


def test_exchanged_substances_are_found_from_one_point() -> None:
    """Mass densities: the value in the set was made molar by the molar mass of the wrong substance."""
    by_name = {c: reference(c, "liquid_density")[-1:] for c in (HEXANE, CYCLOHEXANE)}
    found = []
    for block, (mine, other) in enumerate([(HEXANE, CYCLOHEXANE), (CYCLOHEXANE, HEXANE)], start=1):
        values = by_name[other] * (other.molar_mass or 0.0) / (mine.molar_mass or 1.0)
        one = measured(mine, "liquid_density", values, block=block, temperature=T[-1:])
        predicted = Predictions(by_name[mine], {other: by_name[other]})
        assert only(suspicions(one, predicted), "apart")  # one point, and nobody says the other is in the file
        suspicion = only(suspicions(one, predicted, [other.name]), "other substance")
        assert f"the values lie on the curve of {other.name}" in suspicion.sentence
        found.append((one, suspicion))
    [(first, sentence)] = exchanged(found)
    assert first.component == HEXANE
    assert sentence.startswith("n-Hexane (block 1) and CycloHexane (block 2) are exchanged")
    assert exchanged(found[:1]) == []


def test_a_mislabelled_substance_is_found_from_its_curve() -> None:
    own, other = (reference(c, "saturation_pressure") for c in (PROPANE, BUTANE))
    one = measured(PROPANE, "saturation_pressure", other * NOISE)
    found = only(suspicions(one, Predictions(own, {BUTANE: other})), "other substance")
    assert found.other == "n-Butane"


def test_the_other_phase() -> None:
    own, vapor = reference(PROPANE, "liquid_density"), reference(PROPANE, "vapor_density")
    values = np.where(T > 300.0, vapor, own)
    predicted = Predictions(own, other_phase=vapor)
    found = only(suspicions(measured(PROPANE, "liquid_density", values), predicted), "other phase")
    assert found.points.tolist() == (T > 300.0).tolist()
    assert "3 of 9 values, labelled liquid, are densities of the vapor (row 7: " in found.sentence
    assert "the vapor root is reported as liquid" in found.sentence


@pytest.mark.parametrize("factor", [0.5, 0.8, 1.3])
def test_what_is_not_the_density_of_the_other_phase_is_not_taken_for_it(factor: float) -> None:
    own, vapor = reference(PROPANE, "liquid_density"), reference(PROPANE, "vapor_density")
    one = measured(PROPANE, "liquid_density", factor * vapor)
    assert only(suspicions(one, Predictions(own, other_phase=vapor)), "apart")


def test_grams_per_cubic_centimetre_are_no_vapor() -> None:
    """Liquid densities a thousand times too small lie near those of the vapor where it is thin."""
    own, vapor = reference(PROPANE, "liquid_density"), reference(PROPANE, "vapor_density")
    one = measured(PROPANE, "liquid_density", own / 1e3)
    found = only(suspicions(one, Predictions(own, other_phase=vapor / 4.0)), "unit")
    assert "g/cm3 stored as kg/m3" in found.sentence


@pytest.mark.parametrize(("phase", "factor", "side"), [("liquid", 0.97, "below"), ("vapor", 1.03, "above")])
def test_a_pressure_on_the_wrong_side_of_saturation(phase: str, factor: float, side: str) -> None:
    pressure = reference(PROPANE, "saturation_pressure")
    own = reference(PROPANE, f"{phase}_density")
    stated = np.where(T < 270.0, factor * pressure, pressure)
    one = measured(PROPANE, "density", own, phase=phase, state="single_phase", pressure=stated)
    found = only(suspicions(one, Predictions(own, saturation_pressure=pressure)), "phase")
    assert found.points.tolist() == (T < 270.0).tolist()
    assert f"2 of 9 points labelled {phase} lie {side} the saturation pressure, by 3.0 % at most" in found.sentence
    hair = replace(one, pressure=(1.0 + (factor - 1.0) / 10.0) * pressure)
    assert suspicions(hair, Predictions(own, saturation_pressure=pressure)) == ()


def test_single_points_far_from_their_set() -> None:
    own = reference(PROPANE, "saturation_pressure")
    values = own * NOISE
    values[2] *= 12.0
    found = only(suspicions(measured(PROPANE, "saturation_pressure", values), Predictions(own)), "outlier")
    assert np.flatnonzero(found.points).tolist() == [2]
    assert "1 of 9 points lie far from the rest of their set (row 3 at 270 K: +1.1e+03 %" in found.sentence
    honest = measured(PROPANE, "saturation_pressure", values, standard_uncertainty=values)
    assert suspicions(honest, Predictions(own)) == ()  # it says itself how little it knows


def test_a_set_that_lies_apart_without_a_known_cause() -> None:
    own = reference(PROPANE, "saturation_pressure")
    found = only(suspicions(measured(PROPANE, "saturation_pressure", 1.07 * own * NOISE), Predictions(own)), "apart")
    assert (
        "9 of 9 points lie apart, and the set +6.97 % from the reference in the median; no cause was"
        in found.sentence
    )

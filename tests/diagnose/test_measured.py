"""Why a measured set contradicts the references: each cause is planted in invented data, and found again.

The invented data are the reference library's own values, changed in the way the cause changes them.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from numpy.typing import NDArray

from eosmuster.components import Component, find
from eosmuster.diagnose.measured import CAUSES, Predictions, Suspicion, exchanged, suspicions
from eosmuster.sources import library
from eosmuster.sources.measured.table import MeasuredSet, Source

Floats = NDArray[np.float64]
PROPANE, BUTANE, HEXANE, CYCLOHEXANE = map(find, ("propane", "butane", "hexane", "cyclohexane"))
T = np.linspace(250.0, 330.0, 9)
PHASES = {"liquid_density": "liquid", "vapor_density": "vapor"}
NOISE = 1.0 + 1e-3 * np.sin(np.arange(T.size) * 2.0)  # 0.1 %, as measured sets scatter


def reference(component: Component, name: str) -> Floats:
    return library.saturation(component, T, [name]).values[name]


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
        ("saturation_pressure", 1.01325, "1.01325 is between atm and bar"),
        ("saturation_pressure", 0.980665, "0.980665 is between at (kgf/cm2) and bar"),
        ("saturation_pressure", 6.894757, "6.89476 is between psi and kPa"),
        ("saturation_pressure", 1.0 / 6.894757, "0.145038 is between psi and kPa"),
        ("saturation_pressure", 7.50062, "7.50062 is between mmHg and kPa"),
        ("saturation_pressure", 1e3, "1000 is between units a power of ten apart"),
        ("liquid_density", 0.1, "0.1 is between units a power of ten apart"),
        ("liquid_density", 0.04409562, "0.0440956 is between mass and mole (the molar mass)"),
        ("liquid_density", 44.09562, "44.0956 is between mass and mole (the molar mass)"),
        ("vapor_density", 0.04409562**2, "is between mass and mole (the molar mass, divided for multiplied)"),
        ("enthalpy_of_vaporization", 1.0 / 4.184, "0.239006 is between cal and J"),
    ],
)
def test_a_mistaken_unit(name: str, factor: float, words: str) -> None:
    own = reference(PROPANE, name)
    found = only(suspicions(measured(PROPANE, name, factor * own * NOISE), Predictions(own)), "unit")
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
    ("name", "offset", "words"),
    [
        ("saturation_pressure", -101325.0, "101325 Pa below the reference: gauge pressure stored as absolute"),
        ("boiling_temperature", -273.15, "273.15 K below the reference: degC stored as K"),
    ],
)
def test_a_constant_difference(name: str, offset: float, words: str) -> None:
    own = reference(PROPANE, "saturation_pressure") if name == "saturation_pressure" else T + 40.0
    found = only(suspicions(measured(PROPANE, name, own + offset), Predictions(own)), "offset")
    assert words in found.sentence


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
    predicted = Predictions(own, liquid_density=own, vapor_density=vapor)
    found = only(suspicions(measured(PROPANE, "liquid_density", values), predicted)[:1], "other phase")
    assert found.points.tolist() == (T > 300.0).tolist()
    assert "the vapor root is reported as liquid" in found.sentence


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
    assert "+6.97 % from the reference in the median; no cause was found" in found.sentence

"""The four known traps among real files are named by their cause, and no good file is suspected of one.

For the files of the folder that EOSMUSTER_THERMOML names, if it is set, as in
tests/sources/thermoml/test_real_files.py.
"""

from __future__ import annotations

import os
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.diagnose.measured import exchanged, suspicions
from eosmuster.diagnose.measured_set import Predictions, Suspicion
from eosmuster.sources import library
from eosmuster.sources.measured.table import MeasuredSet
from eosmuster.sources.thermoml.reader import read_file

FOLDER = Path(os.environ.get("EOSMUSTER_THERMOML", ""))

pytestmark = pytest.mark.skipif(
    "EOSMUSTER_THERMOML" not in os.environ, reason="EOSMUSTER_THERMOML names no folder of ThermoML files"
)


def suspected(file: str) -> list[tuple[MeasuredSet, Suspicion]]:
    sets = read_file(FOLDER / f"{file}.xml").sets
    present = list({one.component.name: one.component for one in sets}.values())
    return [(one, s) for one in sets for s in suspicions(one, predictions(one, present), [c.name for c in present])]


def predictions(one: MeasuredSet, present: list[Component]) -> Predictions:
    names = ["saturation_pressure", "liquid_density", "vapor_density"]
    saturated = library.saturation(one.component, one.temperature, names).values
    others = {c: values(c, one) for c in present if c is not one.component}
    other_phase = {"liquid": saturated["vapor_density"], "vapor": saturated["liquid_density"]}.get(one.phase)
    return Predictions(
        values(one.component, one),
        others,
        saturated["saturation_pressure"],
        other_phase,
        lambda temperature: values(one.component, replace(one, temperature=temperature)),
    )


def values(component: Component, one: MeasuredSet) -> NDArray[np.float64]:
    if one.property != "density":
        return library.saturation(component, one.temperature, [one.property]).values[one.property]
    return np.array(
        [density(component, one.phase, *state) for state in zip(one.temperature, one.pressure, strict=True)]
    )


def density(component: Component, phase: str, temperature: float, pressure: float) -> float:
    """The root of the stated phase, not a flash: liquid points lie a hair below saturation."""
    from CoolProp.CoolProp import PT_INPUTS, AbstractState, iphase_gas, iphase_liquid

    state = AbstractState("HEOS", component.library_name)
    if phase != "fluid":
        state.specify_phase(iphase_liquid if phase == "liquid" else iphase_gas)
    try:
        state.update(PT_INPUTS, pressure, temperature)
    except ValueError:
        return float("nan")
    return float(state.rhomolar())


def test_swapped_fluids() -> None:
    found = suspected("traps/je700126z")
    assert [(one.component.name, s.cause, s.other) for one, s in found] == [
        ("n-Hexane", "other substance", "CycloHexane"),
        ("CycloHexane", "other substance", "n-Hexane"),
    ]
    assert "are exchanged: the values of density of each lie on the curve of the other" in exchanged(found)[0][1]


def test_a_logarithm_for_a_pressure() -> None:
    [(one, found)] = suspected("traps/je800436u")
    assert one.component.name == "Water"
    assert "the values are ln(p/kPa), stored as a pressure in kPa" in found.sentence


def test_an_absurd_uncertainty_lies_on_points_far_off() -> None:
    found = {one.block: s for one, s in suspected("traps/j.jct.2004.07.017")}
    assert {s.cause for s in found.values()} == {"outlier"}
    assert "row 1 at 120 K: +1.12e+03 % from the reference" in found[16].sentence


def test_a_mislabelled_phase() -> None:
    [(one, found)] = suspected("traps/s10765-006-0053-2")
    assert (one.component.name, found.cause) == ("n-Butane", "phase")
    assert "3 of 16 points labelled liquid lie below the saturation pressure, by 6.0 % at most" in found.sentence
    assert "so the phase is mislabelled or the pressure nominal" in found.sentence


@pytest.mark.parametrize(
    "file", ["j.jct.2004.12.016", "j.jct.2015.09.034", "je400970y", "j.fluid.2014.09.017", "je0497496", "je049842u"]
)
def test_a_good_file_is_not_suspected(file: str) -> None:
    assert suspected(file) == []

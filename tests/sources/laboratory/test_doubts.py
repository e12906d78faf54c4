"""Laboratory files that contradict themselves, or cannot be read: said and counted. All numbers are invented."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from eosmuster.components import find
from eosmuster.sources.laboratory import reader as laboratory
from eosmuster.sources.laboratory.columns import Descriptor
from eosmuster.sources.measured.table import Reading

M_PROPANE = find("propane").molar_mass or 0.0
K95 = 1.959963984540054


def read(*lines: str, **descriptor: Any) -> Reading:
    return laboratory.read_text("\n".join([*lines, ""]).encode(), "lab.csv", Descriptor(**descriptor))


def told(reading: Reading) -> list[str]:
    return [f"{d.code}: {d.sentence}" for d in reading.diagnostics]


@pytest.mark.parametrize(
    ("k", "factor", "u", "words"),
    [
        ("k=0.1", {}, 0.4 / K95, "its coverage factor '0.1' cannot be used (valid: 0.5 to 10); 95 % is assumed"),
        ("k=20", {}, 0.4 / K95, "its coverage factor '20' cannot be used (valid: 0.5 to 10); 95 % is assumed"),
        ("k=0.5", {}, 0.8, ""),
        ("k=10", {}, 0.04, ""),
        (
            "k=0.1",
            {"level": 95.45},
            0.2,
            "its coverage factor '0.1' cannot be used (valid: 0.5 to 10); its level of confidence is taken",
        ),
        (
            "k=0.1",
            {"level": 0.95},
            0.4 / K95,
            "its coverage factor '0.1' cannot be used (valid: 0.5 to 10); its level of confidence 0.95 cannot be "
            "used (valid: 50 to below 100 %); 95 % is assumed",
        ),
        ("k=2", {"coverage_factor": "two"}, 0.2, ""),
    ],
)
def test_a_coverage_factor_that_cannot_be_used_is_named(k: str, factor: dict[str, Any], u: float, words: str) -> None:
    title = f"U(liquid_density; {k}) [kg/m3]"
    header = f"component,temperature [K],liquid_density [kg/m3],{title}"
    reading = read(header, "propane,290,500.00,0.4", fields={title: {"name": title, **factor}})
    [one] = reading.sets
    # 95.45 % is k = 2 to five digits
    np.testing.assert_allclose(one.standard_uncertainty, u / M_PROPANE, rtol=1e-5)
    assert told(reading) == ([f"uncertainty: column '{title}': {words}"] if words else [])
    assert one.level_assumed.tolist() == ["is assumed" in words]


def test_a_coordinate_that_the_property_settles_itself_is_not_dropped_without_a_word() -> None:
    reading = read(
        "component,temperature [K],pressure [kPa],boiling temperature [K],saturation_pressure [kPa]",
        "propane,300,101.325,231.05,998",
        "propane,310,,,1250",
        "propane,320,0,,1590",
        "propane,330,100,,soft",
    )
    assert [len(one) for one in sorted(reading.sets, key=lambda one: one.series)] == [1, 3]
    besides = "given besides: the value is one itself"
    assert [s for s in told(reading) if s.startswith("state: ")] == [
        f"state: column 'saturation_pressure [kPa]': 2 lines (2, 4) read without the pressure {besides}",
        f"state: column 'boiling temperature [K]': line 2 read without the temperature {besides}",
    ]
    assert [one.lost for one in reading.diagnostics if one.code == "state"] == [0, 0]


@pytest.mark.parametrize(
    ("titles", "cells", "lost"),
    [
        ("saturation_pressure [barg]", ["8.97", "11.5"], 2),
        ("saturation_presure [kPa]", ["998", ""], 1),
        ("saturation_pressure [kPa],vapor pressure [bar]", ["998,9.98", "1250,-"], 3),
        ("viscosity [Pa s]", ["8e-6", "9e-6"], 2),
        ("operator", ["XY", "XZ"], 0),
        ("u(saturation_pressure) [barg]", ["0.1", "0.1"], 0),
        ("temperature [furlong]", ["1", "2"], 0),
    ],
)
def test_values_of_columns_that_cannot_be_read_are_counted(titles: str, cells: list[str], lost: int) -> None:
    rows = [f"propane,300,{cell}" for cell in cells]
    reading = read(f"component,temperature [K],{titles}", *rows, missing=frozenset({"", "-"}))
    assert sum(one.lost for one in reading.diagnostics if one.code == "column") == reading.values == lost


def test_values_of_unreadable_columns_are_lost_with_lines_of_another_length_too() -> None:
    reading = read("component,temperature [K],saturation_pressure [barg]", "propane,300,998", "propane,300")
    assert [one.lost for one in reading.diagnostics][:2] == [1, 1]
    assert reading.values == 2


@pytest.mark.parametrize(
    ("quantity", "phase", "valid"),
    [
        ("liquid_density [kg/m3]", "vapor", "liquid, fluid, two-phase"),
        ("liquid_density [kg/m3]", "Saturated Vapour", "liquid, fluid, two-phase"),
        ("vapor_density [kg/m3]", "liquid", "vapor, fluid, two-phase"),
        ("saturation_pressure [kPa]", "solid", "liquid, vapor, fluid, two-phase"),
        ("liquid_density [kg/m3]", "Liquid", ""),
        ("liquid_density [kg/m3]", "saturated liquid", ""),
        ("vapor_density [kg/m3]", "gas", ""),
        ("enthalpy_of_vaporization [kJ/mol]", "two-phase", ""),
        ("saturation_pressure [kPa]", "", ""),
    ],
)
def test_a_phase_that_contradicts_the_property_loses_the_value(quantity: str, phase: str, valid: str) -> None:
    reading = read(f"component,phase,temperature [K],{quantity}", f"propane,{phase},300,12")
    assert len(reading.sets) == (not valid)
    said = f"phase: column '{quantity}': line 2 left out: the phase is '{phase}'; valid: {valid}"
    assert told(reading) == ([said] if valid else [])
    assert sum(one.lost for one in reading.diagnostics) == bool(valid)


def test_a_phase_is_quoted_as_it_is_written() -> None:
    reading = read("component,phase,temperature [K],pressure [kPa],density [kg/m3]", "propane,gas phase,300,100,2")
    assert "the phase is 'gas phase'; valid: liquid, vapor, fluid" in told(reading)[0]

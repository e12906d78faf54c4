"""Own laboratory data in CSV: read in SI, and every doubt named. All numbers are invented."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from eosmuster.components import Component, find
from eosmuster.sources.laboratory import reader as laboratory
from eosmuster.sources.measured.table import CODES, ORIGINS, MeasuredSet, Reading

M_PROPANE = find("propane").molar_mass or 0.0
HALF = 0.5 / 3.0**0.5
K95 = 1.959963984540054


def read(text: str | bytes, **descriptor: Any) -> Reading:
    return laboratory.read_text(text if isinstance(text, bytes) else text.encode(), "lab.csv", **descriptor)


def only(reading: Reading) -> MeasuredSet:
    [one] = reading.sets
    return one


def told(reading: Reading) -> list[str]:
    assert {d.code for d in reading.diagnostics} <= CODES.keys()
    return [f"{d.code}: {d.sentence}" for d in reading.diagnostics]


def pressures(*cells: str, header: str = "component, temperature [K], saturation_pressure [kPa]") -> Reading:
    return read("\n".join([header, *cells]) + "\n")


def test_units_in_the_header() -> None:
    reading = read(
        "component, temperature [degC], saturation_pressure [bar], u(saturation_pressure) [bar], method\n"
        "propane, 20.00, 8.364, 0.002, static cell\n"
        "propane, 40.00, 13.694, 0.002, static cell\n"
    )
    one = only(reading)
    assert told(reading) == []
    assert (one.component.name, one.property) == ("n-Propane", "saturation_pressure")
    assert (one.phase, one.state) == ("two-phase", "saturated")
    assert (one.method, one.source.name, one.block, one.series) == ("static cell", "lab.csv", 1, 3)
    np.testing.assert_allclose(one.temperature, [293.15, 313.15])
    np.testing.assert_allclose(one.values, [836400.0, 1369400.0])
    np.testing.assert_allclose(one.standard_uncertainty, 200.0)
    np.testing.assert_allclose(one.rounding, HALF * 100.0)
    assert one.rows.tolist() == [2, 3]
    assert one.digits.tolist() == [4, 5]
    assert np.isnan(one.pressure).all()


@pytest.mark.parametrize(
    ("column", "value", "u", "assumed"),
    [
        ("u(liquid_density) [kg/m3]", "0.4", 0.4, False),
        ("U(liquid_density) [kg/m3]", "0.4", 0.4 / K95, True),
        ("U(liquid_density, k=2) [kg/m3]", "0.4", 0.2, False),
        ("u(liquid_density) [%]", "0.1", 0.5, False),
    ],
)
def test_uncertainties_are_standard_expanded_or_relative(column: str, value: str, u: float, assumed: bool) -> None:
    reading = read(f'component;temperature [K];liquid_density [kg/m3];"{column}"\npropane;290;500.00;{value}\n')
    one = only(reading)
    np.testing.assert_allclose(one.standard_uncertainty, u / M_PROPANE)
    assert one.level_assumed.tolist() == [assumed]
    assert ORIGINS[one.origin[0]] == "author"
    assert any("95 % is assumed" in sentence for sentence in told(reading)) == assumed


def test_boiling_temperatures_and_several_properties_on_a_line() -> None:
    reading = read(
        "component,temperature [K],pressure [kPa],boiling temperature [degC],vapour density [mol/m3],"
        "enthalpy of vaporization [kJ/mol]\n"
        "propane,300,101.325,-42.1,490,14.8\npropane,,500,1.7,,\n"
    )
    boiling, vapor, enthalpy = sorted(reading.sets, key=lambda one: one.series)
    np.testing.assert_allclose(boiling.values, [231.05, 274.85])
    np.testing.assert_allclose(boiling.pressure, [101325.0, 500000.0])
    assert np.isnan(boiling.temperature).all()
    np.testing.assert_allclose(vapor.values, [490.0])
    np.testing.assert_allclose(enthalpy.values, [14800.0])
    assert reading.values == 4


def test_a_semicolon_is_found_out_and_said() -> None:
    reading = pressures("propane;300;998", header="component;temperature [K];saturation_pressure [kPa]")
    assert len(only(reading)) == 1
    assert told(reading) == ["writing: its cells are delimited by semicolons, it seems"]


@pytest.mark.parametrize(
    ("encoded", "said"),
    [
        ("component,temperature [°C],saturation_pressure [kPa]\npropane,20,836\n".encode("utf-8-sig"), []),
        (
            "component,temperature [°C],saturation_pressure [kPa]\npropane,20,836\n".encode("cp1252"),
            ["writing: it is not UTF-8 and was read as Windows-1252"],
        ),
        (
            "component,temperature [°C],saturation_pressure [kPa]\npropane,20,836\n".encode("utf-16"),
            ["writing: it was read as UTF-16, by its byte order mark"],
        ),
        (b"component,temperature [degC],saturation_pressure [kPa]\r\npropane,20,836\r\n", []),
        (b"# a comment\n\ncomponent,temperature [degC],saturation_pressure [kPa]\n\n# more\npropane,20,836", []),
    ],
)
def test_byte_order_marks_line_ends_and_comments(encoded: bytes, said: list[str]) -> None:
    reading = read(encoded)
    assert told(reading) == said
    np.testing.assert_allclose(only(reading).temperature, 293.15)


COMMA = "declare decimalChar or groupChar in a descriptor, or write 1234.5"


@pytest.mark.parametrize(
    ("cell", "words"),
    [
        ("998,5", f"'998,5' has a comma, which may be a decimal comma or a thousands separator: {COMMA}"),
        ("1,998.5", "has a comma"),
        ("1.998,5", "has a comma"),
        ("1.998.500", "has several points, which may be thousands separators"),
        ("1 998.5", "has thousands separators"),
        ("1'998.5", "has thousands separators"),
    ],
)
def test_a_doubtful_number_makes_its_column_doubtful(cell: str, words: str) -> None:
    """1.250 beside 998,5 is 1250 to whoever wrote it."""
    reading = pressures(
        "propane;310;1.250", f"propane;300;{cell}", header="component;temperature [K];saturation_pressure [kPa]"
    )
    assert reading.sets == ()
    [sentence] = [s for s in told(reading) if "delimited" not in s]
    assert sentence.startswith("writing: column 'saturation_pressure [kPa]': 2 lines (2, 3) left out")
    assert words in sentence
    assert sum(d.lost for d in reading.diagnostics) == reading.values == 2


def test_a_doubtful_temperature_leaves_out_what_needs_it() -> None:
    reading = pressures(
        "propane;300,5;998", "propane;310;1250", header="component;temperature [K];saturation_pressure [kPa]"
    )
    assert reading.sets == ()
    assert "in column 'temperature [K]' '300,5' has a comma" in told(reading)[1]


@pytest.mark.parametrize(
    ("cell", "words"),
    [
        ("n/a", "'n/a' is text in a column of numbers"),
        ("998 kPa", "'998 kPa' is text in a column of numbers"),
        ("<998", "'<998' is a limit, not a value"),
        ("nan", "'nan' is text in a column of numbers"),
        ("1e999", "'1e999' is text in a column of numbers"),
        ("٩٩٨", "is text in a column of numbers"),
        ("-998", "-998 kPa cannot be"),
        ("0", "0 kPa cannot be"),
    ],
)
def test_a_cell_that_is_no_number_loses_its_own_value_only(cell: str, words: str) -> None:
    reading = pressures("propane,310,1250", f"propane,300,{cell}")
    assert only(reading).values.tolist() == [1250000.0]
    [sentence] = told(reading)
    assert sentence.startswith("row: column 'saturation_pressure [kPa]': line 3 left out: ")
    assert words in sentence


def test_an_empty_cell_is_no_value() -> None:
    reading = pressures("propane,310,1250", "propane,300,")
    assert (len(only(reading)), told(reading), reading.values) == (1, [], 1)


@pytest.mark.parametrize(
    ("u", "words", "points"),
    [
        ("0", "line 2 read without the uncertainty: 0 counts as missing", 2),
        ("-3", "line 2 read without the uncertainty, which is negative", 2),
        ("2000", "line 2 left out: the stated uncertainty is larger than the value", 1),
        ("0.0001", "line 2: the stated uncertainty is below the rounding of the last printed digit", 2),
        ("few", "nothing is taken of line 2: 'few' is text in a column of numbers", 2),
    ],
)
def test_an_uncertainty_that_cannot_be(u: str, words: str, points: int) -> None:
    header = "component,temperature [K],saturation_pressure [kPa],u(saturation_pressure) [kPa]"
    reading = pressures(f"propane,300,998,{u}", "propane,310,1250,2", header=header)
    assert len(only(reading)) == points
    [sentence] = told(reading)
    assert words in sentence


@pytest.mark.parametrize(
    ("header", "words"),
    [
        ("component,temperature [K],saturation_pressure", "'saturation_pressure' has no unit; write e.g."),
        ("component,temperature [K],saturation_pressure [kpa]", "unknown unit 'kpa'; nearest: kPa"),
        ("component,temperature [K],saturation_pressure [barg]", "is a gauge pressure"),
        ("component,temperature [K],saturation_presure [kPa]", "nearest: saturation_pressure"),
        ("component,temperature [K],viscosity [Pa s]", "column 'viscosity [Pa s]' is not read; "),
    ],
)
def test_a_column_that_cannot_be_read_says_so(header: str, words: str) -> None:
    reading = pressures("propane,300,998", header=header)
    assert reading.sets == ()
    sentences = told(reading)
    assert any(sentence.startswith("column: ") and words in sentence for sentence in sentences)
    assert "file: no column holds measured values; valid: saturation_pressure" in " ".join(sentences)


def test_a_column_of_remarks_is_named_and_passed_over() -> None:
    reading = pressures("propane,300,998,XY", header="component,temperature [K],saturation_pressure [kPa],operator")
    assert len(only(reading)) == 1
    [sentence] = told(reading)
    assert sentence.startswith("column: column 'operator' is not read; ")


def test_a_column_that_stands_twice_is_not_read() -> None:
    header = "fluid,temperature [K],temperature [degC],saturation_pressure [kPa]"
    reading = pressures("propane,300,26.85,998", header=header)
    assert (
        told(reading)[0] == "column: 'temperature [K]' and 'temperature [degC]' are both temperature; neither is read"
    )
    assert "no temperature is given" in told(reading)[1]


def test_a_fluid_that_is_named_twice_is_one() -> None:
    reading = pressures("propane,300,998", "R290,310,1250", "n-Propane,320,1590")
    assert len(only(reading)) == 3
    assert told(reading) == ["substance: 'propane' and 'R290' and 'n-Propane' are the same, n-Propane"]


def test_two_columns_of_fluids_are_refused() -> None:
    reading = pressures("propane,butane,300,998", header="component,fluid,temperature [K],saturation_pressure [kPa]")
    assert told(reading)[0] == "column: 'component' and 'fluid' are both component; neither is read"
    assert "no component is named" in told(reading)[1]


def test_unknown_fluids_lose_their_lines_only() -> None:
    reading = pressures("propane,300,998", "propanol,310,1", "plant cut 7,320,2")
    assert len(only(reading)) == 1
    assert [d.lost for d in reading.diagnostics] == [1, 1]
    assert "component 'propanol' is unknown; nearest: " in told(reading)[0]


def test_components_of_the_plan_are_known() -> None:
    own = Component("plant cut 7", critical_temperature=540.2, critical_pressure=27.4e5, acentric_factor=0.35)
    text = "component,temperature [K],saturation_pressure [kPa],liquid_density [kg/m3]\nPlant Cut 7,320,2,700\n"
    reading = read(text, own=[own])
    assert only(reading).component is own
    [sentence] = told(reading)
    assert sentence.endswith("line 2 left out: plant cut 7 has no molar mass, which 'kg/m3' needs")


def test_lines_of_another_length_are_left_out() -> None:
    reading = pressures("propane,300,998", "propane,300,5,1000", "propane,310")
    assert len(only(reading)) == 1
    [sentence] = told(reading)
    assert sentence.startswith(
        "row: 2 lines (3, 4) left out: another number of cells than the 3 of the header in line 1, 4 in line 3; "
    )
    assert "a decimal comma" in sentence
    [alone] = told(pressures("propane,300,998", "propane,310"))
    assert alone.startswith("row: line 3 left out: another number of cells than the 3 of the header in line 1, 2 in")


def test_a_density_needs_its_pressure() -> None:
    reading = read("component,temperature [K],density [kg/m3]\npropane,290,508\n")
    assert reading.sets == ()
    assert told(reading) == ["state: column 'density [kg/m3]': line 2 left out: no pressure is given"]


def test_a_phase_nobody_knows_is_refused() -> None:
    reading = read("component,phase,temperature [K],pressure [kPa],density [kg/m3]\npropane,solid,80,100,700\n")
    assert told(reading) == [
        "phase: column 'density [kg/m3]': line 2 left out: the phase is 'solid'; valid: liquid, vapor, fluid"
    ]


def test_nothing_but_delimiters_is_refused() -> None:
    reading = laboratory.read_text(b",", "empty.csv")
    assert [d.sentence for d in reading.diagnostics] == ["it holds nothing but empty cells"]

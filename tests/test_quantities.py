"""Units: every table against its definition, every refusal against its sentence."""

from __future__ import annotations

import math
import time

import pytest

from eosmuster.errors import InputError
from eosmuster.quantities import PROPERTIES, UNITS, from_si, shown, split_quantity, to_si

# Definitions: SI Brochure (9th ed., 2019) and NIST SP 811 (2008), appendix B; the pound is 0.453 592 37 kg and the
# inch 25.4 mm exactly, the conventional gravity 9.806 65 m/s2, the standard atmosphere 101 325 Pa.
DEFINED = [
    ("0 degC", "temperature", 273.15),
    ("-40 degF", "temperature", 233.15),
    ("32 degF", "temperature", 273.15),
    ("491.67 degR", "temperature", 273.15),
    ("1 degF", "temperature_difference", 5 / 9),
    ("1 degC", "temperature_difference", 1.0),
    ("1 atm", "pressure", 101325.0),
    ("760 Torr", "pressure", 101325.0),
    ("1 at", "pressure", 9.80665e4),
    ("1 psi", "pressure", 0.45359237 * 9.80665 / 0.0254**2),
    ("1 mmHg", "pressure", 13.5951 * 9.80665),
    ("10 mbar", "pressure", 1000.0),
    ("1 MPa", "pressure", 1e6),
    ("44.1 g/mol", "molar_mass", 0.0441),
    ("44.1 kg/kmol", "molar_mass", 0.0441),
    ("1 mol/L", "density", 1000.0),
    ("0.5 g/cm3", "mass_density", 500.0),
    ("1 kJ/mol", "energy", 1000.0),
    ("1 cm3/mol", "molar_volume", 1e-6),
    ("2 %", "fraction", 0.02),
]


@pytest.mark.parametrize(("text", "dimension", "si"), DEFINED)
def test_units_follow_their_definition(text: str, dimension: str, si: float) -> None:
    assert to_si(text, dimension, "t") == pytest.approx(si, rel=1e-15, abs=0)


@pytest.mark.parametrize("dimension", UNITS)
def test_every_unit_there_and_back(dimension: str) -> None:
    for unit in UNITS[dimension]:
        assert from_si(to_si(f"37.5 {unit}", dimension, "t"), unit, dimension) == pytest.approx(37.5, rel=1e-13)


@pytest.mark.parametrize("dimension", UNITS)
def test_the_first_unit_of_a_dimension_is_si_and_a_bare_number_is_si(dimension: str) -> None:
    first = next(iter(UNITS[dimension]))
    expected = 0.01 * 2.5 if dimension == "fraction" else 2.5
    assert to_si(f"2.5 {first}", dimension, "t") == expected
    assert to_si(2.5, dimension, "t") == to_si("2.5", dimension, "t") == 2.5


def test_property_units_are_the_si_units_of_their_dimension() -> None:
    for prop in PROPERTIES.values():
        assert UNITS[prop.dimension][prop.unit] == (1.0, 0.0)


@pytest.mark.parametrize(
    ("text", "plain"),
    [
        ("20 °C", "20 degC"),
        ("68 °F", "68 degF"),
        ("  +2.5e1degC ", "25 degC"),
        (".5 K", "0.5 K"),
    ],
)
def test_spellings_of_a_temperature(text: str, plain: str) -> None:
    assert to_si(text, "temperature", "t") == to_si(plain, "temperature", "t")


@pytest.mark.parametrize(("text", "plain"), [("3 bara", "3 bar"), ("14.7 psia", "14.7 psi"), ("3 bar(a)", "3 bar")])
def test_an_absolute_basis_may_be_said(text: str, plain: str) -> None:
    assert to_si(text, "pressure", "t") == to_si(plain, "pressure", "t")


def test_a_cubic_metre_may_be_written_with_its_exponent() -> None:
    assert to_si("500 kg/m³", "mass_density", "t") == 500.0


@pytest.mark.parametrize(
    "text", ["3 barg", "3 bar(g)", "3 bar g", "40 psig", "40 PSIG", "-0.2 kPag", "1 atg", "3 bar gauge"]
)
def test_gauge_pressure_is_never_guessed(text: str) -> None:
    with pytest.raises(InputError, match=r"plan: .*gauge pressure; .*never guessed"):
        to_si(text, "pressure", "plan")


@pytest.mark.parametrize(
    ("value", "dimension", "said"),
    [
        ("25 degX", "temperature", r"unknown unit 'degX'; nearest: .*degC.*valid: K, degC, degF, degR"),
        ("25 K", "pressure", "unknown unit 'K'; .*valid: Pa"),
        ("warm", "temperature", "'warm' is not a temperature; write a number or e.g. \"20 degC\""),
        ("", "temperature", "'' is not a temperature"),
        ("2,5 bar", "pressure", "comma in its number; write a decimal point"),
        ("1.013,25 mbar", "pressure", "comma in its number"),
        ("nan", "temperature", "'nan' is not a temperature"),
        ("1e999 K", "temperature", "'1e999 K' is not a finite number"),
        (math.nan, "pressure", "nan is not a finite number"),
        (-math.inf, "pressure", "-inf is not a finite number"),
        (10**400, "pressure", "an integer of more than 60 digits is not a finite number"),
        (True, "pressure", "True is not a pressure"),
        (None, "pressure", "None is not a pressure"),
        ([1.0], "pressure", "a list is not a pressure"),
        ({"a": 1}, "pressure", "a table is not a pressure"),
    ],
)
def test_what_is_no_quantity_is_said_in_one_sentence(value: object, dimension: str, said: str) -> None:
    with pytest.raises(InputError, match=said) as caught:
        to_si(value, dimension, "plan.toml: key")
    assert str(caught.value).startswith("plan.toml: key: ")
    assert "\n" not in str(caught.value)


def test_split_keeps_the_number_as_written_and_tells_dimensions_apart() -> None:
    assert split_quantity("7 %", ("fraction", "density"), "t") == (7.0, "%")
    assert split_quantity("7 kg/m3", ("fraction", "density", "mass_density"), "t") == (7.0, "kg/m3")
    assert split_quantity(7, ("fraction",), "t") == (7.0, "")


def test_megabytes_are_refused_quickly_and_quoted_short() -> None:
    begin = time.perf_counter()
    with pytest.raises(InputError) as caught:
        to_si("1" + " " * 3_000_000 + "x", "pressure", "t")
    assert len(str(caught.value)) < 200
    assert time.perf_counter() - begin < 1.0  # a backtracking pattern would need hours


def test_a_deeply_nested_table_is_named_not_quoted() -> None:
    nested: dict[str, object] = {}
    for _ in range(5000):  # deeper than repr can follow
        nested = {"a": nested}
    assert shown(nested) == "a table"

"""ThermoML: both forms of the archive, every property that is read, and everything that is counted and not read.

The files in ../fixtures/thermoml are invented and valid against the schema, version 4.0; the expected numbers are
worked out by hand from them. Molar masses are those of the catalogue.
"""

from __future__ import annotations

import io
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from eosmuster.components import find
from eosmuster.sources.measured.repeats import combined
from eosmuster.sources.measured.table import CODES, ORIGINS, MeasuredSet, Reading, columns
from eosmuster.sources.thermoml import reader as thermoml

FIXTURES = Path(__file__).parents[1] / "fixtures" / "thermoml"
M_PROPANE, M_R134A, M_CO2 = (find(name).molar_mass or 0.0 for name in ("propane", "R134a", "CO2"))
K95 = 1.959963984540054  # two-sided 95 % of the normal distribution, GUM table G.1
HALF = 0.5 / 3.0**0.5  # half a unit over sqrt(3)


@pytest.fixture(scope="module")
def read() -> Callable[[str], Reading]:
    return lambda name: combined([thermoml.read_file(FIXTURES / f"{name}.xml", f"{name}.xml")])


def block(reading: Reading, number: int, series: int = 1) -> MeasuredSet:
    [found] = [one for one in reading.sets if (one.block, one.series) == (number, series)]
    return found


def accounted(reading: Reading) -> int:
    """Values that were read, lost with a diagnostic, or counted as nobody's."""
    binary = sum(
        np.count_nonzero(~np.isnan(b.vapor_fraction)) if name == "vapor_fraction" else len(b)
        for b in reading.binaries
        for name in b.measured
    )
    lost = sum(d.lost for d in reading.diagnostics)
    return sum(map(len, reading.sets)) + binary + lost + sum(reading.unread.values())


@pytest.mark.parametrize("path", sorted(FIXTURES.glob("*.xml")), ids=lambda path: path.stem)
def test_every_value_is_accounted_for(path: Path) -> None:
    reading = thermoml.read_file(path)
    assert reading.values == path.read_text(encoding="utf-8").count("<PropertyValue>")
    assert accounted(reading) == reading.values
    assert {d.code for d in reading.diagnostics} <= CODES.keys()


@pytest.mark.parametrize("path", sorted(FIXTURES.glob("*.xml")), ids=lambda path: path.stem)
def test_the_fixtures_are_marked_invented(path: Path) -> None:
    assert "INVENTED" in path.read_text(encoding="utf-8")


# block, series -> component, property, phase, state, T/K, p/Pa, value in SI
OLDER = {
    (1, 1): ("n-Propane", "saturation_pressure", "two-phase", [250, 300, 350], None, [218400, 1001500, 2960000]),
    (2, 1): ("n-Propane", "boiling_temperature", "two-phase", None, [100e3, 500e3], [230.7, 274.9]),
    (3, 1): ("n-Propane", "boiling_temperature", "two-phase", None, [101325], [231.0]),
    (4, 1): ("n-Propane", "liquid_density", "liquid", [250, 300], None, [558.5 / M_PROPANE, 489.4 / M_PROPANE]),
    (4, 2): ("n-Propane", "vapor_density", "vapor", [250, 300], None, [5.02 / M_PROPANE, 21.6 / M_PROPANE]),
    (5, 1): ("n-Propane", "density", "liquid", [290, 290], [2e6, 5e6], [507.9 / M_PROPANE, 516.2 / M_PROPANE]),
    (6, 1): ("R134a", "density", "liquid", [300], [1.5e6], [1.0 / (0.00084 * M_R134A)]),
    (7, 1): ("R134a", "density", "fluid", [400], [3e6], [1150]),
    (8, 1): ("R134a", "density", "vapor", [320], [2e5], [80]),
    (9, 1): ("R134a", "enthalpy_of_vaporization", "two-phase", [280], None, [19400]),
    (10, 1): ("R134a", "density", "liquid", [240], [101325], [1400 / M_R134A]),  # "Air at 1 atmosphere"
    (11, 2): ("n-Propane", "liquid_density", "liquid", [270], None, [531.0 / M_PROPANE]),  # beside a viscosity
}


def test_the_older_form_holds_these_sets(read: Callable[[str], Reading]) -> None:
    reading = read("older_pure")
    assert {(one.block, one.series) for one in reading.sets} == OLDER.keys()
    assert reading.diagnostics == ()
    assert reading.unread == {"Viscosity, Pa*s": 1, "Speed of sound, m/s": 2}


@pytest.mark.parametrize(("number", "series"), OLDER)
def test_the_older_form_is_read_in_si(read: Callable[[str], Reading], number: int, series: int) -> None:
    one = block(read("older_pure"), number, series)
    component, name, phase, temperature, pressure, values = OLDER[number, series]
    nothing = [np.nan] * len(one)
    assert (one.component.name, one.property, one.phase) == (component, name, phase)
    assert one.state == ("single_phase" if name == "density" else "saturated")
    np.testing.assert_allclose(one.temperature, temperature or nothing, rtol=1e-15)
    np.testing.assert_allclose(one.pressure, pressure or nothing, rtol=1e-15)
    np.testing.assert_allclose(one.values, values, rtol=1e-15 * 4)


def test_the_older_form_has_no_doi_and_is_named_by_its_file(read: Callable[[str], Reading]) -> None:
    source = read("older_pure").sets[0].source
    assert (source.doi, source.name) == ("", "older_pure.xml")
    assert source.citation == "Nobody, N.; Noone, M.: Invented numbers. J. Invented Data 7 (2031) 1-9"


def test_a_citation_is_whole_and_has_no_given_names() -> None:
    citation = """<Citation xmlns="http://www.iupac.org/namespaces/ThermoML"><sAuthor>Nobody, N.[Nora]</sAuthor>
    <sAuthor>Noone, M. [Max]</sAuthor><sPubName>J. Invented Data</sPubName><yrPubYr>2031</yrPubYr>
    <sTitle>On [water]
    and ice.</sTitle><sDOI>10.1234/x</sDOI><sVol>7</sVol></Citation>"""
    good = (FIXTURES / "older_pure.xml").read_text(encoding="utf-8")
    begin, end = good.index("<Citation>"), good.index("</Citation>") + len("</Citation>")
    data = (good[:begin] + citation + good[end:]).encode()
    source = thermoml.read_stream(io.BytesIO(data), "a.xml").sets[0].source
    said = "Nobody, N.; Noone, M.: On [water] and ice. J. Invented Data 7 (2031)"
    assert (source.name, source.citation) == ("10.1234/x", said)
    assert source.reference == f"{said}. doi:10.1234/x"


def test_methods_names_digits_and_rows_come_along(read: Callable[[str], Reading]) -> None:
    reading = read("older_pure")
    first = block(reading, 1)
    assert first.method == "Closed cell (Static) method"
    assert first.rows.tolist() == [1, 2, 3]
    assert first.digits.tolist() == [4, 5, 4]
    assert block(reading, 9).written == "ethane, 1,1,1,2-tetrafluoro-"


def test_uncertainties_of_the_state_come_along(read: Callable[[str], Reading]) -> None:
    assert block(read("older_pure"), 5).pressure_uncertainty.tolist() == [1500.0, 2000.0]  # of a variable
    assert block(read("older_pure"), 6).pressure_uncertainty.tolist() == [750.0]  # of a constraint


def test_the_rounding_of_a_volume_is_that_of_its_density(read: Callable[[str], Reading]) -> None:
    volume = block(read("older_pure"), 6)  # 0.00084 m3/kg with two digits: half a unit is 5e-6
    np.testing.assert_allclose(volume.rounding / volume.values, HALF * 1e-5 / 0.00084, rtol=1e-12)


def test_the_newer_form_goes_by_inchikey_and_combined_uncertainty(read: Callable[[str], Reading]) -> None:
    reading = read("newer_pure")
    first = block(reading, 1)
    assert first.component.name == "CarbonDioxide"
    assert first.source.name == "10.0000/invented.2031.7"
    assert [ORIGINS[code] for code in first.origin] == ["combined", "combined"]
    np.testing.assert_allclose(first.standard_uncertainty, 9800.0 / K95, rtol=1e-12)
    compressed = block(reading, 2)  # both a combined (1.2 kg/m3, k = 2) and an author's uncertainty (0.2)
    np.testing.assert_allclose(compressed.standard_uncertainty, 0.6 / M_CO2, rtol=1e-12)
    assert [(d.block, d.code, d.lost) for d in reading.diagnostics] == [(3, "substance", 1), (4, "substance", 1)]


def test_binary_bubble_points_take_the_vapor_of_the_other_block(read: Callable[[str], Reading]) -> None:
    reading = read("binary")
    joined, isobaric = reading.binaries
    assert joined.blocks == (1, 2)
    assert [c.name for c in joined.components] == ["R32", "n-Propane"]
    assert joined.measured == ("pressure", "vapor_fraction")
    np.testing.assert_allclose(joined.pressure, [580e3, 1020e3, 1060e3])
    np.testing.assert_allclose(joined.liquid_fraction, [0.0, 0.4, 0.7])
    # the other block gives the fractions of propane, in another order, and one state that has no bubble point
    np.testing.assert_allclose(joined.vapor_fraction, [np.nan, 0.55, 0.67])
    np.testing.assert_allclose(joined.uncertainty["vapor_fraction"], [np.nan, 0.005, 0.004])
    np.testing.assert_allclose(joined.uncertainty["pressure"], [2000.0] * 3)
    assert [(d.block, d.lost) for d in reading.diagnostics] == [(2, 1)]
    assert isobaric.measured == ("temperature", "vapor_fraction")
    assert [c.name for c in isobaric.components] == ["R32", "n-Propane"]  # turned round to the order of the others
    assert (isobaric.temperature[0], isobaric.pressure[0]) == (248.1, 300e3)
    np.testing.assert_allclose([isobaric.liquid_fraction[0], isobaric.vapor_fraction[0]], [0.5, 0.61])


def test_mixtures_nobody_judges_are_counted(read: Callable[[str], Reading]) -> None:
    unread = read("binary").unread
    assert unread["Vapor or sublimation pressure, kPa (mixture)"] == 1  # with a substance that is not catalogued
    assert unread["Mass density, kg/m3 (mixture)"] == 1
    assert sum(unread.values()) == 3  # and a dew point without the liquid's composition


# block -> standard uncertainty in Pa, where from, level assumed; the value is 1000 kPa with four digits
UNCERTAINTIES = {
    1: (10e3 / K95, "author", False),
    2: (10e3 / 1.6448536269514722, "author", False),
    3: (10e3 / 0.9741138770593092, "author", False),
    4: (10e3 / 0.9944578832097532, "author", False),
    5: (10e3 / 2.0000024438996027, "author", False),
    6: (10e3 / K95, "author", True),  # a stray level of 0.02
    7: (10e3 / K95, "author", True),  # no level
    8: (5e3, "author", False),  # coverage factor 2
    9: (5e3, "author", False),  # standard
    10: (np.nan, "none", False),  # 0
    11: (np.nan, "none", False),  # negative
    13: (HALF * 1e3, "rounding floor", False),  # 1 mPa on four digits of 1000 kPa
    14: (np.nan, "none", False),
    15: (7e3, "author", False),  # the larger of two assessments
    16: (2e3, "combined", False),
    17: (6e3, "author", False),  # +4 -6
    18: (8e3 / K95, "combined", True),
    19: (np.nan, "none", False),
}


@pytest.mark.parametrize("number", UNCERTAINTIES)
def test_stated_uncertainties_become_standard_ones(read: Callable[[str], Reading], number: int) -> None:
    one = block(read("uncertainties"), number)
    u, origin, assumed = UNCERTAINTIES[number]
    np.testing.assert_allclose(one.standard_uncertainty, u, rtol=1e-9)
    assert {ORIGINS[code] for code in one.origin} == {origin}
    assert set(one.level_assumed.tolist()) == {assumed}


@pytest.mark.parametrize(
    ("number", "code", "words", "lost"),
    [
        (6, "uncertainty", "without a usable level of confidence: 95 % is assumed", 0),
        (10, "uncertainty", "0 counts as missing", 0),
        (11, "uncertainty", "which is negative", 0),
        (12, "uncertainty", "left out: the stated uncertainty is larger than the value", 1),
        (13, "rounding", "below the rounding of the last printed digit", 0),
    ],
)
def test_what_is_odd_about_an_uncertainty_is_said(
    read: Callable[[str], Reading], number: int, code: str, words: str, lost: int
) -> None:
    [found] = [d for d in read("uncertainties").diagnostics if d.block == number and d.code != "repeated"]
    assert (found.code, found.lost) == (code, lost)
    assert words in found.sentence


def test_an_uncertainty_larger_than_the_value_leaves_the_point_out(read: Callable[[str], Reading]) -> None:
    assert 12 not in {one.block for one in read("uncertainties").sets}


REFUSED = {
    1: ("presentation", "'Ratio with the reference state, X/X(REF)'"),
    2: ("state", "'Upper temperature, K'"),
    3: ("state", "'Partial pressure, kPa'"),
    4: ("values", "it has no values"),
    7: ("phase", "'Crystal'"),
    8: ("phase", "'Ideal gas'"),
    9: ("state", "temperature alone is given"),
    10: ("presentation", "predicted, not measured"),
    11: ("state", "'Frequency, MHz'"),
    14: ("state", "temperature and pressure are both given"),
    15: ("phase", "it belongs to 'Gas', and the phases named are Liquid"),
}


@pytest.mark.parametrize("number", REFUSED)
def test_a_block_that_is_no_measured_value_is_refused(read: Callable[[str], Reading], number: int) -> None:
    reading = read("refusals")
    [found] = [d for d in reading.diagnostics if d.block == number]
    code, words = REFUSED[number]
    assert found.code == code
    assert words in found.sentence
    assert found.lost == (0 if code == "values" else 1)
    assert number not in {one.block for one in reading.sets}


def test_a_row_without_one_property_keeps_the_other(read: Callable[[str], Reading]) -> None:
    reading = read("refusals")
    assert block(reading, 5, 1).rows.tolist() == [1, 2]
    assert block(reading, 5, 2).rows.tolist() == [2]
    [told] = [d.sentence for d in reading.diagnostics if d.block == 5]
    assert told == "vapor_density: row 1 without a value of it"


def test_a_limit_is_no_value(read: Callable[[str], Reading]) -> None:
    assert block(read("refusals"), 6).rows.tolist() == [2]


def test_bad_rows_are_named_and_the_others_kept(read: Callable[[str], Reading]) -> None:
    reading = read("refusals")
    assert block(reading, 12).rows.tolist() == [1, 2]
    told = {d.sentence for d in reading.diagnostics if d.block == 12 and d.code == "row"}
    assert told == {
        "saturation_pressure: row 3 left out: its value is -5, which cannot be",
        "saturation_pressure: row 4 left out: variable 1 has no value",
        "saturation_pressure: row 5 left out: variable '2' is not declared",
    }


def test_repeated_points_are_marked_within_and_between_blocks(read: Callable[[str], Reading]) -> None:
    reading = read("refusals")
    assert block(reading, 12).repeats.tolist() == [False, True]
    assert block(reading, 13).repeats.tolist() == [True, False]


def test_repeated_points_are_marked_between_files() -> None:
    path = FIXTURES / "older_pure.xml"
    reading = combined([thermoml.read_file(path, "a.xml"), thermoml.read_file(path, "b.xml")])
    assert [one.repeats.all() for one in reading.sets] == [False] * len(OLDER) + [True] * len(OLDER)
    assert not any(one.repeats.any() for one in reading.sets[: len(OLDER)])
    assert "the first of them in a.xml, block 1" in reading.diagnostics[0].sentence
    assert reading.diagnostics[0].file == "b.xml"


def test_the_table_has_a_row_for_every_point(read: Callable[[str], Reading]) -> None:
    reading = read("older_pure")
    table = columns(reading.sets)
    assert {len(column) for column in table.values()} == {sum(map(len, reading.sets))}
    first = {name: column[0] for name, column in table.items()}
    assert (first["file"], first["block"], first["row"], first["cas"]) == ("older_pure.xml", 1, 1, "74-98-6")
    assert (first["temperature_K"], first["value"], first["uncertainty_from"]) == (250.0, 218400.0, "author")

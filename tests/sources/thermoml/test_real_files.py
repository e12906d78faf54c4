"""Real files, read without loss: those of the folder that EOSMUSTER_THERMOML names, if it is set.

Redistribution of the archive is not settled, so none of its files is here; each is named after its paper. The
counts are those of the papers' tables as the archive holds them.
"""

from __future__ import annotations

import os
from pathlib import Path

import numpy as np
import pytest

from eosmuster.sources.measured.files import read_folder
from eosmuster.sources.measured.table import ORIGINS, MeasuredSet, Reading

FOLDER = os.environ.get("EOSMUSTER_THERMOML", "")

pytestmark = pytest.mark.skipif(
    not FOLDER, reason="EOSMUSTER_THERMOML names no folder of ThermoML files; the archive's are not ours to hand on"
)

# file -> what it holds that is judged: component, property, points
SETS = {
    "j.jct.2004.12.016": [("Ammonia", "saturation_pressure", 18)],
    "j.jct.2015.09.034": [("Methane", "density", 16)],
    "je400970y": [("R1234yf", "saturation_pressure", 54)],
    "j.fluid.2014.09.017": [("IsoButane", "saturation_pressure", 86)],
    "je0497496": [
        ("Water", "density", 23),
        ("Nitrogen", "density", 58),
        ("CarbonDioxide", "liquid_density", 14),
        ("CarbonDioxide", "saturation_pressure", 14),
        ("CarbonDioxide", "density", 47),
        ("R134a", "liquid_density", 24),
        ("R134a", "saturation_pressure", 24),
        ("R134a", "density", 78),
    ],
    "je049842u": [("NitrousOxide", "saturation_pressure", 18)],
    "j.fluid.2006.09.017": [("R32", "saturation_pressure", 10), ("R134a", "saturation_pressure", 11)],
    "form2020/j.jct.2012.08.025": [],  # mixtures only
    "form2020/j.jct.2018.07.031": [],
}
TRAPS = {
    "traps/je700126z": [("n-Hexane", "density", 1), ("CycloHexane", "density", 1)],
    "traps/je800436u": [("Water", "saturation_pressure", 11)],
    "traps/s10765-006-0053-2": [
        ("n-Butane", "density", 16),
        ("n-Hexane", "density", 16),
        ("n-Octane", "density", 16),
    ],
}
FILES = [*SETS, *TRAPS, "traps/j.jct.2004.07.017"]


@pytest.fixture(scope="module")
def reading() -> Reading:
    return read_folder(Path(FOLDER))


def sets_of(reading: Reading, file: str) -> list[MeasuredSet]:
    return [one for one in reading.sets if one.source.file == f"{file}.xml"]


@pytest.mark.parametrize("file", FILES)
def test_every_value_of_a_file_is_accounted_for(file: str) -> None:
    from eosmuster.sources.thermoml.reader import read_file

    path = Path(FOLDER) / f"{file}.xml"
    reading = read_file(path)
    binary = sum(
        np.count_nonzero(~np.isnan(b.vapor_fraction)) if name == "vapor_fraction" else len(b)
        for b in reading.binaries
        for name in b.measured
    )
    read = sum(map(len, reading.sets)) + binary
    lost = sum(d.lost for d in reading.diagnostics)
    assert read + lost + sum(reading.unread.values()) == path.read_text(encoding="utf-8").count("<PropertyValue>")


@pytest.mark.parametrize("file", [*SETS, *TRAPS])
def test_a_file_gives_the_sets_it_holds(reading: Reading, file: str) -> None:
    found = [(one.component.name, one.property, len(one)) for one in sets_of(reading, file)]
    assert found == (SETS | TRAPS)[file]


def test_nothing_is_lost_but_what_is_not_catalogued(reading: Reading) -> None:
    lost = [d for d in reading.diagnostics if d.lost]
    assert {d.code for d in lost} <= {"substance"}
    assert {(d.file, d.block, d.lost) for d in lost if not d.file.startswith("traps/")} == {("je400970y.xml", 2, 36)}


def test_the_binary_set_is_joined(reading: Reading) -> None:
    [binary] = reading.binaries
    assert [c.name for c in binary.components] == ["R32", "R134a"]
    assert len(binary) == 124
    assert not np.isnan(binary.vapor_fraction).any()
    assert binary.measured == ("pressure", "vapor_fraction")


def test_the_older_form_of_the_paper_beside_the_newer_is_the_only_one_without_doi(reading: Reading) -> None:
    dois = {one.source.file: one.source.doi for one in reading.sets if "/" not in one.source.file}
    assert dois["je400970y.xml"] == "10.1021/je400970y"
    assert dois["j.jct.2004.12.016.xml"] == ""


def test_an_absurd_uncertainty_is_named_and_replaced(reading: Reading) -> None:
    [one] = [s for s in sets_of(reading, "traps/j.jct.2004.07.017") if s.block == 16]
    assert (one.component.name, one.property, one.temperature[0]) == ("IsoButane", "saturation_pressure", 120.0)
    np.testing.assert_allclose(one.values[0], 1.3)
    assert ORIGINS[one.origin[0]] == "rounding floor"
    np.testing.assert_allclose(one.standard_uncertainty[0], 0.05 / 3.0**0.5)  # half of 0.0001 kPa over sqrt(3)
    [told] = [d for d in reading.diagnostics if d.file == one.source.file and d.block == 16]
    assert "11 of 23 points (row 1: 0.0013 kPa, stated 2.65e-08)" in told.sentence
    assert "below the rounding of the last printed digit, which cannot be" in told.sentence


def test_the_fixtures_are_valid_against_the_schema() -> None:
    etree = pytest.importorskip("lxml.etree", reason="lxml validates; the project does without it")
    schema = etree.XMLSchema(etree.parse(str(Path(FOLDER) / "ThermoML.xsd")))
    fixtures = sorted((Path(__file__).parents[1] / "fixtures" / "thermoml").glob("*.xml"))
    assert len(fixtures) >= 6
    for path in fixtures:
        schema.assertValid(etree.parse(str(path)))

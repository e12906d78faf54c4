"""Which substance a file means, by what it says of it; and the formulas that names are checked by."""

from __future__ import annotations

import csv
import importlib.util
from pathlib import Path

import pytest

from eosmuster.components import catalogue
from eosmuster.errors import InputError
from eosmuster.paths import references_folder
from eosmuster.sources.measured.substances import Description, formulas, resolve
from eosmuster.sources.thermoml import reader as thermoml

FIXTURE = Path(__file__).parents[1] / "fixtures" / "thermoml" / "substances.xml"

SUBSTANCES = {
    1: "IsoButane",  # 2-methylpropane
    5: "n-Butane",  # nCASRNum
    6: "n-Butane",  # a CAS number with a wrong check digit is none
    11: "n-Propane",  # InChIKey, under a name nobody knows
    12: "HeavyWater",
    13: "Water",  # nCompIndex
    14: "DimethylEther",  # methane, oxybis-
    15: "Ethanol",  # of the same formula
    16: "n-Propane",  # what stands for an InChIKey is none
}
NO_SUBSTANCES = {
    2: "several isomers go by it",
    3: "is n-Hexane, C6H14, by its name, but the file gives the formula 'C6H12'",
    4: "is one of n-Butane, n-Propane by its name",
    7: "is not in the catalogue",
    8: "has no InChIKey and no formula, and a name alone is not enough",
    9: "by its name, but its InChIKey XDTMQSROBMDMFD-UHFFFAOYSA-N is that of CycloHexane",
    10: "is that of another form of cis-2-Butene, trans-2-Butene",
    17: "by its name, but its CAS number 110543 is that of n-Hexane",
    18: "which no compound of the file is",
}


def test_substances_are_resolved_or_refused_with_the_reason() -> None:
    reading = thermoml.read_file(FIXTURE)
    assert {one.block: one.component.name for one in reading.sets} == SUBSTANCES
    refused = {d.block: d for d in reading.diagnostics if d.code == "substance"}
    assert refused.keys() == NO_SUBSTANCES.keys()
    for number, words in NO_SUBSTANCES.items():
        assert words in refused[number].sentence
        assert refused[number].lost == 1


@pytest.mark.parametrize(
    ("said", "name"),
    [
        (Description(("HFO-1234yf",), "C3H2F4"), "R1234yf"),
        (Description(("propane, 2-methyl-",), "C4H10"), "IsoButane"),
        (Description(("ethane, 1,1'-oxybis-",), "C4H10O"), "DiethylEther"),
        (Description(("parahydrogen",), "H2"), "ParaHydrogen"),
        (Description(("hydrogen",), "H2", "UFHFLCQGNIYNRP-UHFFFAOYSA-N"), "Hydrogen"),
        (
            Description(("parahydrogen",), "H2", "UFHFLCQGNIYNRP-UHFFFAOYSA-N"),
            "ParaHydrogen",
        ),  # it has no key of its own
        (Description(("deuterium oxide",), "H2O"), "HeavyWater"),  # deuterium counts as hydrogen
        (Description(("Carbon  Dioxide",), "O2C"), "CarbonDioxide"),  # in any order
        (Description(cas="74-98-6"), "n-Propane"),
    ],
)
def test_what_is_found(said: Description, name: str) -> None:
    assert resolve(said).name == name


@pytest.mark.parametrize(
    ("said", "words"),
    [
        (Description(("water",), "H2O", "XLYOFNOQVPJJNP-ZSJDYOACSA-N"), "is that of HeavyWater"),
        (Description(("propane",), "C3H8", "AAAAAAAAAAAAAA-UHFFFAOYSA-N"), "is that of no catalogued substance"),
        (Description(("air",), "N2"), "is not in the catalogue"),
        (Description(("propane",), "C3H8+"), "the file gives the formula 'C3H8\\+'"),
        (Description(), "'a substance without a name' is not in the catalogue"),
    ],
)
def test_what_is_refused(said: Description, words: str) -> None:
    with pytest.raises(InputError, match=words):
        resolve(said)


def test_every_component_is_found_by_its_name_its_key_and_its_number() -> None:
    for name, component in catalogue().items():
        if name not in ("Dichloroethane",):  # the name fits two isomers, and is refused
            assert resolve(Description((name,), formulas()[name])) is component
        if component.inchikey:
            assert resolve(Description(inchikey=component.inchikey, formula=formulas()[name])) is component
        if component.cas:
            assert resolve(Description(cas=component.cas)) is component


def test_no_name_fits_two_components() -> None:
    names: dict[str, str] = {}
    for row in _table():
        for name in filter(None, (row["component"], *row["names"].split("|"))):
            assert names.setdefault(name.casefold(), row["component"]) == row["component"], name


def test_formulas_agree_with_an_independent_source() -> None:
    """The formulas of the `chemicals` package, by CAS number (version 1.5)."""
    search = pytest.importorskip("chemicals.identifiers", reason="the package is for tests only").search_chemical
    compared = 0
    for name, component in catalogue().items():
        try:
            found = search(component.cas) if component.cas else None
        except ValueError:  # not in its tables
            found = None
        if found is not None and component.inchikey == found.InChI_key:
            assert formulas()[name] == found.formula, name
            compared += 1
    assert compared >= 120


def test_the_generator_writes_the_table_again() -> None:
    path = references_folder() / "generators" / "formulas.py"
    spec = importlib.util.spec_from_file_location("formulas_generator", path)
    assert spec is not None
    assert spec.loader is not None
    generator = importlib.util.module_from_spec(spec)
    spec.loader.exec_module(generator)
    assert [tuple(row.values()) for row in _table()] == [generator.row(name) for name in catalogue()]


def _table() -> list[dict[str, str]]:
    with (references_folder() / "formulas.csv").open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))

"""The table of contested references is what its generator makes, and names what the rest of the house knows."""

from __future__ import annotations

import csv
import importlib

import pytest

from eosmuster.components import catalogue
from eosmuster.paths import references_folder
from eosmuster.sources import handbook, library_gate
from eosmuster.sources.contested import FILE, contested

NOT_CONTESTED = ("n-Propane", "Argon", "R134a", "Methane", "Nitrogen", "Benzene")


def rows() -> list[dict[str, str]]:
    with (references_folder() / FILE).open(encoding="utf-8", newline="") as stream:
        return list(csv.DictReader(stream))


def test_the_generator_writes_the_committed_rows(monkeypatch: pytest.MonkeyPatch) -> None:
    """For every fluid of the table, and for some that must not be in it; the library's version is part of a row."""

    monkeypatch.syspath_prepend(str(references_folder() / "generators"))
    generator = importlib.import_module("conflicts")
    asked = [catalogue()[name] for name in dict.fromkeys([*(r["component"] for r in rows()), *NOT_CONTESTED])]
    again = list(generator.conflict_rows(asked))
    if {r["source"] for r in rows()} == {f"coolprop {library_gate.version()}"}:
        assert again == rows()
    else:
        assert {r["component"] for r in again} <= set(catalogue())


def test_sound_fluids_are_not_contested() -> None:
    for component in NOT_CONTESTED[:3]:
        assert (component, "saturation_pressure") not in contested()
        assert (component, "liquid_density") not in contested()


def test_every_row_names_known_sources_in_use() -> None:
    assert len(contested()) == len(rows())
    for (component, name), one in contested().items():
        cas = catalogue()[component].cas
        used = {c.source for c in handbook.correlations(cas, name)} | {t.source for t in handbook.tables(cas, name)}
        assert set(one.alone) <= used | {"coolprop"}, one
        assert all(source in one.sentence for source in one.alone)
        assert one.sentence.count("handbook:") + one.sentence.count("coolprop") >= 2

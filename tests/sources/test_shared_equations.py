"""The table of sources that share the library's equation is what its generator makes, and names tables in use."""

from __future__ import annotations

import importlib

import pytest

from eosmuster.components import catalogue
from eosmuster.paths import references_folder
from eosmuster.reference_rows import rows
from eosmuster.sources import handbook, library_gate
from eosmuster.sources.bibliography import bibliography

ROWS = [row for _, row in rows(handbook.SHARED_FILE)]


def test_the_generator_writes_the_committed_rows(monkeypatch: pytest.MonkeyPatch) -> None:
    """For the fluids that have a table at all; the library's version is part of the evidence."""
    monkeypatch.syspath_prepend(str(references_folder() / "generators"))
    generator = importlib.import_module("shared_equations")
    again = list(generator.shared_rows(catalogue().values()))
    if f" {library_gate.version()}:" in ROWS[0]["evidence"]:
        assert again == ROWS
    else:
        assert {r["component"] for r in again} <= set(catalogue())


def test_rows_are_tables_in_use_with_their_evidence() -> None:
    for row in ROWS:
        assert catalogue()[row["component"]].cas == row["cas"]
        assert row["source"] in bibliography()
        assert row["certainty"] in {"stated", "by agreement"}
        assert len(row["evidence"]) > 20
        source = f"handbook:{row['source']}"
        assert source in {t.source for t in handbook.tables(row["cas"], "liquid_density")}
        assert handbook.shares_library_equation(row["cas"], source)


def test_only_the_well_founded_are_named() -> None:
    """Water by IAPWS-95 is certain; IAPWS SR1-86 is a formulation of its own, and nonane's table is off by 0.5 %."""
    assert [r["component"] for r in ROWS if r["certainty"] == "stated"] == ["Water"]
    assert not handbook.shares_library_equation("7732-18-5", "handbook:iapws-sr1-86")
    assert not handbook.shares_library_equation(catalogue()["n-Nonane"].cas, "handbook:vdi-2010")

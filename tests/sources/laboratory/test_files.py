"""Laboratory files as files: descriptors beside them, the style of their numbers, and files that are none."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from eosmuster.components import find
from eosmuster.sources.laboratory import reader as laboratory
from eosmuster.sources.laboratory.columns import Descriptor
from eosmuster.sources.laboratory.text import Style, number_of

M_PROPANE = find("propane").molar_mass or 0.0
HALF = 0.5 / 3.0**0.5

SCHEMA = {
    "component": "propane",
    "method": "densimeter",
    "schema": {
        "fields": [
            {"name": "T", "type": "number", "quantity": "temperature", "unit": "degC", "decimalChar": ","},
            {"name": "rho", "type": "number", "quantity": "liquid_density", "unit": "kg/m3", "decimalChar": ","},
            {
                "name": "s",
                "uncertainty_of": "liquid_density",
                "unit": "kg/m3",
                "coverage_factor": 2,
                "decimalChar": ",",
            },
        ],
        "missingValues": ["", "-"],
    },
    "dialect": {"delimiter": ";"},
}
GERMAN = "T;rho;s\n16,85;507,90;0,4\n20,00;-;0,4\n"


@pytest.mark.parametrize(
    ("name", "content"),
    [
        ("d.json", SCHEMA),
        ("d.schema.json", SCHEMA),
        ("datapackage.json", {"resources": [{"path": "other.csv"}, {"path": "d.csv", **SCHEMA}]}),
        ("d.json", {**SCHEMA["schema"], "component": "propane", "method": "densimeter"}),  # type: ignore[dict-item]
    ],
)
def test_a_descriptor_beside_the_file(tmp_path: Path, name: str, content: dict[str, Any]) -> None:
    (tmp_path / "d.csv").write_text(GERMAN, encoding="utf-8")
    (tmp_path / name).write_text(json.dumps(content), encoding="utf-8")
    reading = laboratory.read_file(tmp_path / "d.csv")
    one = reading.sets[0]
    assert (one.component.name, one.method) == ("n-Propane", "densimeter")
    np.testing.assert_allclose(one.temperature, [290.0])
    np.testing.assert_allclose(one.values, [507.9 / M_PROPANE])
    np.testing.assert_allclose(one.standard_uncertainty, [0.2 / M_PROPANE])
    np.testing.assert_allclose(one.rounding, [HALF * 0.01 / M_PROPANE])


CAMPAIGN = [{"title": "Nobody: campaign 7 (invented)", "path": "https://example.org/7"}, {"title": "another"}]


@pytest.mark.parametrize(
    ("name", "content", "citation"),
    [
        ("d.json", {**SCHEMA, "sources": CAMPAIGN}, "Nobody: campaign 7 (invented) https://example.org/7"),
        ("datapackage.json", {"resources": [{"path": "d.csv", **SCHEMA}], "sources": CAMPAIGN[1:]}, "another"),
        ("d.json", {**SCHEMA, "sources": "none"}, ""),
        ("d.json", {**SCHEMA, "sources": [3, {"title": 4}]}, ""),
    ],
)
def test_a_descriptor_may_cite_the_source(tmp_path: Path, name: str, content: dict[str, Any], citation: str) -> None:
    (tmp_path / "d.csv").write_text(GERMAN, encoding="utf-8")
    (tmp_path / name).write_text(json.dumps(content), encoding="utf-8")
    source = laboratory.read_file(tmp_path / "d.csv", "lab/d.csv").sets[0].source
    assert source.citation == citation
    assert source.reference == (citation or "lab/d.csv, which names no publication")


@pytest.mark.parametrize(
    ("content", "words"),
    [
        ("{", "its descriptor d.json is not JSON"),
        ("[]", "its descriptor d.json is no table of properties"),
        ("{}", ""),  # says nothing, so the header has to
        ('{"title": "x"}', "its descriptor d.json has no list of fields with names"),
        ('{"fields": [{"name": 3}]}', "its descriptor d.json has no list of fields with names"),
        ("[" * 100_000, "its descriptor d.json is not JSON"),
    ],
)
def test_a_bad_descriptor_is_one_diagnostic(tmp_path: Path, content: str, words: str) -> None:
    (tmp_path / "d.csv").write_text("component,temperature [K],saturation_pressure [kPa]\npropane,300,998\n")
    (tmp_path / "d.json").write_text(content)
    reading = laboratory.read_file(tmp_path / "d.csv")
    if not words:
        assert len(reading.sets[0]) == 1
        return
    [found] = reading.diagnostics
    assert words in found.sentence


def test_a_descriptor_that_does_not_fit_says_so() -> None:
    descriptor = Descriptor(fields={"T": {"name": "T"}}, whole={"component": "butane"})
    text = "component,temperature [K],saturation_pressure [kPa]\npropane,300,998\n"
    reading = laboratory.read_text(text.encode(), "lab.csv", descriptor)
    assert reading.sets[0].component.name == "n-Propane"
    assert [d.sentence for d in reading.diagnostics] == [
        "its descriptor has a field 'T' that is no column",
        "its descriptor names a component, but there is a column of it",
    ]


@pytest.mark.parametrize(
    ("text", "style", "value"),
    [
        ("1.5", Style(), 1.5),
        (".5", Style(), 0.5),
        ("5.", Style(), 5.0),
        ("+1.5E-3", Style(), 0.0015),
        ("1,5", Style(","), 1.5),
        ("1.234.567,5", Style(",", "."), 1234567.5),
        ("1234567,5", Style(",", "."), 1234567.5),
        ("1.23.567,5", Style(",", "."), None),
        ("1.234", Style(","), None),  # a point where the comma is the decimal character
        ("1 234", Style(".", " "), 1234.0),
        ("--1", Style(), None),
        ("1e5e5", Style(), None),
        ("0x10", Style(), None),
        ("1_000", Style(), None),
        ("infinity", Style(), None),
    ],
)
def test_numbers_are_read_in_their_style_only(text: str, style: Style, value: float | None) -> None:
    found = number_of(text, style)
    assert (found.value if found else None) == value


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (b"", "it is empty"),
        (b"\n\n# nothing\n", "it is empty"),
        (b"just words", "has no delimiter; valid: commas, semicolons, tabs, bars"),
        (b"a,b;c\n", "may be delimited by ';' or ','"),
        (b"a,b\0c\n", "it holds NUL characters"),
        (b'component,"temperature\npropane,300\n', "line 3 cannot be read: unexpected end of data"),
        (b'component,temperature [K]\n"pro"pane,300\n', "line 2 cannot be read"),
    ],
)
def test_a_file_that_is_no_table_is_one_diagnostic(content: bytes, words: str) -> None:
    reading = laboratory.read_text(content, "lab.csv")
    [found] = reading.diagnostics
    assert (found.code, found.block) == ("file", 0)
    assert words in found.sentence

"""regions.csv and regions.json: every vertex, read back to the last bit, by programs that know only the files."""

import io
import json
import re
from dataclasses import replace
from itertools import pairwise

import numpy as np
import pandas as pd
import pytest

from eosmuster.record import REGION_EDGES, Region, Ring
from eosmuster.report.regions import COLUMNS, write_regions, write_regions_json

OUTLINE = Ring(
    np.array([300.1, 400.0, 400.0, 300.1]),
    np.array([1e5, 1e5, 1 / 3 * 1e6, 2e5 + 1e-7]),
    ("plan_limit", "limit", "phase_boundary", "undecided"),
)
HOLE = Ring(np.array([320.0, 330.0, 340.0]), np.array([1.2e5, 1.3e5, 1.1e5]), ("limit", "unsolved", "limit"))


def region(**more):
    one = Region("alphane", "PR", "density", "coolprop", "liquid", OUTLINE, (HOLE,), 0.25, 2)
    return replace(one, **more)


@pytest.fixture
def written(record):
    return replace(record, regions=(region(), region(candidate="SRK", holes=(), share=float("nan"), connected=1)))


def table(record):
    file = io.BytesIO()
    write_regions(record, file)
    file.seek(0)
    return pd.read_csv(file, dtype=str, keep_default_na=False)


def content(record):
    file = io.BytesIO()
    write_regions_json(record, file)
    return json.loads(file.getvalue().decode())


def test_a_row_a_vertex(written):
    rows = table(written)
    assert tuple(rows.columns) == COLUMNS
    assert len(rows) == 4 + 3 + 4
    first = rows[rows["candidate"] == "PR"]
    assert first["ring"].tolist() == ["0"] * 4 + ["1"] * 3
    assert first["vertex"].tolist() == ["0", "1", "2", "3", "0", "1", "2"]
    assert first["edge"].tolist() == [*OUTLINE.reasons, *HOLE.reasons]
    assert [float(t) for t in first["temperature_K"]] == [*OUTLINE.temperature, *HOLE.temperature]
    assert [float(p) for p in first["pressure_Pa"]] == [*OUTLINE.pressure, *HOLE.pressure]
    assert rows.iloc[0].tolist()[:5] == ["alphane", "PR", "density", "coolprop", "liquid"]


def test_json_says_what_it_holds(written):
    read = content(written)
    assert (read["format"], read["format_version"]) == ("eosmuster regions", 1)
    assert read["plan"] == {"name": written.plan_name, "title": written.plan_title}
    assert read["decision"]["rule"] == "guarded"
    assert read["units"] == {"temperature": "K", "pressure": "Pa"}
    assert set(read["reasons"]) == set(REGION_EDGES)
    assert "even-odd" in read["membership"]
    assert [one["candidate"] for one in read["regions"]] == ["PR", "SRK"]
    assert [one["share"] for one in read["regions"]] == [0.25, None]
    assert [one["connected"] for one in read["regions"]] == [2, 1]


def test_json_rings_are_closed_with_a_reason_an_edge(written):
    first, second = content(written)["regions"]
    assert len(first["polygon"]) == 2
    assert len(second["polygon"]) == 1
    for ring, reasons, own in zip(first["polygon"], first["edges"], (OUTLINE, HOLE), strict=True):
        assert ring[0] == ring[-1]
        assert ring[:-1] == [list(place) for place in zip(own.temperature, own.pressure, strict=True)]
        assert reasons == list(own.reasons)


def test_the_membership_rule_as_the_file_states_it(written):
    """A program that has only the file."""
    rings = content(written)["regions"][0]["polygon"]

    def member(T, p):
        odd = False
        for ring in rings:
            for (a, b), (c, d) in pairwise(ring):
                odd ^= (b > p) != (d > p) and a + (p - b) / (d - b) * (c - a) > T
        return odd

    places = [(350.0, 1.5e5), (330.0, 1.2e5), (310.0, 5e5), (299.0, 1e5)]
    assert [member(*place) for place in places] == [True, False, False, False]


def test_without_regions_there_are_heads(record):
    assert len(table(record)) == 0
    assert content(record)["regions"] == []


def test_names_are_inert_in_spreadsheets_and_whole_in_json(record, nasty_names):
    named = replace(record, regions=tuple(region(component=name) for name in nasty_names))
    rows = table(named)
    assert len(rows) == 7 * len(nasty_names)
    assert not [name for name in rows["component"] if name.startswith(tuple("=+-@\t\r\n"))]
    assert [one["component"] for one in content(named)["regions"]] == list(nasty_names)


def test_a_ring_of_json_is_a_line(written):
    file = io.BytesIO()
    write_regions_json(written, file)
    text = file.getvalue().decode()
    assert len(re.findall(r"^    \[\[.*\]\],?$", text, flags=re.MULTILINE)) == 3
    assert text.endswith("}\n")

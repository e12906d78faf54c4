"""Regions of two runs: which are the same, which moved, came or went; and a file that no run wrote."""

from __future__ import annotations

import csv
import io
import random
from collections.abc import Callable
from dataclasses import replace
from itertools import groupby, pairwise
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from eosmuster.api import sweep
from eosmuster.compare.fields import TOLERANCE
from eosmuster.drifting.agreement import Agreement
from eosmuster.drifting.changes import APPEARED, MOVED, UNCHANGED, VANISHED
from eosmuster.drifting.comparing import Drift, drift
from eosmuster.drifting.regions import CHORD, Plane, Shape, plane_of, region_change, shape
from eosmuster.drifting.sides import read_side, side_of_record
from eosmuster.drifting.table import csv_text
from eosmuster.errors import InputError
from eosmuster.plan.reading import load_plan, parse_plan
from eosmuster.record import Record
from eosmuster.sweeping.run import run

Copy = Callable[..., Path]

# all limits are invented: such that Peng-Robinson is inside over a part of the plane, Soave-Redlich-Kwong elsewhere
PLAN = """
title = "two candidates on a plane"
components = ["propane"]
models = ["PR", "SRK"]
properties = ["density"]
[states.single_phase]
temperature = { from = 260.0, to = 360.0, points = 6 }
pressure = { from = "20 bar", to = "200 bar", points = 5, spacing = "logarithmic" }
phase = "liquid"
[tolerance]
density = "6 %"
[references]
use = ["coolprop"]
"""


@pytest.fixture(scope="module")
def base(swept_folder: Copy) -> Path:
    return swept_folder(PLAN)


@pytest.fixture(scope="module")
def record() -> Record:
    return run(parse_plan(PLAN, "small", "small.toml"))


def rewritten(folder: Path, change: Callable[[list[dict[str, str]]], list[dict[str, str]]]) -> Path:
    path = folder / "regions.csv"
    with path.open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    with path.open("w", encoding="utf-8", newline="") as file:
        writer = csv.DictWriter(file, list(rows[0]), lineterminator="\n")
        writer.writeheader()
        writer.writerows(change([dict(row) for row in rows]))
    return folder


def states(found: Drift) -> dict[str, int]:
    return {state: count for state, count in found.regions.items() if count}


def test_shares_are_those_of_the_record(base: Path, record: Record) -> None:
    """1e-9: both add up the same triangles, the file's numbers being exact."""
    shapes = read_side(base).regions
    assert [key.candidate for key in shapes] == ["PR", "SRK"]
    for region in record.regions:
        [found] = [found for key, found in shapes.items() if key.candidate == region.candidate]
        assert found.share == pytest.approx(region.share, rel=1e-9)
        assert set(found.lengths) == {reason for ring in (region.outline, *region.holes) for reason in ring.reasons}
    assert side_of_record(record, "this run").regions == shapes
    assert CHORD == TOLERANCE  # what the search promises


def test_one_run_twice_has_no_drift(base: Path) -> None:
    found = drift(base, base)
    assert not found
    assert states(found) == {UNCHANGED: 2}
    assert str(found).startswith("no drift: 2 rows unchanged; regions: 2 unchanged\n")


def finer(rows: list[dict[str, str]]) -> list[dict[str, str]]:
    """Cut every edge but the last of a ring in two, and put the new vertex off by half of what a chord may depart."""
    found: list[dict[str, str]] = []
    for _, of_ring in groupby(rows, lambda row: (row["candidate"], row["ring"])):
        ring = list(of_ring)
        cut = [ring[0]]
        for before, after in pairwise(ring):
            T, p = (0.5 * (float(before[n]) + float(after[n])) for n in ("temperature_K", "pressure_Pa"))
            cut += [{**before, "temperature_K": repr(T + 0.5 * CHORD * 100.0), "pressure_Pa": repr(p)}, after]
        found += [{**row, "vertex": str(number)} for number, row in enumerate(cut)]
    return found


def test_another_pattern_of_vertices_is_the_same_region(base: Path, copy_of: Copy) -> None:
    other = rewritten(copy_of(base), finer)
    assert len((other / "regions.csv").read_bytes()) > 1.8 * len((base / "regions.csv").read_bytes())
    found = drift(base, other)
    assert states(found) == {UNCHANGED: 2}
    assert not found


def test_a_region_that_is_missing_in_the_file_is_refused(base: Path, copy_of: Copy) -> None:
    place = rewritten(copy_of(base), lambda rows: [row for row in rows if row["candidate"] == "PR"])
    refused(place, "holds 1 region and its manifest counts 2: the file is not complete")


def test_a_narrower_tolerance_moves_regions_and_is_their_cause(
    base: Path, swept_folder: Copy, record: Record
) -> None:
    other = swept_folder(PLAN.replace('"6 %"', '"5.5 %"'))
    found = drift(base, other)
    moved = [row for row in found.rows if row.region]
    assert moved
    assert states(found).get(MOVED) == len(moved)
    shares = {region.candidate: region.share for region in record.regions}
    for row in moved:
        assert row.region is not None
        assert row.region.share[0] == pytest.approx(shares[row.key.candidate], rel=1e-9)
        assert row.region.share[1] < row.region.share[0]
        assert "tolerance" in row.causes
        assert "region: " in row.note
    assert "region was, %" in found.markdown
    [line, *_] = csv.DictReader(io.StringIO(csv_text(found).decode()))
    assert line["region"] == MOVED
    assert float(line["new_region_share"]) < float(line["old_region_share"])
    assert list(found.table["region"]) == [row.region.state if row.region else "" for row in found.rows]
    back = drift(other, base)
    assert states(back) == states(found)


def test_regions_that_come_and_go(base: Path, swept_folder: Copy) -> None:
    """Nothing of either candidate is within 0.001 % over any area."""
    none = swept_folder(PLAN.replace('"6 %"', '"0.001 %"'))
    assert read_side(none).regions == {}
    gone, came = drift(base, none), drift(none, base)
    assert (states(gone), states(came)) == ({VANISHED: 2}, {APPEARED: 2})
    assert all("region vanished: " in row.note for row in gone.rows)
    assert "regions: 2 vanished" in str(gone).splitlines()[0]
    assert "region appeared: " in str(came)


def test_a_region_of_a_row_that_went_goes_with_it(base: Path, swept_folder: Copy) -> None:
    one = swept_folder(PLAN.replace('["PR", "SRK"]', '["PR"]'))
    [row] = drift(base, one).rows
    assert (row.key.candidate, row.state, row.region and row.region.state) == ("SRK", VANISHED, VANISHED)
    assert states(drift(base, one)) == {VANISHED: 1, UNCHANGED: 1}


def test_a_region_alone_is_a_moved_row(base: Path, copy_of: Copy) -> None:
    """All vertices 0.3 % of the plan's rectangle warmer is within a corner that is cut off, 0.5 % is not."""

    def warmer(kelvin: float) -> Callable[[list[dict[str, str]]], list[dict[str, str]]]:
        def change(rows: list[dict[str, str]]) -> list[dict[str, str]]:
            for row in rows:
                if row["candidate"] == "SRK":
                    row["temperature_K"] = repr(float(row["temperature_K"]) + kelvin)
            return rows

        return change

    assert not drift(base, rewritten(copy_of(base, "near"), warmer(0.3)))
    [row] = drift(base, rewritten(copy_of(base, "far"), warmer(0.5))).rows
    assert (row.key.candidate, row.state, row.causes) == ("SRK", MOVED, ("code",))
    assert row.note.startswith("region: ")


def test_other_reasons_of_edges_are_a_change(base: Path, copy_of: Copy) -> None:
    def change(rows: list[dict[str, str]]) -> list[dict[str, str]]:
        return [{**row, "edge": "unsolved" if row["edge"] == "limit" else row["edge"]} for row in rows]

    found = drift(base, rewritten(copy_of(base), change))
    notes = [row.note for row in found.rows]
    assert notes
    assert all("it now ends at unsolved too; it no longer ends at limit" in note for note in notes)


SQUARE = Shape(0.5, (0.0, 0.0), (0.5, 1.0), {"plan_limit": 2.0, "limit": 1.0}, 2)


@pytest.mark.parametrize(
    ("share", "tolerance", "same"),
    [
        (0.5 + 2.0e-3, 1e-6, True),  # a chord of length 1 in each run, 1e-3 off
        (0.5 + 2.2e-3, 1e-6, False),
        (0.5 + 1.9e-2, 1e-5, True),  # 1000 times the tolerance asked for
        (float("nan"), 1e-6, False),
    ],
)
def test_the_band_is_as_wide_as_chords_may_depart(share: float, tolerance: float, same: bool) -> None:
    found = region_change(SQUARE, replace(SQUARE, share=share), Agreement(tolerance))
    assert (found is None) is same


def test_an_edge_too_short_to_be_certain_of_may_come_and_go() -> None:
    for length, same in ((0.003, True), (0.005, False)):
        other = replace(SQUARE, lengths={**SQUARE.lengths, "undecided": length})
        assert (region_change(SQUARE, other, Agreement()) is None) is same


@pytest.mark.parametrize(
    ("temperature", "pressure", "expected"),
    [
        ([250.0, "20 degC"], ["1 bar", "2 bar"], Plane((250.0, 293.15), (1e5, 2e5))),
        ([300.0, 280.0], [1e5, 1e6, 1e7], Plane((280.0, 300.0), (np.log(1e5), np.log(1e7)), True)),
        ([300.0], ["1 bar", "2 bar"], None),
        ([300.0, 400.0], {"from": "1 bar"}, None),
        ([300.0, 400.0], [-1.0, 1.0], None),
        (None, [[]], None),
    ],
)
def test_the_rectangle_of_a_plan(temperature: Any, pressure: Any, expected: Plane | None) -> None:
    assert plane_of({"states": {"single_phase": {"temperature": temperature, "pressure": pressure}}}) == expected


def test_without_a_plan_a_region_is_measured_by_itself() -> None:
    ring = np.array([300.0, 350.0, 350.0, 300.0]), np.array([1e5, 1e5, 2e5, 2e5]), ("limit",) * 4
    assert shape(None, [ring]).share == pytest.approx(1.0)
    hole = np.array([310.0, 310.0, 320.0]), np.array([1.1e5, 1.2e5, 1.2e5]), ("limit",) * 3
    assert shape(None, [ring, hole]).share == pytest.approx(1.0 - 0.5 * 0.2 * 0.1)


def refused(folder: Path, *words: str) -> None:
    with pytest.raises(InputError) as error:
        read_side(folder)
    assert "\n" not in str(error.value)
    assert all(word in str(error.value) for word in ("regions.csv", *words))


def test_a_file_cut_anywhere_or_missing_is_refused(base: Path, copy_of: Copy) -> None:
    place = copy_of(base)
    path = place / "regions.csv"
    whole = path.read_bytes()
    for length in sorted({0, 1, len(whole) - 2, len(whole) - 1, *range(10, len(whole) // 2, len(whole) // 40)}):
        path.write_bytes(whole[:length])
        refused(place)
    path.unlink()
    refused(place, "cannot be read")


@pytest.mark.parametrize(
    ("column", "cell", "words"),
    [
        ("temperature_K", "warm", "line 2: temperature_K = 'warm' is not a number"),
        ("pressure_Pa", "", "line 2: pressure_Pa = nan is not a finite number above 0"),
        ("vertex", "4", "line 2 is vertex 4 of ring 0 where vertex 0 of ring 0 belongs"),
        ("ring", "1", "line 2 is vertex 0 of ring 1 where vertex 0 of ring 0 belongs"),
        ("edge", "cliff", "line 2: edge = 'cliff' is unknown; valid: limit,"),
    ],
)
def test_a_bad_cell(base: Path, copy_of: Copy, column: str, cell: str, words: str) -> None:
    def change(rows: list[dict[str, str]]) -> list[dict[str, str]]:
        rows[0][column] = cell
        return rows

    refused(rewritten(copy_of(base), change), words)


def test_a_missing_column_a_second_region_and_too_few_vertices(base: Path, copy_of: Copy) -> None:
    place = copy_of(base, "column")
    text = (place / "regions.csv").read_text(encoding="utf-8")
    (place / "regions.csv").write_text(text.replace("edge", "edges", 1), encoding="utf-8")
    refused(place, "has no column 'edge'")
    refused(
        rewritten(copy_of(base, "twice"), lambda rows: [*rows, *rows]), "holds a second region of 'n-Propane | PR"
    )
    refused(rewritten(copy_of(base, "short"), lambda rows: rows[:2]), "ring 0 has 2 vertices")


@pytest.mark.parametrize("planned", [True, False])
def test_whatever_happens_to_a_few_bytes_is_one_sentence_or_a_comparison(
    base: Path, copy_of: Copy, planned: bool
) -> None:
    chance, place = random.Random(11), copy_of(base)
    if not planned:
        text = (place / "manifest.json").read_text(encoding="utf-8")
        (place / "manifest.json").write_text(text.replace("[states.single_phase]", "[states.lost]"), encoding="utf-8")
    whole = (place / "regions.csv").read_bytes()
    refusals: list[str] = []
    for _ in range(60):
        data, at = bytearray(whole), chance.randrange(200, len(whole))
        piece = chance.choice([b",", b"\n", b"9", b"-", b"e300", b"nan", b"inf", b"\0", b"\xff", b'"'])
        data[at : at + chance.choice([0, 1, 1, 30])] = piece
        (place / "regions.csv").write_bytes(bytes(data))
        try:
            found = drift(base, place)
            assert str(found) + found.markdown + csv_text(found).decode()
        except InputError as error:
            refusals.append(str(error))
    assert 10 < len(refusals) < 60
    assert not [refusal for refusal in refusals if "\n" in refusal]


def test_an_altered_file_is_said(base: Path, copy_of: Copy) -> None:
    def change(rows: list[dict[str, str]]) -> list[dict[str, str]]:
        rows[0]["pressure_Pa"] = repr(float(rows[0]["pressure_Pa"]) * 1.0000001)
        return rows

    [remark] = drift(base, rewritten(copy_of(base), change)).remarks
    assert "regions.csv is not as its run wrote it" in remark


def test_a_run_that_was_not_written_is_compared_too(base: Path) -> None:
    from eosmuster.drifting.comparing import compare

    results = sweep(load_plan(base.parent / "plan.toml"))
    found = compare(read_side(base), side_of_record(results.record, "this run"), Agreement())
    assert not found
    assert states(found) == {UNCHANGED: 2}

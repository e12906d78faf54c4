"""points.csv in pieces, in any order, and damaged."""

from __future__ import annotations

import random
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from eosmuster.drifting import points as module
from eosmuster.drifting.points import FilePoints, pairs
from eosmuster.drifting.sides import read_side
from eosmuster.errors import InputError


@pytest.fixture
def counted(base: Path) -> dict:
    return {key: row.points for key, row in read_side(base).rows.items()}


@pytest.mark.parametrize("size", [3, 7, 100_000])
def test_pieces_of_any_size_give_the_same(base: Path, counted, monkeypatch: pytest.MonkeyPatch, size: int) -> None:
    whole = FilePoints(base / "points.csv", counted)
    expected = whole.take(list(counted))
    whole.close()
    monkeypatch.setattr(module, "_ROWS_READ", size)
    pieces = FilePoints(base / "points.csv", counted)
    keys = list(counted)
    random.Random(1).shuffle(keys)
    for key in keys:  # one by one and in no order, so that the file is opened again and again
        [(_, found)] = pieces.take([key]).items()
        for name, values in vars(expected[key]).items():
            np.testing.assert_array_equal(getattr(found, name), values)
    pieces.close()


def test_what_is_read_is_what_the_file_says(base: Path, counted, read: Callable) -> None:
    table = read(base / "points.csv")
    found = FilePoints(base / "points.csv", counted)
    key = list(counted)[4]
    states = found.take([key])[key]
    found.close()
    rows = table[(table["component"] == key.component) & (table["candidate"] == key.candidate)]
    rows = rows[(rows["property"] == key.property) & (rows["reference_source"] == key.reference_source)]
    np.testing.assert_allclose(states.predicted, rows["predicted"], rtol=1e-15)
    np.testing.assert_allclose(states.temperature, rows["temperature_K"], rtol=1e-15)
    assert [module.POINT_VERDICTS[v] for v in states.verdict] == rows["verdict"].tolist()


@pytest.mark.parametrize("most", [1, 5, 10_000])
def test_pairs_hold_no_more_than_they_may(base: Path, counted, monkeypatch: pytest.MonkeyPatch, most: int) -> None:
    held: list[int] = []

    class Watched(FilePoints):
        def take(self, keys):
            held.append(sum(self.count(key) for key in keys))
            return super().take(keys)

    monkeypatch.setattr(module, "_MOST_HELD", most)
    old, new = (Watched(base / "points.csv", counted) for _ in range(2))
    found = list(pairs(old, new, list(counted)))
    assert [key for key, _, _ in found] == list(counted)
    assert max(held) <= max(most, *counted.values())
    assert all(np.array_equal(a.predicted, b.predicted) for _, a, b in found)


def test_rows_without_points_are_passed_over(base: Path, counted) -> None:
    first = next(iter(counted))
    unknown = first._replace(component="nobody")
    old, new = (FilePoints(base / "points.csv", counted) for _ in range(2))
    assert [key for key, _, _ in pairs(old, new, [unknown, first])] == [first]


def damaged(base: Path, tmp_path: Path, counted, change: Callable[[bytes], bytes]) -> str:
    path = tmp_path / "points.csv"
    path.write_bytes(change((base / "points.csv").read_bytes()))
    found = FilePoints(path, counted)
    with pytest.raises(InputError) as caught:
        found.take(list(counted))
    found.close()
    message = str(caught.value)
    assert str(path) in message
    assert not message.endswith(".")
    return message


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda data: b"", "cannot be read as points"),
        (lambda data: data[: len(data) // 2], ""),
        (lambda data: data[: data[:-1].rindex(b"\n") + 1], "cut short"),
        (lambda data: data.replace(b"predicted,", b"said,", 1), "cannot be read as points"),
        (lambda data: data.replace(b",inside,", b",insight,"), "verdict = 'insight' is unknown; valid: inside"),
        (lambda data: data.replace(b"n-Propane", b"n-Butane"), "other rows than summary.csv"),
        (lambda data: data.replace(b"n-Propane", b"n-\xff\xfePropane", 3), "cannot be read as points"),
        (lambda data: data.replace(b"Pa,coolprop", b"Pa,x,y,z,coolprop", 5), "cannot be read as points"),
    ],
)
def test_a_damaged_file_is_one_sentence(
    base: Path, tmp_path: Path, counted, change: Callable[[bytes], bytes], words: str
) -> None:
    assert words in damaged(base, tmp_path, counted, change)


def test_a_cell_that_is_no_number(base: Path, tmp_path: Path, counted, edit: Callable) -> None:
    path = tmp_path / "points.csv"
    path.write_bytes((base / "points.csv").read_bytes())
    edit(path, lambda row: row.update(predicted="about 5"))
    found = FilePoints(path, counted)
    with pytest.raises(InputError, match="cannot be read as points"):
        found.take(list(counted))
    found.close()

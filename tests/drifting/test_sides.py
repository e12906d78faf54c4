"""Folders that are none, damaged, or of another version: one sentence each."""

from __future__ import annotations

import json
import random
from collections.abc import Callable
from pathlib import Path
from typing import Any

import pytest

from eosmuster.drifting.comparing import drift
from eosmuster.drifting.sides import OtherVersion, outputs, read_side, side_of_record, spelled
from eosmuster.errors import InputError
from eosmuster.plan.reading import load_plan
from eosmuster.sweeping.run import run

Copy = Callable[..., Path]


def refused(folder: Path, *words: str) -> str:
    with pytest.raises(InputError) as caught:
        read_side(folder)
    message = str(caught.value)
    assert "\n" not in message
    assert not message.endswith(".")
    for word in words:
        assert word in message
    return message


def test_a_folder_reads_as_the_record_it_was_written_from(base: Path) -> None:
    side = read_side(base)
    record = run(load_plan(base.parent / "plan.toml"))
    fresh = side_of_record(record, "this run")
    assert {k: repr(v) for k, v in side.rows.items()} == {k: repr(v) for k, v in fresh.rows.items()}  # repr: NaN
    assert side.windows == fresh.windows
    assert side.run.plan == "plan"
    kept = [{k: v for k, v in one.manifest.items() if k not in ("volatile", "outputs")} for one in (side, fresh)]
    assert kept[0] == kept[1]


def test_no_folder_and_no_results(tmp_path: Path) -> None:
    refused(tmp_path / "nowhere", "is not there; give a results folder")
    (tmp_path / "file").write_text("x")
    refused(tmp_path / "file", "is a file; give a results folder")
    refused(tmp_path, "is no results folder: it has no manifest.json of ours")
    refused(Path("a\0b"), "'a\\x00b'")


@pytest.mark.parametrize("text", ["", "{", "[]", "{}", '{"format": "another"}', "[" * 100_000, "\0", "NaN"])
def test_a_foreign_manifest(base: Path, copy_of: Copy, text: str) -> None:
    place = copy_of(base)
    (place / "manifest.json").write_text(text, encoding="utf-8")
    refused(place, "no manifest.json of ours")


@pytest.mark.parametrize("key", ["record_version", "format_version"])
@pytest.mark.parametrize("version", [0, 99, None, "x" * 500, [1]])
def test_another_version(base: Path, copy_of: Copy, key: str, version: object) -> None:
    place = _with(copy_of(base), **{key: version})
    assert len(refused(place, "record version", "run its plan again")) < 500
    with pytest.raises(OtherVersion):
        read_side(place)


def _with(folder: Path, **changed: Any) -> Path:
    path = folder / "manifest.json"
    content = json.loads(path.read_text(encoding="utf-8"))
    path.write_text(json.dumps(content | changed), encoding="utf-8")
    return folder


@pytest.mark.parametrize(
    "name", ["plan", "decision", "constants", "models", "references", "measured_files", "volatile"]
)
@pytest.mark.parametrize("value", [None, [], "x", 7])
def test_a_manifest_with_something_else_in_place_of_a_table(
    base: Path, copy_of: Copy, name: str, value: object
) -> None:
    refused(_with(copy_of(base), **{name: value}), f"{name!r} is not a table")


def test_a_manifest_nested_without_end(base: Path, copy_of: Copy) -> None:
    deep: Any = {}
    for _ in range(400):
        deep = {"x": deep}
    refused(_with(copy_of(base), models=deep), "nested more than")


HOSTILE: dict[str, dict[str, Any]] = {
    "constants": {"n-Propane": [], "Ethane": {"critical_temperature": {"value": {"a": [1, {}]}}, "class": 7}},
    "models": {"PR": None, "SRK": [1, {"a": "b"}]},
    "decision": {"tolerances": [7, {"property": None, "limit": [1], "above_reduced_temperature": "x"}], "rule": {}},
    "plan": {"name": ["x"], "text": "components = 7\n[states]\nx = [[[[1]]]]\n[[model]]\nname = 3\n"},
    "references": {"a": None, "b": {}},
    "measured_files": {"../x": 7},
    "volatile": {"versions": [1], "git_revision": {"a": 1}},
}


@pytest.mark.parametrize("name", HOSTILE)
def test_a_hostile_manifest_is_compared_like_any_other(base: Path, copy_of: Copy, name: str) -> None:
    """Whatever is inside a table is a difference, never a failure."""
    place = _with(copy_of(base), **{name: HOSTILE[name]})
    for pair in ((base, place), (place, base), (place, place)):
        assert str(drift(*pair)).startswith("no drift: 12 rows unchanged")
    assert name == "volatile" or drift(base, place).changes


@pytest.mark.parametrize("name", ["summary.csv", "windows.csv"])
def test_a_file_cut_anywhere_is_refused(base: Path, copy_of: Copy, name: str) -> None:
    place = copy_of(base)
    whole = (place / name).read_bytes()
    lengths = sorted({0, 1, len(whole) - 2, len(whole) - 1, *range(10, len(whole) - 2, max(1, len(whole) // 60))})
    for length in lengths:
        (place / name).write_bytes(whole[:length])
        refused(place, name)


@pytest.mark.parametrize("name", ["summary.csv", "windows.csv"])
def test_a_missing_file(base: Path, copy_of: Copy, name: str) -> None:
    place = copy_of(base)
    (place / name).unlink()
    refused(place, name, "cannot be read")


@pytest.mark.parametrize("column", ["component", "verdict", "aad_pct", "share_inside"])
def test_a_missing_column(base: Path, copy_of: Copy, column: str) -> None:
    place = copy_of(base)
    text = (place / "summary.csv").read_text(encoding="utf-8")
    (place / "summary.csv").write_text(text.replace(column, f"{column}_2", 1), encoding="utf-8")
    refused(place, f"has no column {column!r}")


def test_columns_behind_the_contract_s_may_be_missing_and_unknown_ones_are_passed_over(
    base: Path, copy_of: Copy
) -> None:
    place = copy_of(base)
    lines = (place / "summary.csv").read_text(encoding="utf-8").splitlines()
    at = lines[0].split(",").index("mean_predicted")
    shorter = [[*line.split(",")[:at], "unknown" if i == 0 else "x"] for i, line in enumerate(lines)]
    (place / "summary.csv").write_text("".join(",".join(cells) + "\n" for cells in shorter), encoding="utf-8")
    assert len(read_side(place).rows) == 12


@pytest.mark.parametrize(
    ("column", "cell", "words"),
    [
        ("aad_pct", "much", "line 2: aad_pct = 'much' is not a number"),
        ("points", "4.5", "line 2: points = '4.5' is not a whole number"),
        ("inside", "", "line 2: inside = '' is not a whole number"),
        ("verdict", "fine", "line 2: verdict = 'fine' is unknown; valid: inside"),
        ("aad_pct", "x" * 10_000, "is not a number"),
        ("note", "y" * 200_000, "cannot be read as a run's CSV file"),
    ],
)
def test_a_bad_cell(base: Path, copy_of: Copy, edit: Any, column: str, cell: str, words: str) -> None:
    place = copy_of(base)
    edit(place / "summary.csv", lambda row: row.update({column: cell}))
    assert len(refused(place, words)) < 400


def test_two_rows_of_one_key(base: Path, copy_of: Copy) -> None:
    place = copy_of(base)
    lines = (place / "summary.csv").read_text(encoding="utf-8").splitlines(keepends=True)
    (place / "summary.csv").write_text("".join([*lines[:-1], lines[1]]), encoding="utf-8")
    refused(place, "is a second row of")


@pytest.mark.parametrize("data", [b"\xff\xfe\x00", b"\x00" * 100, b"\n\n\n", b'"' * 1000])
def test_bytes_that_are_no_table(base: Path, copy_of: Copy, data: bytes) -> None:
    place = copy_of(base)
    (place / "summary.csv").write_bytes(data)
    refused(place, "summary.csv")


@pytest.mark.parametrize("name", ["summary.csv", "windows.csv", "points.csv", "manifest.json"])
def test_whatever_happens_to_a_few_bytes_is_one_sentence_or_a_comparison(
    base: Path, copy_of: Copy, plan: str, swept_folder: Copy, name: str
) -> None:
    chance = random.Random(7)
    pieces = [b",", b'"', b"\n", b"9", b"-", b"e999", b"{", b"]", b"null", b"nan", b"inf", b"\0", b"\xff", b"x" * 300]
    place = copy_of(swept_folder(plan + "[tolerance]\nsaturation_pressure = '0.1 %'\n"))
    whole = (place / name).read_bytes()
    for _ in range(25):
        data = bytearray(whole)
        for _ in range(chance.choice([1, 2, 5])):
            at = chance.randrange(len(data))
            data[at : at + chance.choice([0, 1, 1, 30])] = chance.choice(pieces)
        (place / name).write_bytes(bytes(data))
        try:
            found = drift(base, place)
            text, refusal = str(found) + found.markdown, ""
        except InputError as error:
            text, refusal = "", str(error)
        assert "\n" not in refusal
        assert text or refusal


@pytest.mark.parametrize("name", ["", ".", "..", "../x", "a/b", "manifest.json", "/etc/passwd", "a\0b"])
def test_outputs_lie_in_the_folder_itself(name: str) -> None:
    with pytest.raises(InputError, match="outputs names"):
        outputs({"outputs": {name: "0" * 64}})


@pytest.mark.parametrize(
    ("text", "read"),
    [
        ("", ""),
        ("propane", "propane"),
        ("=1+1", "'=1+1"),
        ("two\nlines", "two\nlines"),
        ('"x", y', '"x", y'),
        ("a\0b", "ab"),
        ("\udc80", "\\udc80"),
    ],
)
def test_text_as_it_reads_back(text: str, read: str) -> None:
    assert spelled(text) == read

"""The committed run of the broad plan is what the code gives today.

Numbers may differ by what another processor's exp and log leave behind, not more:

- a number of summary.csv by 1e-9 of itself; by 1e-6 where densities reach 0.99 Tc, where the isotherm is flat.
  Statistics of signed deviations can be close to zero, so 1e-9 percent points are forgiven too: that is a
  relative difference of 1e-11 in the property;
- an end of a window by 1e-6 K, the distance to which it is located;
- a number of summary.md by one unit of its last digit shown.

Counts, verdicts, notes and all other text must be equal, and so must the manifest, except for what it calls
volatile and for the hashes of the files compared here: the last digit of one number changes them.
"""

from __future__ import annotations

import csv
import json
import math
import re
import shutil
from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import pytest

ROW = ("component", "candidate", "property", "reference_source")
COUNTS = ("points", "inside", "undecided", "outside", "unsolved", "no_reference")
TEXT = ("contested", "independence", "verdict", "note")
TEMPERATURES = ("from_K", "to_K", "max_at_K")
DENSITIES = ("liquid_density", "vapor_density")

RELATIVE = 1e-9
RELATIVE_NEAR_CRITICAL = 1e-6
NEAR_CRITICAL = 0.99 - 1e-9  # reduced temperature; the default grid ends at 0.99
PERCENT_POINTS = 1e-9
KELVIN = 1e-6

Key = tuple[str, ...]
Row = Mapping[str, str]


@dataclass(frozen=True)
class Difference:
    """One thing that is not as it was; `column` is "" where a whole row came or went."""

    file: str
    key: Key
    column: str
    old: str
    new: str

    def __str__(self) -> str:
        where = f"{self.file}: {' | '.join(self.key)}"
        if not self.column:
            return f"{where}: {'the row has gone' if self.old else 'the row is new'}"
        return f"{where}: {self.column} was {self.old or 'empty'} and is {self.new or 'empty'}"


def differences(old: Path, new: Path) -> list[Difference]:
    """Everything in which two results folders of one plan differ, points.csv apart."""
    critical = {
        name: constants["critical_temperature"]["value"] for name, constants in _manifest(old)["constants"].items()
    }
    return [
        *_differing_rows(
            "summary.csv", _rows(old / "summary.csv"), _rows(new / "summary.csv"), _summary_rule(critical)
        ),
        *_differing_rows("windows.csv", _windows(old), _windows(new), _window_rule),
        *_differing_text(old / "summary.md", new / "summary.md"),
        *_differing_manifests(old, new),
    ]


def report(found: list[Difference], most: int = 40) -> str:
    """Name the rows, a few words each."""
    lines = [str(difference) for difference in found[:most]]
    return "\n".join([f"{len(found)} differences", *lines, *(["..."] if len(found) > most else [])])


def _rows(path: Path) -> dict[Key, Row]:
    with path.open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    found = {tuple(row[name] for name in ROW): row for row in rows}
    assert len(found) == len(rows), f"{path}: two rows have one key"
    return found


def _windows(folder: Path) -> dict[Key, Row]:
    """Windows by their row and number: the first, second, ... of that row."""
    with (folder / "windows.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    found: dict[Key, Row] = {}
    count: dict[Key, int] = {}
    for row in rows:
        key = tuple(row[name] for name in ROW)
        count[key] = count.get(key, 0) + 1
        found[*key, f"window {count[key]}"] = row
    return found


Rule = Callable[[Row, str, str, str], bool]
"""(old row, column, old cell, new cell) -> whether the cells agree."""


def _differing_rows(file: str, old: Mapping[Key, Row], new: Mapping[Key, Row], agree: Rule) -> Iterator[Difference]:
    for key in [*old, *(key for key in new if key not in old)]:
        if key not in new or key not in old:
            yield Difference(file, key, "", "there" if key in old else "", "there" if key in new else "")
            continue
        for column in {**old[key], **new[key]}:
            before, now = old[key].get(column, ""), new[key].get(column, "")
            if before != now and not agree(old[key], column, before, now):
                yield Difference(file, key, column, before, now)


def _summary_rule(critical: Mapping[str, float]) -> Rule:
    def agree(row: Row, column: str, before: str, now: str) -> bool:
        if column in (*ROW, *COUNTS, *TEXT) or "" in (before, now):
            return False
        tc = critical[row["component"]]
        near = row["property"] in DENSITIES and float(row["to_K"]) >= NEAR_CRITICAL * tc
        tolerance = RELATIVE_NEAR_CRITICAL if near and column not in TEMPERATURES else RELATIVE
        floor = 0.0 if column in TEMPERATURES or column == "share_inside" else PERCENT_POINTS
        return math.isclose(float(before), float(now), rel_tol=tolerance, abs_tol=floor)

    return agree


def _window_rule(_row: Row, column: str, before: str, now: str) -> bool:
    if column not in ("from_K", "to_K") or "" in (before, now):
        return False
    return math.isclose(float(before), float(now), rel_tol=0.0, abs_tol=KELVIN)


_NUMBER = re.compile(r"-?\d+(?:\.\d+)?(?:[eE][-+]?\d+)?")


def _differing_text(old: Path, new: Path) -> Iterator[Difference]:
    """Compare line by line: what is between numbers exactly, numbers to one unit of their last digit."""
    before, now = (path.read_text(encoding="utf-8").splitlines() for path in (old, new))
    if len(before) != len(now):
        yield Difference(old.name, ("lines",), "number", str(len(before)), str(len(now)))
    for i, (a, b) in enumerate(zip(before, now, strict=False), 1):
        if a != b and not _same_line(a, b):
            yield Difference(old.name, (f"line {i}",), "text", a, b)


def _same_line(a: str, b: str) -> bool:
    if [part.strip() for part in _NUMBER.split(a)] != [part.strip() for part in _NUMBER.split(b)]:
        return False
    numbers = zip(_NUMBER.findall(a), _NUMBER.findall(b), strict=True)
    return all(x == y or abs(float(x) - float(y)) <= 1.01 * max(_unit(x), _unit(y)) for x, y in numbers)


def _unit(number: str) -> float:
    """One unit of the last digit; none for a whole number, which may be a count."""
    mantissa, _, exponent = number.lower().partition("e")
    decimals = len(mantissa.partition(".")[2])
    return 10.0 ** (int(exponent or 0) - decimals) if decimals else 0.0


def _manifest(folder: Path) -> dict[str, Any]:
    content: dict[str, Any] = json.loads((folder / "manifest.json").read_text(encoding="utf-8"))
    return content


def _differing_manifests(old: Path, new: Path) -> Iterator[Difference]:
    before, now = ({k: v for k, v in _manifest(f).items() if k != "volatile"} for f in (old, new))
    for content in (before, now):
        content["outputs"] = sorted(content["outputs"])  # which files there are; their hashes are left out
    yield from _differing_json(before, now, ())


def _differing_json(before: Any, now: Any, at: Key) -> Iterator[Difference]:
    if isinstance(before, dict) and isinstance(now, dict):
        for key in {**before, **now}:
            yield from _differing_json(before.get(key), now.get(key), (*at, str(key)))
    elif before != now:
        yield Difference("manifest.json", at, "value", str(before)[:80], str(now)[:80])


# ---------------------------------------------------------------- the committed run


@pytest.fixture(scope="module")
def committed(root: Path) -> Path:
    folder = root / "results" / "broad"
    assert folder.is_dir(), "results/broad is missing: eosmuster sweep --points none --out results/broad"
    return folder


@pytest.fixture(scope="module")
def today(broad: Any, tmp_path_factory: pytest.TempPathFactory) -> Path:
    return broad.save(tmp_path_factory.mktemp("today") / "broad", points=False)


def test_the_committed_run_is_what_the_code_gives_today(committed: Path, today: Path) -> None:
    found = differences(committed, today)
    assert not found, report(found)


def test_the_committed_run_has_no_points_and_no_other_file(committed: Path) -> None:
    """points.csv is too large for a repository."""
    assert {path.name for path in committed.iterdir()} == {
        "summary.csv",
        "windows.csv",
        "summary.md",
        "manifest.json",
    }
    assert sum(path.stat().st_size for path in committed.iterdir()) < 5 * 2**20


def test_the_summary_for_readers_fits_a_ci_step_summary(committed: Path) -> None:
    assert (committed / "summary.md").stat().st_size < 2**20


def test_the_manifest_s_hashes_are_those_of_its_files(committed: Path, today: Path) -> None:
    import hashlib

    for folder in (committed, today):
        for name, expected in _manifest(folder)["outputs"].items():
            assert hashlib.sha256((folder / name).read_bytes()).hexdigest() == expected, name


def test_reference_data_has_not_changed_since(committed: Path, root: Path) -> None:
    import hashlib

    for name, expected in _manifest(committed)["references"].items():
        data = (root / "references" / name).read_bytes()
        assert hashlib.sha256(data).hexdigest() == expected, f"references/{name}: run the broad plan again"


# ---------------------------------------------------------------- the comparison itself


@pytest.fixture
def changed(today: Path, tmp_path: Path) -> Path:
    return Path(shutil.copytree(today, tmp_path / "changed"))


def _edit(path: Path, edit: Callable[[list[str]], None]) -> None:
    lines = path.read_text(encoding="utf-8").splitlines(keepends=True)
    edit(lines)
    path.write_text("".join(lines), encoding="utf-8")


def _cell(path: Path, line: int, column: str, change: Callable[[str], str]) -> None:
    with path.open(encoding="utf-8", newline="") as file:
        rows = list(csv.reader(file))
    at = rows[0].index(column)
    rows[line][at] = change(rows[line][at])
    with path.open("w", encoding="utf-8", newline="") as file:
        csv.writer(file, lineterminator="\n").writerows(rows)


def _scaled(factor: float) -> Callable[[str], str]:
    return lambda cell: repr(float(cell) * factor)


def test_equal_folders_do_not_differ(today: Path, changed: Path) -> None:
    assert differences(today, changed) == []


FIRST_ROW = ("Methane", "vdW", "saturation_pressure", "coolprop")


@pytest.mark.parametrize(
    ("column", "change"),
    [
        ("aad_pct", _scaled(1.0 + 3e-9)),
        ("from_K", _scaled(1.0 + 3e-9)),
        ("inside", lambda _: "7"),
        ("verdict", lambda _: "inside"),
        ("independence", lambda _: "fitted"),
        ("note", lambda _: "another reason"),
        ("passing_limit_pct", lambda _: ""),
    ],
)
def test_a_changed_row_is_named(today: Path, changed: Path, column: str, change: Callable[[str], str]) -> None:
    _cell(changed / "summary.csv", 1, column, change)
    [found] = differences(today, changed)
    assert (found.file, found.key, found.column) == ("summary.csv", FIRST_ROW, column)
    assert str(found).startswith(f"summary.csv: Methane | vdW | saturation_pressure | coolprop: {column} was ")


@pytest.mark.parametrize("column", ["aad_pct", "from_K", "max_pct"])
def test_the_last_digits_of_a_number_do_not_matter(today: Path, changed: Path, column: str) -> None:
    _cell(changed / "summary.csv", 1, column, _scaled(1.0 + 3e-10))
    assert differences(today, changed) == []


def test_densities_at_099_tc_have_a_wider_tolerance(today: Path, changed: Path) -> None:
    [number] = [
        i
        for i, key in enumerate(_rows(today / "summary.csv"), 1)
        if key == ("Methane", "PR", "liquid_density", "coolprop")
    ]
    _cell(changed / "summary.csv", number, "aad_pct", _scaled(1.0 + 3e-7))
    assert differences(today, changed) == []
    _cell(changed / "summary.csv", number, "aad_pct", _scaled(1.0 + 3e-6))
    assert [d.column for d in differences(today, changed)] == ["aad_pct"]


def test_a_vanished_row_is_named(today: Path, changed: Path) -> None:
    _edit(changed / "summary.csv", lambda lines: lines.pop(1))
    [found] = differences(today, changed)
    assert str(found) == "summary.csv: Methane | vdW | saturation_pressure | coolprop: the row has gone"


def test_an_appeared_row_is_named(today: Path, changed: Path) -> None:
    _edit(changed / "summary.csv", lambda lines: lines.append(lines[1].replace("vdW", "vdW+new", 1)))
    [found] = differences(today, changed)
    assert str(found) == "summary.csv: Methane | vdW+new | saturation_pressure | coolprop: the row is new"


def test_ends_of_windows_are_compared_to_a_millionth_of_a_kelvin(today: Path, changed: Path) -> None:
    _cell(changed / "windows.csv", 1, "to_K", lambda cell: repr(float(cell) + 0.9e-6))
    assert differences(today, changed) == []
    _cell(changed / "windows.csv", 1, "to_K", lambda cell: repr(float(cell) + 0.9e-6))
    [found] = differences(today, changed)
    assert (found.file, found.key[-1], found.column) == ("windows.csv", "window 1", "to_K")


def test_a_window_that_came_or_went_is_named(today: Path, changed: Path) -> None:
    _edit(changed / "windows.csv", lambda lines: lines.pop())
    [found] = differences(today, changed)
    assert found.column == ""
    assert str(found).endswith("the row has gone")


def test_words_of_the_summary_for_readers_count_and_last_digits_do_not(today: Path, changed: Path) -> None:
    path = changed / "summary.md"
    lines = path.read_text(encoding="utf-8").splitlines()
    number = next(i for i, line in enumerate(lines) if re.search(r"\| \d+\.\d %", line))
    _edit(path, lambda all_lines: all_lines.__setitem__(number, _last_digit_up(all_lines[number])))
    assert differences(today, changed) == []
    _edit(path, lambda all_lines: all_lines.__setitem__(number, all_lines[number].replace("|", "| worse", 1)))
    [found] = differences(today, changed)
    assert (found.file, found.key) == ("summary.md", (f"line {number + 1}",))


def _last_digit_up(line: str) -> str:
    return re.sub(r"\| (\d+\.)(\d) %", lambda m: f"| {m[1]}{(int(m[2]) + 1) % 10 or int(m[2]) - 1} %", line, count=1)


def test_the_manifest_counts_but_for_what_is_volatile(today: Path, changed: Path) -> None:
    content = _manifest(changed)
    content["volatile"] = {"platform": "another"}
    content["outputs"]["summary.csv"] = "0" * 64
    content["decision"]["rule"] = "simple"
    content["constants"]["Methane"]["acentric_factor"]["value"] = 0.5
    (changed / "manifest.json").write_text(json.dumps(content), encoding="utf-8")
    found = [str(d) for d in differences(today, changed)]
    assert found[0] == "manifest.json: decision | rule: value was guarded and is simple"
    assert found[1].startswith("manifest.json: constants | Methane | acentric_factor | value: value was 0.0114")
    assert len(found) == 2


def test_many_differences_are_cut_short() -> None:
    many = [Difference("summary.csv", (str(i),), "aad_pct", "1", "2") for i in range(50)]
    text = report(many)
    assert text.startswith("50 differences\nsummary.csv: 0: aad_pct was 1 and is 2\n")
    assert len(text.splitlines()) == 42

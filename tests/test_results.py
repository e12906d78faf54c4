"""The committed run of the broad plan is what the code gives today.

Numbers may differ by what another processor's exp and log leave behind, not more: the drift of the two folders at a
tolerance of 1e-9 (`eosmuster.drifting.agreement` says what that means for each column) is empty, and so is that of
1e-6 for densities that reach 0.99 Tc, where the isotherm is flat. A drift says nothing of a place that may jump
between two equal deviations and of numbers in notes; they do not jump here. Numbers of summary.md may differ by one
unit of their last digit shown.

Counts, verdicts, notes and all other text must be equal, and so must the manifest, except for what it calls
volatile and for the hashes of the files compared here: the last digit of one number changes them.
"""

from __future__ import annotations

import json
import math
import re
import shutil
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest

from eosmuster.drifting.adopting import ADOPTIONS
from eosmuster.drifting.changes import RowChange
from eosmuster.drifting.comparing import drift
from eosmuster.drifting.sides import read_side
from eosmuster.drifting.text import in_words
from eosmuster.report.manifest import file_hash, reference_hashes

DENSITIES = ("liquid_density", "vapor_density")
NEAR_CRITICAL = 0.99 - 1e-9  # reduced temperature; the default grid ends at 0.99
TOLERANCE, TOLERANCE_NEAR_CRITICAL = 1e-9, 1e-6
PLACES = ("max_at_K", "max_at_Pa")


def differences(old: Path, new: Path) -> list[str]:
    """Everything in which two results folders of one plan differ, points.csv apart, one sentence each."""
    return [
        *map(in_words, _drifted(old, new)),
        *_places_and_notes(old, new),
        *_text(old / "summary.md", new / "summary.md"),
        *_json(*map(_compared, (old, new)), "manifest.json"),
    ]


def _drifted(old: Path, new: Path) -> list[RowChange]:
    found = drift(old, new, TOLERANCE).rows
    if not found:
        return []
    critical = {name: c["critical_temperature"]["value"] for name, c in _manifest(old)["constants"].items()}
    loosely = {row.key for row in drift(old, new, TOLERANCE_NEAR_CRITICAL).rows}

    def counts(row: RowChange) -> bool:
        near = row.old is not None and row.old.to_K >= NEAR_CRITICAL * critical[row.key.component]
        return row.key in loosely or not (near and row.key.property in DENSITIES)

    return [row for row in found if counts(row)]


def _places_and_notes(old: Path, new: Path) -> Iterator[str]:
    before, now = read_side(old).rows, read_side(new).rows
    for key in (key for key in before if key in now):
        for name in (*PLACES, "note"):
            was, is_now = getattr(before[key], name), getattr(now[key], name)
            same = was == is_now or (name in PLACES and _close(was, is_now))
            if not same:
                yield f"summary.csv: {key}: {name} was {was} and is {is_now}"


def _close(a: float, b: float) -> bool:
    return (math.isnan(a) and math.isnan(b)) or math.isclose(a, b, rel_tol=TOLERANCE)


_NUMBER = re.compile(r"-?\d+(?:\.\d+)?(?:[eE][-+]?\d+)?")


def _text(old: Path, new: Path) -> Iterator[str]:
    """Compare line by line: what is between numbers exactly, numbers to one unit of their last digit."""
    before, now = (path.read_text(encoding="utf-8").splitlines() for path in (old, new))
    if len(before) != len(now):
        yield f"{old.name}: has {len(now)} lines and had {len(before)}"
    for i, (a, b) in enumerate(zip(before, now, strict=False), 1):
        if a != b and not _same_line(a, b):
            yield f"{old.name}: line {i} was {a!r} and is {b!r}"


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


def _compared(folder: Path) -> dict[str, Any]:
    """Give the manifest without what is volatile, and which outputs there are without their hashes."""
    content = _manifest(folder)
    return {k: v for k, v in content.items() if k != "volatile"} | {"outputs": sorted(content["outputs"])}


def _json(before: Any, now: Any, at: str) -> Iterator[str]:
    if isinstance(before, dict) and isinstance(now, dict):
        for key in {**before, **now}:
            yield from _json(before.get(key), now.get(key), f"{at} | {key}")
    elif before != now:
        yield f"{at} was {str(before)[:80]} and is {str(now)[:80]}"


# ---------------------------------------------------------------- the committed run


@pytest.fixture(scope="module")
def committed(root: Path) -> Path:
    folder = root / "results" / "broad"
    assert folder.is_dir(), "results/broad is missing: eosmuster sweep --points none --out results/broad"
    return folder


@pytest.fixture(scope="module")
def today(broad: Any, tmp_path_factory: pytest.TempPathFactory) -> Path:
    return Path(broad.save(tmp_path_factory.mktemp("today") / "broad", points=False, dossier=False))


def test_the_committed_run_is_what_the_code_gives_today(committed: Path, today: Path) -> None:
    found = differences(committed, today)
    assert not found, "\n".join([f"{len(found)} differences", *found[:40]])


def test_the_committed_run_has_no_points_and_no_other_file(committed: Path) -> None:
    """points.csv is too large for a repository."""
    names = {path.name for path in committed.iterdir()} - {ADOPTIONS}
    assert names == {*_manifest(committed)["outputs"], "manifest.json"}
    assert "points.csv" not in names
    assert sum(path.stat().st_size for path in committed.iterdir()) < 5 * 2**20


def test_the_summary_for_readers_fits_a_ci_step_summary(committed: Path) -> None:
    assert (committed / "summary.md").stat().st_size < 2**20


def test_the_manifest_s_hashes_are_those_of_its_files(committed: Path, today: Path) -> None:
    for folder in (committed, today):
        for name, expected in _manifest(folder)["outputs"].items():
            assert file_hash(folder / name) == expected, name


def test_reference_data_has_not_changed_since(committed: Path) -> None:
    assert _manifest(committed)["references"] == reference_hashes(), "run the broad plan again"


# ---------------------------------------------------------------- the comparison itself

SMALL = """
components = ["methane", "water"]
models = ["vdW", "PR"]
properties = ["saturation_pressure", "liquid_density"]
[references]
use = ["coolprop", "handbook"]
"""


@pytest.fixture(scope="module")
def small(swept: Callable[[str], Any], tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder of the same kind that is read quickly."""
    return Path(swept(SMALL).save(tmp_path_factory.mktemp("small") / "small", points=False, dossier=False))


@pytest.fixture
def changed(small: Path, tmp_path: Path) -> Path:
    return Path(shutil.copytree(small, tmp_path / "changed"))


def _edit(path: Path, edit: Callable[[list[str]], None]) -> None:
    lines = path.read_text(encoding="utf-8").splitlines(keepends=True)
    edit(lines)
    path.write_text("".join(lines), encoding="utf-8")


def _scaled(path: Path, row: str, column: str, factor: float) -> None:
    """Scale one number of the row that begins so."""

    def edit(lines: list[str]) -> None:
        at = lines[0].rstrip("\n").split(",").index(column)
        number = next(i for i, line in enumerate(lines) if line.startswith(row))
        cells = lines[number].split(",")
        cells[at] = repr(float(cells[at]) * factor)
        lines[number] = ",".join(cells)

    _edit(path, edit)


FIRST = "Methane,vdW,saturation_pressure,coolprop,"


def test_equal_folders_do_not_differ(small: Path, changed: Path) -> None:
    assert differences(small, changed) == []


@pytest.mark.parametrize("column", ["aad_pct", "from_K", "max_at_K", "mean_predicted"])
def test_three_billionths_count_and_a_third_of_one_does_not(small: Path, changed: Path, column: str) -> None:
    _scaled(changed / "summary.csv", FIRST, column, 1.0 + 3e-10)
    assert differences(small, changed) == []
    _scaled(changed / "summary.csv", FIRST, column, 1.0 + 3e-9)
    [found] = differences(small, changed)
    assert "Methane | vdW | saturation" in found


def test_densities_at_099_tc_have_a_wider_tolerance(small: Path, changed: Path) -> None:
    row = "Methane,PR,liquid_density,coolprop,"
    _scaled(changed / "summary.csv", row, "aad_pct", 1.0 + 3e-7)
    assert differences(small, changed) == []
    _scaled(changed / "summary.csv", row, "aad_pct", 1.0 + 3e-6)
    assert len(differences(small, changed)) == 1


def test_a_note_counts_with_its_numbers(small: Path, changed: Path) -> None:
    start = Path(shutil.copytree(small, changed.parent / "start"))
    for folder, note in ((start, "7 undecided"), (changed, "8 undecided")):
        _edit(folder / "summary.csv", lambda lines, note=note: _note(lines, note))  # type: ignore[misc]
    [found] = differences(start, changed)
    assert found.endswith(": note was 7 undecided and is 8 undecided")


def _note(lines: list[str], note: str) -> None:
    """Give the first row a note."""
    cells = lines[1].split(",")
    cells[lines[0].split(",").index("note")] = note
    lines[1] = ",".join(cells)


def test_words_of_the_summary_for_readers_count_and_last_digits_do_not(small: Path, changed: Path) -> None:
    path = changed / "summary.md"
    lines = path.read_text(encoding="utf-8").splitlines()
    number = next(i for i, line in enumerate(lines) if re.search(r"\| \d+\.\d %", line))
    _edit(path, lambda all_lines: all_lines.__setitem__(number, _last_digit_up(all_lines[number])))
    assert differences(small, changed) == []
    _edit(path, lambda all_lines: all_lines.__setitem__(number, all_lines[number].replace("|", "| worse", 1)))
    [found] = differences(small, changed)
    assert found.startswith(f"summary.md: line {number + 1} was ")


def _last_digit_up(line: str) -> str:
    return re.sub(r"\| (\d+\.)(\d) %", lambda m: f"| {m[1]}{(int(m[2]) + 1) % 10 or int(m[2]) - 1} %", line, count=1)


def test_the_manifest_counts_but_for_what_is_volatile(small: Path, changed: Path) -> None:
    content = _manifest(changed)
    content["volatile"] = {"platform": "another"}
    content["outputs"]["summary.csv"] = "0" * 64
    content["decision"]["rule"] = "simple"
    content["citations"]["coolprop"] = "somebody"
    (changed / "manifest.json").write_text(json.dumps(content), encoding="utf-8")
    found = differences(small, changed)
    assert found[0] == "manifest.json | decision | rule was guarded and is simple"
    assert found[1].startswith("manifest.json | citations | coolprop was ")
    assert len(found) == 2

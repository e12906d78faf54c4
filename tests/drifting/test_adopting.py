"""A baseline changes by adoption alone: at once, whole, with a reason, and written down."""

from __future__ import annotations

import json
import re
from collections.abc import Callable
from pathlib import Path

import pytest

from eosmuster.api import sweep
from eosmuster.drifting import adopting
from eosmuster.drifting.adopting import ADOPTIONS, adopt
from eosmuster.drifting.comparing import drift
from eosmuster.errors import InputError
from eosmuster.report.folder import checked

Folder = Callable[..., Path]
REASON = "the narrower limit was agreed on"


def content(folder: Path) -> dict[str, bytes]:
    return {path.name: path.read_bytes() for path in sorted(folder.iterdir())}


@pytest.fixture
def baseline(base: Path, copy_of: Folder) -> Path:
    return copy_of(base, "baseline")


@pytest.fixture
def results(plan: str, swept_folder: Folder) -> Path:
    return swept_folder(plan + "[tolerance]\nsaturation_pressure = '0.1 %'\n")


def refused(baseline: Path, results: Path, reason: str | None, *words: str) -> None:
    before = content(baseline) if baseline.is_dir() else {}
    beside = sorted(baseline.parent.iterdir()) if baseline.parent.is_dir() else []
    with pytest.raises(InputError) as caught:
        adopt(baseline, results, reason)
    message = str(caught.value)
    assert "\n" not in message
    assert not message.endswith(".")
    for word in words:
        assert word in message
    assert (content(baseline) if baseline.is_dir() else {}) == before
    assert (sorted(baseline.parent.iterdir()) if baseline.parent.is_dir() else []) == beside


def test_the_baseline_becomes_the_results_and_says_why(
    baseline: Path, results: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("LOGNAME", "a.tester")
    adopted = adopt(baseline, results, f"  {REASON}\n ")
    assert adopted.drift is not None
    assert adopted.drift.flips
    found = content(baseline)
    record = found.pop(ADOPTIONS).decode()
    assert found == content(results)
    assert not drift(baseline, results)
    assert [path.name for path in baseline.parent.iterdir()] == ["baseline"]
    assert record.startswith("# Adoptions\n")
    assert re.search(r"\n## \d{4}-\d\d-\d\dT\d\d:\d\d:\d\d\+00:00 by a\.tester\n\nReason: " + REASON + "\n", record)
    for line in (
        "- plan: plan\n",
        "CoolProp 8.",
        "- causes: tolerance 4 rows\n",
        "- n-Propane \\| PR \\| saturation pressure \\| coolprop: inside -&gt; partly\n",
    ):
        assert line in record
    assert "SHA-256 of manifest.json: " in record


def test_without_a_name_in_the_environment_the_password_database_gives_it(
    baseline: Path, results: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    pwd = pytest.importorskip("pwd")
    for name in ("LOGNAME", "USER", "LNAME", "USERNAME"):
        monkeypatch.delenv(name, raising=False)
    monkeypatch.setattr(pwd, "getpwuid", lambda _uid: ("b.keeper", "x", 1, 1, "", "/", "/bin/sh"))
    assert " by b.keeper\n" in adopt(baseline, results, REASON).entry

    def unknown(_uid: int) -> None:
        raise KeyError("no such uid")

    monkeypatch.setattr(pwd, "getpwuid", unknown)
    assert re.search(r"\n## [-\d]+T[:\d]+\+00:00\n", adopt(baseline, results, REASON).entry)


def test_the_record_goes_on_over_further_adoptions(base: Path, baseline: Path, results: Path) -> None:
    first = adopt(baseline, results, "first").entry
    second = adopt(baseline, base, "second").entry
    third = adopt(baseline, base, "third, and nothing changed").entry
    assert (baseline / ADOPTIONS).read_text(encoding="utf-8").endswith(first + second + third)
    assert (baseline / ADOPTIONS).read_text(encoding="utf-8").count("# Adoptions") == 1
    assert "no drift: 12 rows unchanged" in third


def test_what_people_added_to_the_record_stays_byte_for_byte(baseline: Path, results: Path) -> None:
    (baseline / ADOPTIONS).write_bytes(b"ours \xff, without an end")
    adopted = adopt(baseline, results, REASON)
    assert (baseline / ADOPTIONS).read_bytes() == b"ours \xff, without an end\n" + adopted.entry.encode()


def test_a_sweep_does_not_replace_a_baseline_that_was_adopted(
    baseline: Path, results: Path, plan_file: Folder
) -> None:
    adopt(baseline, results, REASON)
    before = content(baseline)
    with pytest.raises(InputError):
        checked(baseline, overwrite=True)
    with pytest.raises(InputError):
        sweep(plan_file()).save(baseline, overwrite=True)
    assert content(baseline) == before


@pytest.mark.parametrize("reason", [None, "", " \n\t", "\u200b\u202e", "...", "x" * 1001])
def test_no_reason_no_adoption(baseline: Path, results: Path, reason: str | None) -> None:
    refused(baseline, results, reason, "reason")


def test_a_reason_of_the_greatest_length_is_kept_whole(baseline: Path, results: Path) -> None:
    adopt(baseline, results, "水" * 1000)
    assert "水" * 1000 in (baseline / ADOPTIONS).read_text(encoding="utf-8")


@pytest.mark.parametrize(
    "reason",
    [
        "two\n\n## 2030-01-01 by somebody else\n\nReason: lines",
        "<script>alert(1)</script>",
        "a | b | c",
        "![x](http://x) [y](z) `code` ~~no~~ *bold*",
        "\x1b[31mred\u202e",
        "| --- | x",
    ],
)
def test_a_reason_cannot_write_markdown(baseline: Path, results: Path, reason: str) -> None:
    entry = adopt(baseline, results, reason).entry
    [line] = [line for line in entry.split("\n") if line.startswith("Reason: ")]
    assert entry.count("\n## ") == 1
    assert not re.search(r"(?<!\\)[|`*\[\]~]", line)
    assert "<" not in line
    assert line.isprintable()


def test_results_that_are_not_as_their_run_wrote_them(baseline: Path, results: Path, copy_of: Folder) -> None:
    for name in ("summary.csv", "points.csv", "summary.md"):
        changed = copy_of(results, f"changed-{name}")
        (changed / name).write_bytes((changed / name).read_bytes() + b"\n")
        with pytest.raises(InputError):
            adopt(baseline, changed, REASON)
        missing = copy_of(results, f"missing-{name}")
        (missing / name).unlink()
        with pytest.raises(InputError):
            adopt(baseline, missing, REASON)
    assert not (baseline / ADOPTIONS).exists()
    markdown = copy_of(results, "tampered")
    (markdown / "summary.md").write_text("all is well\n", encoding="utf-8")
    refused(baseline, markdown, REASON, "summary.md is not as its run wrote it", "run the plan again")


def test_a_folder_with_anything_else_in_it(baseline: Path, results: Path) -> None:
    (baseline / "thesis.txt").write_text("mine")
    refused(baseline, results, REASON, "'thesis.txt'")


def test_places_that_are_no_baseline(base: Path, baseline: Path, results: Path, tmp_path: Path) -> None:
    refused(tmp_path / "nowhere", results, REASON, "is not there")
    (tmp_path / "empty").mkdir()
    refused(tmp_path / "empty", results, REASON, "is no results folder")
    refused(baseline, baseline, REASON, "both baseline and results")
    refused(baseline, tmp_path / "empty", REASON, "is no results folder")


def test_the_current_folder_is_no_baseline(baseline: Path, results: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(baseline)
    refused(baseline, results, REASON, "is the current folder")


@pytest.mark.parametrize("error", [OSError("disk full"), KeyboardInterrupt()])
@pytest.mark.parametrize("step", ["_copy", "_onto_the_disk", "placing.put"])
def test_an_adoption_that_fails_leaves_the_baseline_as_it_was(
    baseline: Path, results: Path, monkeypatch: pytest.MonkeyPatch, step: str, error: BaseException
) -> None:
    def fail(*_: object) -> None:
        raise error

    monkeypatch.setattr(f"eosmuster.drifting.adopting.{step}", fail)
    before = content(baseline)
    with pytest.raises((InputError, KeyboardInterrupt)):
        adopt(baseline, results, REASON)
    assert content(baseline) == before
    assert [path.name for path in baseline.parent.iterdir()] == ["baseline"]


def test_a_baseline_that_is_replaced_meanwhile(
    baseline: Path, base: Path, results: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    original = adopting._copy

    def copy(source: Path, part: Path, manifest: dict) -> None:
        original(source, part, manifest)
        text = (baseline / "manifest.json").read_text(encoding="utf-8")
        (baseline / "manifest.json").write_text(text + "\n", encoding="utf-8")

    monkeypatch.setattr(adopting, "_copy", copy)
    with pytest.raises(InputError, match="was replaced while it was compared"):
        adopt(baseline, results, REASON)
    assert not (baseline / ADOPTIONS).exists()


def test_results_that_change_while_they_are_copied(
    baseline: Path, results: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    import shutil

    original = shutil.copyfile

    def copy(source: Path, target: Path) -> None:
        original(source, target)
        if target.name == "windows.csv":
            target.write_bytes(b"half")

    monkeypatch.setattr(shutil, "copyfile", copy)
    refused(baseline, results, REASON, "windows.csv changed while it was copied")


def test_a_baseline_of_an_earlier_record_version_can_be_left_behind(baseline: Path, results: Path) -> None:
    path = baseline / "manifest.json"
    manifest = json.loads(path.read_text(encoding="utf-8"))
    path.write_text(json.dumps(manifest | {"record_version": 0}), encoding="utf-8")
    adopted = adopt(baseline, results, "the record has new columns")
    assert adopted.drift is None
    assert "drift: not known, since the old baseline was of another record version" in adopted.entry
    assert not drift(baseline, results)


def test_a_record_that_grew_without_end(baseline: Path, results: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(adopting, "_LARGEST", 10)
    (baseline / ADOPTIONS).write_bytes(b"x" * 11)
    refused(baseline, results, REASON, "is larger than")


def test_many_flips_are_counted(baseline: Path, results: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(adopting, "_MOST_FLIPS", 1)
    entry = adopt(baseline, results, REASON).entry
    assert "- and 1 more flipped verdict\n" in entry


def test_what_file_managers_leave_is_no_obstacle(baseline: Path, results: Path) -> None:
    (baseline / ".DS_Store").write_bytes(b"x")
    adopt(baseline, results, REASON)
    assert ".DS_Store" not in content(baseline)

"""``eosmuster drift``: what it prints and writes, and its exit status."""

from __future__ import annotations

import argparse
import csv
import json
import os
from collections.abc import Callable
from pathlib import Path
from typing import NamedTuple

import pytest

from eosmuster.commands import drift as command
from eosmuster.errors import InputError
from eosmuster.report.text import cells_of

Folder = Callable[..., Path]


class Done(NamedTuple):
    status: int
    out: str
    err: str


@pytest.fixture
def run(capsys: pytest.CaptureFixture[str], tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Callable[..., Done]:
    (tmp_path / "here").mkdir()
    monkeypatch.chdir(tmp_path / "here")
    parser = argparse.ArgumentParser()
    command.add(parser)

    def done(*arguments: object) -> Done:
        status = command.run(parser.parse_args([str(a) for a in arguments]))
        return Done(status, *capsys.readouterr())

    return done


@pytest.fixture
def narrower(plan: str, swept_folder: Folder) -> Path:
    return swept_folder(plan + "[tolerance]\nsaturation_pressure = '0.1 %'\n")


def test_no_drift(run: Callable[..., Done], base: Path) -> None:
    done = run(base, base)
    assert done.status == 0
    assert done.out.startswith("no drift: 12 rows unchanged\n")
    assert done.err == ""


def test_drift_is_shown_and_written(run: Callable[..., Done], base: Path, narrower: Path) -> None:
    done = run(base, narrower, "--csv", "rows.csv", "--markdown", "drift.md")
    assert done.status == 1
    assert done.out.startswith("drift: ")
    assert all(cells_of(line) <= 100 for line in done.out.split("\n") if "pytest" not in line)
    with Path("rows.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    assert len(rows) == 4
    assert Path("drift.md").read_text(encoding="utf-8").startswith("# Drift of plan\n")
    assert sorted(path.name for path in Path.cwd().iterdir()) == ["drift.md", "rows.csv"]
    assert "rows: rows.csv" in done.out


def test_files_are_written_without_drift_too(run: Callable[..., Done], base: Path) -> None:
    assert run(base, base, "--csv", "rows.csv").status == 0
    assert Path("rows.csv").read_text(encoding="utf-8").count("\n") == 1


def test_another_tolerance(run: Callable[..., Done], base: Path, copy_of: Folder, edit: Callable) -> None:
    new = copy_of(base)
    edit(new / "summary.csv", lambda row: row.update(aad_pct=repr(float(row["aad_pct"]) + 1e-4)))
    assert run(base, new).status == 1
    assert run(base, new, "--tolerance", "1e-3").status == 0


def test_adopting(run: Callable[..., Done], base: Path, narrower: Path, copy_of: Folder) -> None:
    baseline = copy_of(base)
    done = run(baseline, narrower, "--adopt", "--reason", "agreed on")
    assert done.status == 0
    assert done.out.startswith("drift: ")
    assert "adopted: " in done.out
    assert run(baseline, narrower).status == 0


@pytest.mark.parametrize(
    ("options", "words"),
    [
        (["--reason", "x"], "--reason goes with --adopt"),
        (["--adopt"], "needs a reason"),
        (["--adopt", "--reason", ""], "--reason is empty"),
        (["--adopt", "--reason", "x" * 1001], "at most 1000"),
        (["--tolerance", "x"], "--tolerance 'x' is not a number"),
        (["--csv", "nowhere/rows.csv"], "--csv: 'nowhere/rows.csv' cannot be written: there is no folder"),
        (["--markdown", "."], "--markdown: '.' is a folder"),
        (["--csv", "a\0b"], "--csv: 'a\\x00b'"),
        (["--csv", "x", "--markdown", "./x"], "--csv and --markdown both name 'x'; name two files"),
    ],
)
def test_bad_options_are_one_sentence_and_nothing_is_touched(
    run: Callable[..., Done], base: Path, narrower: Path, copy_of: Folder, options: list[str], words: str
) -> None:
    baseline = copy_of(base)
    before = {path.name: path.read_bytes() for path in baseline.iterdir()}
    with pytest.raises(InputError) as caught:
        run(baseline, narrower, *options)
    assert words in str(caught.value)
    assert "\n" not in str(caught.value)
    assert {path.name: path.read_bytes() for path in baseline.iterdir()} == before
    assert list(Path.cwd().iterdir()) == []


def test_a_file_that_cannot_be_written_does_not_hide_the_adoption(
    run: Callable[..., Done],
    base: Path,
    narrower: Path,
    copy_of: Folder,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
) -> None:
    def fail(target: Path, _content: bytes, option: str) -> None:
        raise InputError(f"{option}: {target} cannot be written: No space left on device")

    monkeypatch.setattr("eosmuster.report.files.write_whole", fail)
    baseline = copy_of(base)
    with pytest.raises(InputError) as caught:
        run(baseline, narrower, "--adopt", "--reason", "agreed on", "--csv", "rows.csv")
    assert str(caught.value).endswith(f"No space left on device; {baseline} was adopted all the same")
    assert f"adopted: {baseline}" in capsys.readouterr().out
    assert run(baseline, narrower).status == 0


def test_files_that_are_not_written_are_named(
    run: Callable[..., Done], base: Path, narrower: Path, copy_of: Folder
) -> None:
    baseline = copy_of(base)
    manifest = json.loads((baseline / "manifest.json").read_text(encoding="utf-8"))
    (baseline / "manifest.json").write_text(json.dumps(manifest | {"record_version": 0}), encoding="utf-8")
    done = run(baseline, narrower, "--adopt", "--reason", "x", "--csv", "rows.csv", "--markdown", "drift.md")
    assert done.status == 0
    assert "adopted: " in done.out
    for option, line in zip(("--csv", "--markdown"), done.err.splitlines(), strict=True):
        assert line.startswith(
            f"eosmuster: {option}: nothing is written, since the drift from a baseline of another "
        )
    assert list(Path.cwd().iterdir()) == []


def test_names_of_files_do_not_steer_the_terminal(run: Callable[..., Done], base: Path) -> None:
    name = os.fsdecode(b"a\x1b[31m\xff.csv")
    out = run(base, base, "--csv", name).out
    assert "rows: a\\x1b[31m\\udcff.csv\n" in out
    assert Path(name).exists()


def test_no_file_is_written_into_a_results_folder(run: Callable[..., Done], base: Path, copy_of: Folder) -> None:
    place = copy_of(base)
    with pytest.raises(InputError, match="lies in the results folder"):
        run(place, base, "--csv", place / "rows.csv")
    assert not (place / "rows.csv").exists()


def test_a_file_that_cannot_be_written_leaves_nothing(
    run: Callable[..., Done], base: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    def fail(self: Path, target: Path) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setattr(Path, "replace", fail)
    with pytest.raises(InputError, match="No space left on device"):
        run(base, base, "--csv", "rows.csv")
    assert list(Path.cwd().iterdir()) == []

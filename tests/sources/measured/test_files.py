"""Many files: patterns, folders, progress; every bad one listed, none fatal."""

from __future__ import annotations

import gc
import os
from pathlib import Path

import pytest

from eosmuster.errors import InputError
from eosmuster.sources.measured.files import read_files, read_folder, readings

FIXTURES = Path(__file__).parents[1] / "fixtures" / "thermoml"
GOOD_XML = (FIXTURES / "older_pure.xml").read_bytes()
GOOD_CSV = "component,temperature [K],saturation_pressure [kPa]\npropane,{},998\n"


@pytest.fixture
def folder(tmp_path: Path) -> Path:
    (tmp_path / "lab" / "deep").mkdir(parents=True)
    (tmp_path / "lab" / "a.xml").write_bytes(GOOD_XML)
    (tmp_path / "lab" / "b.xml").write_bytes(GOOD_XML[:3000])
    (tmp_path / "lab" / "density.csv").write_text(GOOD_CSV.format(301))
    (tmp_path / "lab" / "density.json").write_text("{}")
    (tmp_path / "lab" / "notes.txt").write_text("not a table")
    (tmp_path / "lab" / "plot.png").write_bytes(b"\x89PNG")
    (tmp_path / "lab" / "deep" / "c.CSV").write_text(GOOD_CSV.format(302))
    return tmp_path


def files(reading) -> list[str]:  # type: ignore[no-untyped-def]
    return sorted({one.source.file for one in reading.sets})


def test_patterns_of_a_plan(folder: Path) -> None:
    reading = read_files(["lab/*.xml", "lab/density.csv"], folder)
    assert files(reading) == ["lab/a.xml", "lab/density.csv"]
    assert reading.files == 3
    assert [str(d).partition(": ")[0] for d in reading.diagnostics if d.code == "file"] == ["lab/b.xml"]


def test_a_file_is_read_once_whatever_patterns_name_it(folder: Path) -> None:
    reading = read_files(["lab/*.csv", "lab/density.*", "**/density.csv"], folder)
    assert reading.files == 1
    assert not reading.diagnostics


def test_an_absolute_pattern(folder: Path) -> None:
    assert read_files([str(folder / "lab" / "*.csv")], Path("nowhere")).files == 1


@pytest.mark.parametrize("pattern", ["lab/*.xls", "nowhere/**", "", "a\0b"])
def test_a_pattern_that_names_nothing_is_an_error(folder: Path, pattern: str) -> None:
    with pytest.raises(InputError, match=r"references\.files: "):
        read_files(["lab/*.xml", pattern], folder)


@pytest.mark.parametrize("patterns", [["lab/density.json"], ["lab/*.json", "lab/density.json"]])
def test_patterns_that_name_nothing_but_descriptors_are_an_error(folder: Path, patterns: list[str]) -> None:
    with pytest.raises(InputError, match=r"references\.files: 'lab/.*json' names no file in .* but descriptors"):
        read_files(patterns, folder)
    assert read_files([*patterns, "lab/density.csv"], folder).files == 1


def test_a_kind_that_is_not_read_is_listed(folder: Path) -> None:
    [found] = read_files(["lab/*.png"], folder).diagnostics
    assert str(found) == "lab/plot.png: its kind '.png' is not read; valid: .xml, .csv, .tsv, .txt"


def test_a_folder_is_read_with_all_below_it(folder: Path) -> None:
    told: list[tuple[str, int, int]] = []
    reading = read_folder(folder, progress=lambda *what: told.append(what))
    assert files(reading) == ["lab/a.xml", "lab/deep/c.CSV", "lab/density.csv"]
    assert reading.files == 4
    assert told == [("measured", done, 4) for done in range(4)]


def test_a_large_folder_lists_every_bad_file_and_reads_the_others(tmp_path: Path) -> None:
    bad = {
        "cut.xml": GOOD_XML[: len(GOOD_XML) // 2],
        "empty.xml": b"",
        "page.xml": b"<html/>",
        "laughs.xml": b"<!DOCTYPE x><x/>",
        "empty.csv": b"",
        "binary.csv": b"a,b\0c\n\0",
        "words.csv": b"just words",
    }
    for i in range(60):
        (tmp_path / f"{i:03}").mkdir()
        (tmp_path / f"{i:03}" / "good.csv").write_text(GOOD_CSV.format(250 + i))
        for name, content in bad.items() if i % 4 == 0 else ():
            (tmp_path / f"{i:03}" / name).write_bytes(content)
    expected = {f"{i:03}/{name}" for i in range(0, 60, 4) for name in bad}
    told: list[tuple[str, int, int]] = []
    reading = read_folder(tmp_path, progress=lambda *what: told.append(what))
    assert {d.file for d in reading.diagnostics if d.code == "file"} == expected
    assert [s.values.tolist() for s in reading.sets if s.source.file.endswith(".csv")] == [[998000.0]] * 60
    assert reading.files == 165
    assert told == [("measured", done, 165) for done in range(165)]


@pytest.mark.parametrize("pattern", ["lab", "lab/", "."])
def test_a_pattern_may_be_a_folder(folder: Path, pattern: str) -> None:
    reading = read_files([pattern, "lab/*.xml"], folder)
    assert files(reading) == ["lab/a.xml", "lab/deep/c.CSV", "lab/density.csv"]
    assert reading.files == 4  # what is named twice is read once; texts and pictures in a folder are left alone


def test_a_folder_without_data_is_an_error(folder: Path) -> None:
    (folder / "empty").mkdir()
    with pytest.raises(InputError, match="'empty' names no file"):
        read_files(["empty"], folder)


def test_no_folder_is_an_error(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="is no folder"):
        read_folder(tmp_path / "none")


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="the platform has no pipes in folders")
def test_a_pipe_is_not_waited_for(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "pipe.xml")
    [found] = read_folder(tmp_path).diagnostics
    assert found.sentence == "it is no regular file"


@pytest.mark.skipif(os.name != "posix" or os.geteuid() == 0, reason="whoever may read everything cannot test this")
def test_a_file_that_may_not_be_read_is_listed(tmp_path: Path) -> None:
    (tmp_path / "secret.csv").touch(mode=0o000)
    (tmp_path / "secret.xml").touch(mode=0o000)
    assert [d.sentence.partition(":")[0] for d in read_folder(tmp_path).diagnostics] == ["cannot be opened"] * 2


def test_nothing_is_kept_from_one_file_to_the_next(tmp_path: Path) -> None:
    """Nothing alive, and nothing that waits for the garbage collector either; the benchmark measures the memory."""
    for i in range(30):
        (tmp_path / f"{i:02}.xml").write_bytes(GOOD_XML)
        (tmp_path / f"{i:02}.csv").write_text(GOOD_CSV.format(300 + i))
    names = sorted(path.name for path in tmp_path.iterdir())

    def objects_left(count: int) -> int:
        gc.collect()
        gc.disable()
        before = len(gc.get_objects())
        points = sum(len(one) for reading in readings(names[:count], tmp_path) for one in reading.sets)
        after = len(gc.get_objects())
        gc.enable()
        assert points > 9 * count
        return after - before

    objects_left(4)  # what is cached is cached
    assert objects_left(60) < objects_left(4) + 56

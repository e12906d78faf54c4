import csv
import errno
import io
import json
import os
import shutil
from dataclasses import replace
from pathlib import Path

import pytest

from eosmuster.errors import InputError
from eosmuster.report import folder as folder_module
from eosmuster.report.folder import checked, save
from eosmuster.report.manifest import file_hash

FILES = {"points.csv", "summary.csv", "windows.csv", "summary.md", "dossier.html", "manifest.json"}
NO_PROCESS = 4_194_304  # above the largest process number of Linux


def assert_complete(place):
    manifest = json.loads((place / "manifest.json").read_text(encoding="utf-8"))
    present = {entry.name for entry in place.iterdir()}
    assert present == {*manifest["outputs"], "manifest.json"}
    for name, digest in manifest["outputs"].items():
        assert file_hash(place / name) == digest
    return manifest


def contents(place):
    return {p.relative_to(place).as_posix(): p.read_bytes() for p in sorted(place.rglob("*")) if p.is_file()}


def test_writes_the_files_of_the_contract(record, tmp_path):
    place = save(record, tmp_path / "deep" / "er" / "results", overwrite=False)
    assert place == (tmp_path / "deep" / "er" / "results").resolve()
    assert {entry.name for entry in place.iterdir()} == FILES
    assert_complete(place)
    assert [entry.name for entry in place.parent.iterdir()] == ["results"]


def test_points_can_be_left_out_and_the_manifest_says_so(record, tmp_path):
    place = save(record, tmp_path / "results", points=False, overwrite=False)
    assert {entry.name for entry in place.iterdir()} == FILES - {"points.csv"}
    assert assert_complete(place)["points"] == {"rows": 3 * 2 * 4 * 9, "written": False}


def test_replacing_takes_nothing_over_from_the_earlier_run(record, tmp_path):
    save(record, tmp_path / "results", overwrite=True)
    place = save(replace(record, plan_title="second"), tmp_path / "results", points=False, overwrite=True)
    assert assert_complete(place)["plan"]["title"] == "second"
    assert [entry.name for entry in tmp_path.iterdir()] == ["results"]


def test_an_empty_folder_is_taken(record, tmp_path):
    (tmp_path / "results").mkdir()
    assert_complete(save(record, tmp_path / "results", overwrite=False))


def test_two_runs_differ_only_in_what_is_volatile(record, tmp_path):
    first, second = (contents(save(record, tmp_path / name, overwrite=False)) for name in ("a", "b"))
    manifests = [json.loads(files.pop("manifest.json")) for files in (first, second)]
    assert first == second
    assert all(m.pop("volatile") for m in manifests)
    assert manifests[0] == manifests[1]


class TestRefused:
    """One sentence each, and nothing is touched."""

    def refused(self, record, place, overwrite=True):
        with pytest.raises(InputError) as caught:
            save(record, place, overwrite=overwrite)
        message = str(caught.value)
        assert "\n" not in message
        assert not message.endswith(".")
        return message

    def test_a_file(self, record, tmp_path):
        (tmp_path / "f").write_text("mine")
        assert "is a file" in self.refused(record, tmp_path / "f")
        assert (tmp_path / "f").read_text() == "mine"

    def test_below_a_file(self, record, tmp_path):
        (tmp_path / "f").write_text("mine")
        assert str(tmp_path / "f") in self.refused(record, tmp_path / "f" / "results")

    @pytest.mark.parametrize("manifest", [None, "{}", "[]", "not JSON", '{"format": "another"}', "[" * 100_000])
    def test_a_foreign_folder(self, record, tmp_path, manifest):
        place = tmp_path / "foreign"
        place.mkdir()
        (place / "thesis.txt").write_text("mine")
        if manifest is not None:
            (place / "manifest.json").write_text(manifest)
        before = contents(place)
        assert "foreign folder" in self.refused(record, place)
        assert contents(place) == before

    def test_our_folder_with_something_of_the_users_in_it(self, record, tmp_path):
        place = save(record, tmp_path / "results", overwrite=False)
        (place / "notes.txt").write_text("mine")
        before = contents(place)
        assert "'notes.txt'" in self.refused(record, place)
        assert contents(place) == before

    def test_our_folder_unless_overwriting_is_allowed(self, record, tmp_path):
        place = save(record, tmp_path / "results", overwrite=False)
        before = contents(place)
        assert "earlier run" in self.refused(record, place, overwrite=False)
        assert contents(place) == before

    def test_inside_another_results_folder(self, record, tmp_path):
        place = save(record, tmp_path / "results", overwrite=False)
        assert "lies inside the results folder" in self.refused(record, place / "again")
        assert_complete(place)

    def test_the_current_folder_and_those_above(self, record, tmp_path, monkeypatch):
        (tmp_path / "here").mkdir()
        monkeypatch.chdir(tmp_path / "here")
        assert "is the current folder" in self.refused(record, ".")
        assert "above the current folder" in self.refused(record, "..")
        assert "above the current folder" in self.refused(record, Path(tmp_path.anchor))

    def test_home_and_those_above(self, record, tmp_path, monkeypatch):
        (tmp_path / "users" / "me").mkdir(parents=True)
        monkeypatch.setenv("HOME", str(tmp_path / "users" / "me"))
        monkeypatch.setenv("USERPROFILE", str(tmp_path / "users" / "me"))
        assert "is the home folder" in self.refused(record, tmp_path / "users" / "me")
        assert "above the home folder" in self.refused(record, tmp_path / "users")

    def test_names_no_file_system_takes(self, record, tmp_path):
        assert "cannot be a results folder" in self.refused(record, "nul\0byte")
        self.refused(record, tmp_path / ("x" * 300))
        (tmp_path / "loop").symlink_to(tmp_path / "loop")
        self.refused(record, tmp_path / "loop" / "results")
        assert [entry.name for entry in tmp_path.iterdir()] == ["loop"]

    def test_an_unwritable_parent(self, record, tmp_path, monkeypatch):
        def denied(path, *args, **kwargs):
            raise PermissionError(errno.EACCES, "Permission denied", str(path))

        # permissions do not bind every user that runs tests, so the refusal is put in by hand
        monkeypatch.setattr(os, "mkdir", denied)
        assert "Permission denied" in self.refused(record, tmp_path / "results")

    @pytest.mark.parametrize("part", ["parent", "results"])
    def test_a_place_that_is_not_writable_is_refused_before_the_work(self, record, tmp_path, monkeypatch, part):
        target = save(record, tmp_path / "parent" / "results", overwrite=False)
        allowed = os.access
        monkeypatch.setattr(os, "access", lambda path, mode: Path(path).name != part and allowed(path, mode))
        with pytest.raises(InputError, match=rf"{part} is not writable; choose another --out"):
            checked(target, overwrite=True)

    def test_a_folder_in_the_place_of_a_file(self, record, tmp_path):
        place = save(record, tmp_path / "results", overwrite=False)
        (place / "points.csv").unlink()
        (place / "points.csv").mkdir()
        assert "'points.csv'" in self.refused(record, place)

    def test_a_mounted_file_system(self, record, tmp_path, monkeypatch):
        (tmp_path / "results").mkdir()
        monkeypatch.setattr(os.path, "ismount", lambda path: Path(path).name == "results")
        assert "is a mounted file system" in self.refused(record, tmp_path / "results")

    def test_a_folder_that_cannot_be_read(self, record, tmp_path, monkeypatch):
        def denied(path):
            raise PermissionError(errno.EACCES, "Permission denied", str(path))

        (tmp_path / "results").mkdir()
        monkeypatch.setattr(Path, "iterdir", denied)
        assert "cannot be read: Permission denied" in self.refused(record, tmp_path / "results")

    def test_checking_touches_nothing(self, tmp_path):
        assert checked(tmp_path / "a" / "b", overwrite=False) == tmp_path.resolve() / "a" / "b"
        assert list(tmp_path.iterdir()) == []


class TestViews:
    def test_one_that_not_every_record_has(self, record, tmp_path, monkeypatch):
        monkeypatch.setitem(folder_module.VIEWS, "extra.csv", lambda record, file: file.write(b"x\n"))
        monkeypatch.setitem(folder_module.ONLY_IF, "extra.csv", lambda record: record.plan_title == "with it")
        assert not (save(record, tmp_path / "results", overwrite=True) / "extra.csv").exists()
        place = save(replace(record, plan_title="with it"), tmp_path / "results", overwrite=True)
        assert "extra.csv" in assert_complete(place)["outputs"]
        save(record, tmp_path / "results", overwrite=True)
        assert not (place / "extra.csv").exists()
        assert_complete(place)

    def test_files_of_another_version_may_be_replaced(self, record, tmp_path, monkeypatch):
        with monkeypatch.context() as patch:
            patch.setitem(folder_module.VIEWS, "later.csv", lambda record, file: file.write(b"x\n"))
            place = save(record, tmp_path / "results", overwrite=True)
        save(record, place, overwrite=True)
        assert "later.csv" not in assert_complete(place)["outputs"]
        assert [entry.name for entry in tmp_path.iterdir()] == ["results"]

    def test_every_file_that_depends_on_the_record_is_a_view(self):
        assert set(folder_module.ONLY_IF) <= set(folder_module.VIEWS)


def test_names_of_users_are_inert_in_every_table(block, record_of, nasty_names, tmp_path):
    names = (*nasty_names, "<script>alert(1)</script>", "\u200f=1+1", 'a"\n=2', "\u2067x\u2069", "é" * 300)
    record = record_of([block(name, (name, "PR"), 3, source=name, seed=i) for i, name in enumerate(names)])
    place = save(record, tmp_path / "results", overwrite=False)
    for file, rows in (("points.csv", 6), ("summary.csv", 2), ("windows.csv", 1)):
        header, *table = csv.reader(io.StringIO((place / file).read_bytes().decode("utf-8"), newline=""))
        assert len(table) == rows * len(names) + (file == "summary.csv")
        assert {len(row) for row in table} == {len(header)}
        text = [row[header.index(c)] for row in table for c in ("component", "candidate", "reference_source")]
        assert not [cell for cell in text if cell.startswith(tuple("=+-@\t\r\n"))]
        assert {cell.removeprefix("'").replace("\n'=", "\n=") for cell in text if cell} >= set(filter(None, names))
    lines = (place / "summary.md").read_text(encoding="utf-8").splitlines()
    assert not [line for line in lines if "<script" in line]
    assert not [line for line in lines if set(line) & set("\x1b\u202e\u2067\u200f")]
    assert_complete(place)


def test_an_error_in_a_view_is_not_called_a_bad_folder(record, tmp_path, monkeypatch):
    def broken(record, file):
        raise ZeroDivisionError

    monkeypatch.setitem(folder_module.VIEWS, "summary.md", broken)
    with pytest.raises(ZeroDivisionError):
        save(record, tmp_path / "results", overwrite=True)
    assert list(tmp_path.iterdir()) == []


def test_what_came_in_while_the_results_were_written_stays(record, tmp_path, monkeypatch):
    target = save(record, tmp_path / "results", overwrite=True)
    before = contents(target)
    monkeypatch.setitem(
        folder_module.VIEWS, "summary.md", lambda record, file: (target / "notes.txt").write_text("mine") and None
    )
    with pytest.raises(InputError, match=r"'notes\.txt'"):
        save(record, target, overwrite=True)
    assert contents(target) == before | {"notes.txt": b"mine"}
    assert [entry.name for entry in tmp_path.iterdir()] == ["results"]


def test_results_that_came_back_are_not_overwritten_unless_that_is_allowed(record, tmp_path):
    target = save(record, tmp_path / "results", overwrite=True)
    before = contents(target)
    target.rename(tmp_path / f".results.{NO_PROCESS}.old")
    with pytest.raises(InputError, match="earlier run"):
        save(record, target, overwrite=False)
    assert contents(target) == before
    assert [entry.name for entry in tmp_path.iterdir()] == ["results"]


def test_a_link_is_followed_and_stays(record, tmp_path):
    (tmp_path / "far").mkdir()
    (tmp_path / "near").mkdir()
    (tmp_path / "near" / "link").symlink_to(tmp_path / "far" / "results")
    for title in ("first", "second"):
        place = save(replace(record, plan_title=title), tmp_path / "near" / "link", overwrite=True)
        assert place == (tmp_path / "far" / "results").resolve()
        assert assert_complete(place)["plan"]["title"] == title
    assert (tmp_path / "near" / "link").is_symlink()
    assert [entry.name for folder in ("near", "far") for entry in (tmp_path / folder).iterdir()] == [
        "link",
        "results",
    ]


def test_a_name_as_long_as_a_name_may_be(record, tmp_path):
    for title in ("first", "second"):
        place = save(replace(record, plan_title=title), tmp_path / ("x" * 255), overwrite=True)
        assert assert_complete(place)["plan"]["title"] == title
    assert [len(entry.name) for entry in tmp_path.iterdir()] == [255]


class TestLeftBehind:
    """What a killed process left beside the target."""

    def left(self, tmp_path, name, file="points.csv"):
        place = tmp_path / name
        place.mkdir()
        (place / file).write_text("half")
        return place

    def test_half_folders_go(self, record, tmp_path):
        # under a lock all others are dead, whoever has their numbers now
        for number in (NO_PROCESS, os.getpid(), os.getppid()):
            self.left(tmp_path, f".results.{number}.part")
        (tmp_path / ".results.lock").touch()
        save(record, tmp_path / "results", overwrite=True)
        assert [entry.name for entry in tmp_path.iterdir()] == ["results"]

    def test_where_nothing_can_be_locked_those_of_the_living_stay(self, record, tmp_path, monkeypatch):
        monkeypatch.setattr("eosmuster.report.locking.fcntl", None)
        for number in (NO_PROCESS, os.getpid(), os.getppid()):
            self.left(tmp_path, f".results.{number}.part")
        save(record, tmp_path / "results", overwrite=True)
        assert {entry.name for entry in tmp_path.iterdir()} == {"results", f".results.{os.getppid()}.part"}

    @pytest.mark.parametrize(
        ("name", "file"),
        [
            (f".results.{NO_PROCESS}.part", "thesis.txt"),
            (".results.x.part", "points.csv"),
            (f".other.{NO_PROCESS}.part", "points.csv"),
            (f"results.{NO_PROCESS}.part", "points.csv"),
            (f".results.{NO_PROCESS}.other", "points.csv"),
        ],
    )
    def test_anything_else_stays(self, record, tmp_path, name, file):
        place = self.left(tmp_path, name, file)
        save(record, tmp_path / "results", overwrite=True)
        assert (place / file).read_text() == "half"

    def test_old_results_caught_aside_come_back(self, record, tmp_path, monkeypatch):
        target = tmp_path / "results"
        save(record, target, overwrite=True)
        before = contents(target)
        target.rename(tmp_path / f".results.{NO_PROCESS}.old")
        monkeypatch.setitem(folder_module.VIEWS, "summary.md", lambda record, file: 1 / 0)
        with pytest.raises(ZeroDivisionError):
            save(record, target, overwrite=True)
        assert contents(target) == before
        assert [entry.name for entry in tmp_path.iterdir()] == ["results"]

    def test_old_results_already_replaced_go(self, record, tmp_path):
        target = save(record, tmp_path / "results", overwrite=True)
        shutil.copytree(target, tmp_path / f".results.{NO_PROCESS}.old")
        save(record, target, overwrite=True)
        assert [entry.name for entry in tmp_path.iterdir()] == ["results"]

    def test_a_place_aside_that_is_taken_stops_the_swap(self, record, tmp_path):
        target = save(record, tmp_path / "results", overwrite=True)
        before = contents(target)
        aside = self.left(tmp_path, f".results.{os.getpid()}.old", "thesis.txt")
        with pytest.raises(InputError, match="in the way"):
            save(record, target, overwrite=True)
        assert contents(target) == before
        assert (aside / "thesis.txt").read_text() == "half"

import contextlib
import errno
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

FILES = {"points.csv", "summary.csv", "windows.csv", "summary.md", "manifest.json"}
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

    def test_a_folder_that_cannot_be_read(self, record, tmp_path, monkeypatch):
        def denied(path):
            raise PermissionError(errno.EACCES, "Permission denied", str(path))

        (tmp_path / "results").mkdir()
        monkeypatch.setattr(Path, "iterdir", denied)
        assert "cannot be read: Permission denied" in self.refused(record, tmp_path / "results")

    def test_checking_touches_nothing(self, tmp_path):
        assert checked(tmp_path / "a" / "b", overwrite=False) == tmp_path.resolve() / "a" / "b"
        assert list(tmp_path.iterdir()) == []


class Fault:
    """Fail once, at call number `at` of everything that changes the disk, before or after it is done."""

    def __init__(self, monkeypatch, error, at, after):
        self.error, self.at, self.after, self.calls, self.open = error, at, after, 0, Path.open
        for owner, name in ((os, "mkdir"), (os, "rename"), (Path, "open")):
            monkeypatch.setattr(owner, name, self.wrap(getattr(owner, name)))

    def wrap(self, function):
        def wrapped(*args, **kwargs):
            if function is self.open and "w" not in (args[1:2] or [kwargs.get("mode", "r")])[0]:
                return function(*args, **kwargs)
            self.tick(not self.after)
            result = function(*args, **kwargs)
            with contextlib.ExitStack() as stack:
                if hasattr(result, "write"):
                    result = Faulty(stack.enter_context(result), self)
                self.tick(self.after, count=False)
                stack.pop_all()
            return result

        return wrapped

    def tick(self, now, count=True):
        self.calls += count
        if now and self.calls == self.at:
            self.at = -1
            raise self.error


class Faulty:
    """An open file whose writes are counted as well."""

    def __init__(self, file, fault):
        self.file, self.fault = file, fault

    def write(self, data):
        self.fault.tick(True)
        return self.file.write(data)

    def writelines(self, lines):
        for line in lines:
            self.write(line)

    def __enter__(self):
        return self

    def __exit__(self, *args):
        return self.file.__exit__(*args)

    def __getattr__(self, name):
        return getattr(self.file, name)


def outcome_of(record, target):
    """Save, and say what went wrong, if anything."""
    try:
        save(record, target, overwrite=True)
    except InputError as error:
        return str(error)
    except KeyboardInterrupt:
        return "interrupted"
    return ""


@pytest.mark.parametrize(
    ("error", "after"),
    [
        (OSError(errno.ENOSPC, "No space left on device"), False),
        (KeyboardInterrupt(), False),
        (KeyboardInterrupt(), True),
    ],
    ids=["disk full", "interrupted before", "interrupted after"],
)
@pytest.mark.parametrize("old", [False, True], ids=["new place", "old results"])
def test_a_fault_anywhere_leaves_the_old_results_or_the_new_ones(
    block, record_of, tmp_path, monkeypatch, old, error, after
):
    record = record_of([block(states=2)])
    faults = 0
    for at in range(1, 200):
        work = tmp_path / f"{at}"
        target = work / "sub" / "results"
        work.mkdir()
        if old:
            save(record_of([block(states=3)], title="old"), target, overwrite=False)
        before = contents(work)
        with monkeypatch.context() as patch:
            fault = Fault(patch, error, at, after)
            raised = outcome_of(record, target)
        failed = fault.at == -1
        expected = "interrupted" if isinstance(error, KeyboardInterrupt) else "No space left on device"
        assert (expected in raised) if failed else raised == ""
        faults += failed
        if contents(work) != before:
            assert assert_complete(target)["plan"]["title"] == "An invented run"
            assert [entry.name for entry in target.parent.iterdir()] == ["results"]
        else:
            assert failed
            assert old or list(work.iterdir()) == []
        shutil.rmtree(work)
        if fault.calls < at:
            break
    # two folders, five files and eleven writes into them, a rename
    assert faults >= 18
    assert not failed


def test_an_error_in_a_view_is_not_called_a_bad_folder(record, tmp_path, monkeypatch):
    def broken(record, file):
        raise ZeroDivisionError

    monkeypatch.setitem(folder_module.VIEWS, "summary.md", broken)
    with pytest.raises(ZeroDivisionError):
        save(record, tmp_path / "results", overwrite=True)
    assert list(tmp_path.iterdir()) == []


class TestLeftBehind:
    """What a killed process left beside the target."""

    def left(self, tmp_path, name, file="points.csv"):
        place = tmp_path / name
        place.mkdir()
        (place / file).write_text("half")
        return place

    def test_a_half_folder_of_a_dead_process_goes(self, record, tmp_path):
        half = self.left(tmp_path, f".results.{NO_PROCESS}.part")
        own_number_before_a_restart = self.left(tmp_path, f".results.{os.getpid()}.part")
        save(record, tmp_path / "results", overwrite=True)
        assert not half.exists()
        assert not own_number_before_a_restart.exists()

    @pytest.mark.parametrize(
        ("name", "file"),
        [
            (f".results.{os.getppid()}.part", "points.csv"),  # alive
            (f".results.{NO_PROCESS}.part", "thesis.txt"),
            (".results.x.part", "points.csv"),
            (f".other.{NO_PROCESS}.part", "points.csv"),
            (f"results.{NO_PROCESS}.part", "points.csv"),
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

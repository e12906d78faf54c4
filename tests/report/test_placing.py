import ctypes
import errno
import os
from pathlib import Path

import pytest

from eosmuster.report import placing
from eosmuster.report.placing import exchange, put, recover, remove, sync

KNOWN = {"points.csv", "manifest.json"}


def folder(place, text):
    place.mkdir()
    (place / "points.csv").write_text(text)
    return place


def text_of(place):
    return (place / "points.csv").read_text()


@pytest.fixture(params=["at once", "in steps"])
def way(request, monkeypatch):
    if request.param == "in steps":
        monkeypatch.setattr(placing, "_renameat2", lambda: None)
    elif placing._renameat2() is None:
        pytest.skip("the system has no exchange of two names")
    return request.param


def test_two_folders_change_places(tmp_path, way):
    one, other = folder(tmp_path / "one", "1"), folder(tmp_path / "other", "2")
    exchange(one, other, tmp_path / "aside")
    assert (text_of(one), text_of(other)) == ("2", "1")
    assert len(list(tmp_path.iterdir())) == 2


def test_what_is_missing_cannot_change_places(tmp_path, way):
    one = folder(tmp_path / "one", "1")
    with pytest.raises(FileNotFoundError):
        exchange(tmp_path / "missing", one, tmp_path / "aside")
    assert text_of(one) == "1"
    assert list(tmp_path.iterdir()) == [one]


@pytest.mark.parametrize("number", [errno.EINVAL, errno.ENOSYS, errno.ENOTSUP])
def test_a_file_system_without_the_exchange_gets_it_in_steps(tmp_path, monkeypatch, number):
    def refusing(*names):
        ctypes.set_errno(number)
        return -1

    monkeypatch.setattr(placing, "_renameat2", lambda: refusing)
    one, other = folder(tmp_path / "one", "1"), folder(tmp_path / "other", "2")
    exchange(one, other, tmp_path / "aside")
    assert (text_of(one), text_of(other)) == ("2", "1")


def test_a_system_without_the_function_is_none_of_our_failures(monkeypatch):
    for error in (AttributeError, OSError, TypeError):

        def library(*args, error=error, **kwargs):
            raise error

        monkeypatch.setattr(ctypes, "CDLL", library)
        placing._renameat2.cache_clear()
        assert placing._renameat2() is None
    placing._renameat2.cache_clear()


def test_an_unfinished_name_above_takes_everything_back(tmp_path, monkeypatch, way):
    part, target = folder(tmp_path / "part", "new"), folder(tmp_path / "results", "old")

    def failing(place, calls=[]):  # noqa: B006
        calls.append(place)
        if place == tmp_path:
            raise OSError(errno.EIO, "Input/output error")

    monkeypatch.setattr(placing, "sync", failing)
    with pytest.raises(OSError, match="Input/output"):
        put(part, target)
    assert (text_of(part), text_of(target)) == ("new", "old")
    (target / "points.csv").unlink()
    target.rmdir()
    with pytest.raises(OSError, match="Input/output"):
        put(part, target)
    assert list(tmp_path.iterdir()) == [part]


def test_folders_that_know_no_sync(tmp_path, monkeypatch):
    def refusing(opened):
        raise OSError(errno.EINVAL, "Invalid argument")

    monkeypatch.setattr(os, "fsync", refusing)
    sync(tmp_path)

    def broken(opened):
        raise OSError(errno.EIO, "Input/output error")

    monkeypatch.setattr(os, "fsync", broken)
    with pytest.raises(OSError, match="Input/output"):
        sync(tmp_path)


def test_the_older_state_wins_where_both_were_left(tmp_path):
    folder(tmp_path / ".results.7.old", "old")
    folder(tmp_path / ".results.7.part", "new")
    recover(tmp_path / "results", KNOWN, alone=True)
    assert text_of(tmp_path / "results") == "old"
    assert [entry.name for entry in tmp_path.iterdir()] == ["results"]


@pytest.mark.parametrize("there", [True, False])
@pytest.mark.parametrize("kind", ["part", "old"])
def test_only_what_runs_wrote_is_moved_or_removed(tmp_path, kind, there):
    left = folder(tmp_path / f".results.7.{kind}", "half")
    (left / "thesis.txt").write_text("mine")
    if there:
        (tmp_path / "results").mkdir()
    recover(tmp_path / "results", KNOWN, alone=True)
    remove(left, KNOWN)
    assert text_of(left) == "half"
    (left / "thesis.txt").unlink()
    (left / "points.csv").unlink()
    (left / "points.csv").mkdir()
    recover(tmp_path / "results", KNOWN, alone=True)
    assert (left / "points.csv").is_dir()


def test_what_only_looks_like_a_left_over_stays(tmp_path):
    elsewhere = folder(tmp_path / "elsewhere", "mine")
    (tmp_path / ".results.7.part").symlink_to(elsewhere)
    (tmp_path / ".results.8.part").write_text("a file")
    recover(tmp_path / "results", KNOWN, alone=True)
    assert text_of(elsewhere) == "mine"
    assert {entry.name for entry in tmp_path.iterdir()} == {"elsewhere", ".results.7.part", ".results.8.part"}


def test_links_in_results_are_removed_and_not_followed(tmp_path):
    (tmp_path / "mine.csv").write_text("mine")
    left = tmp_path / ".results.7.part"
    left.mkdir()
    (left / "points.csv").symlink_to(tmp_path / "mine.csv")
    remove(left, KNOWN)
    assert [entry.name for entry in tmp_path.iterdir()] == ["mine.csv"]
    assert Path(tmp_path / "mine.csv").read_text() == "mine"

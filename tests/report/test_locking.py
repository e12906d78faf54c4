import os
import socket
import threading

import pytest

from eosmuster.errors import InputError
from eosmuster.report import locking
from eosmuster.report.locking import hidden, is_running, locked

NO_PROCESS = 4_194_304  # above the largest process number of Linux
NOW = "2031-04-01T12:00:00+00:00"


@pytest.fixture(params=["flock", "mark"])
def kind(request, monkeypatch):
    if request.param == "mark":
        monkeypatch.setattr(locking, "fcntl", None)
    elif locking.fcntl is None:
        pytest.skip("the system has no advisory locks")
    return request.param


def file_of(target, kind):
    return hidden(target, locking.LOCK if kind == "flock" else locking.MARK)


def signed(process, host=None):
    return f"eosmuster writes here: process {process} on {host or socket.gethostname()} since {NOW}\n"


def test_it_says_who_holds_it_and_goes(tmp_path, kind):
    with locked(tmp_path / "results") as kept:
        assert kept == (kind == "flock")
        assert [entry.name for entry in tmp_path.iterdir()] == [file_of(tmp_path / "results", kind).name]
        said = file_of(tmp_path / "results", kind).read_text()
        assert said.startswith(f"eosmuster writes here: process {os.getpid()} on {socket.gethostname()} since 20")
    assert list(tmp_path.iterdir()) == []


def test_it_goes_after_an_error_too(tmp_path, kind):
    with pytest.raises(ZeroDivisionError), locked(tmp_path / "results"):
        raise ZeroDivisionError
    assert list(tmp_path.iterdir()) == []


def test_two_do_not_hold_it_at_once(tmp_path, kind):
    target = tmp_path / "results"
    with locked(target):
        with pytest.raises(InputError) as caught, locked(target, wait=0.05):
            raise AssertionError("two hold it")
        assert f"{target}: process {os.getpid()} on " in str(caught.value)
        assert "did not finish within 0.05 s; run again when it has finished" in str(caught.value)
        assert (f"delete {file_of(target, kind)}" in str(caught.value)) == (kind == "mark")
        with locked(tmp_path / "another", wait=0.0):
            assert len(list(tmp_path.iterdir())) == 2
    assert list(tmp_path.iterdir()) == []


def test_many_wait_for_each_other(tmp_path, kind):
    inside, seen = [], []

    def hold():
        with locked(tmp_path / "results", wait=60.0):
            inside.append(1)
            seen.append(len(inside))
            inside.pop()

    threads = [threading.Thread(target=hold) for _ in range(6)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert seen == [1] * 6
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize(
    "text",
    ["", signed(NO_PROCESS), signed(os.getpid()), signed(os.getppid())],
    ids=["nobody", "the dead", "this process", "its parent"],
)
def test_an_advisory_lock_is_what_counts_not_its_file(tmp_path, text):
    if locking.fcntl is None:
        pytest.skip("the system has no advisory locks")
    hidden(tmp_path / "results", locking.LOCK).write_text(text)
    with locked(tmp_path / "results", wait=0.0):
        pass
    assert list(tmp_path.iterdir()) == []


class TestMarks:
    """Without advisory locks the file's being there is the lock."""

    @pytest.fixture(autouse=True)
    def no_locks(self, monkeypatch):
        monkeypatch.setattr(locking, "fcntl", None)

    def mark(self, tmp_path, text, age=0.0):
        file = hidden(tmp_path / "results", locking.MARK)
        file.write_text(text)
        os.utime(file, (file.stat().st_mtime - age,) * 2)
        return file

    @pytest.mark.parametrize(
        ("text", "age"),
        [(signed(NO_PROCESS), 0.0), (signed(os.getpid()), 0.0), ("", 61.0)],
        ids=["the dead", "an earlier one", "nobody"],
    )
    def test_those_of_the_dead_count_for_nothing(self, tmp_path, text, age):
        self.mark(tmp_path, text, age)
        with locked(tmp_path / "results", wait=1.0):
            pass
        assert list(tmp_path.iterdir()) == []

    @pytest.mark.parametrize(
        ("text", "said"),
        [
            (signed(os.getppid()), f"process {os.getppid()} on "),
            (signed(NO_PROCESS, "elsewhere"), f"process {NO_PROCESS} on elsewhere since {NOW} writes"),
            ("", "another process writes"),
            ("nonsense", "another process writes"),
            (signed("x"), "another process writes"),
            (signed(10**30), f"process {10**30} on"),
        ],
        ids=["its parent", "elsewhere", "nobody", "nonsense", "no number", "no process number"],
    )
    def test_all_others_are_respected(self, tmp_path, text, said):
        file = self.mark(tmp_path, text)
        with pytest.raises(InputError) as caught, locked(tmp_path / "results", wait=0.0):
            raise AssertionError("two hold it")
        assert said in str(caught.value)
        assert f"if it has ended already, delete {file}" in str(caught.value)
        assert file.read_text() == text

    @pytest.mark.parametrize(
        "newer", [signed(os.getppid()), signed(os.getpid()), ""], ids=["another", "own", "begun"]
    )
    def test_a_slow_one_does_not_take_away_what_has_replaced_a_dead_mark(self, tmp_path, monkeypatch, newer):
        """Both have seen the same dead mark; the other one was faster and holds the folder by now."""
        file = self.mark(tmp_path, signed(NO_PROCESS))
        looked = locking._is_dead

        def slowly(seen, mark):
            dead = looked(seen, mark)
            if seen == file and dead:
                file.unlink()
                file.write_text(newer)
                locking._held.add(file)
            return dead

        monkeypatch.setattr(locking, "_is_dead", slowly)
        try:
            with pytest.raises(InputError), locked(tmp_path / "results", wait=0.0):
                raise AssertionError("two hold it")
        finally:
            locking._held.discard(file)
        assert file.read_text() == newer
        assert list(tmp_path.iterdir()) == [file]

    def test_a_mark_that_is_another_s_by_now_is_left(self, tmp_path):
        file = hidden(tmp_path / "results", locking.MARK)
        with locked(tmp_path / "results"):
            file.rename(tmp_path / "deleted by hand")
            file.write_text(signed(os.getppid()))
        assert file.read_text() == signed(os.getppid())


def test_a_file_system_without_locks_gets_a_mark(tmp_path, monkeypatch):
    if locking.fcntl is None:
        pytest.skip("the system has no advisory locks")

    def refusing(opened, how):
        raise OSError(locking.errno.ENOLCK, "No locks available")

    monkeypatch.setattr(locking.fcntl, "flock", refusing)
    with locked(tmp_path / "results") as kept:
        assert not kept
        assert [entry.name for entry in tmp_path.iterdir()] == [".results.taken"]
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("make", ["file", "folder", "link"])
def test_something_of_the_users_in_the_way_stays(tmp_path, make):
    place = hidden(tmp_path / "results", locking.LOCK)
    if make == "folder":
        place.mkdir()
    elif make == "link":
        (tmp_path / "mine").write_text("mine")
        place.symlink_to(tmp_path / "mine")
    else:
        place.write_text("mine")
    with pytest.raises(OSError, match=r"in the way|directory|symbolic"), locked(tmp_path / "results", wait=0.0):
        raise AssertionError("it is not ours")
    assert place.is_dir() or place.read_text() == "mine"


def test_numbers_no_process_has():
    assert is_running(os.getpid())
    assert not is_running(NO_PROCESS)
    assert is_running(10**30)  # in doubt

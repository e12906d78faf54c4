"""Whatever happens while results are saved, the folder is the old one or the new one, whole.

Faults at every call, kills (`kill_saves.py` does any number of them), full disks and two runs at once.
"""

from __future__ import annotations

import contextlib
import errno
import os
import shutil
import signal
import subprocess
import sys
import threading
import time
from collections import Counter
from collections.abc import Callable, Iterator, Mapping
from pathlib import Path

import pytest
from faults import TIDYING, Faults, Patch, by_marks, in_steps, small_record, small_views, title_of

from eosmuster.errors import InputError
from eosmuster.report.folder import save

HERE = Path(__file__).parent


def full() -> None:
    raise OSError(errno.ENOSPC, "No space left on device")


def broken() -> None:
    raise OSError(errno.EIO, "Input/output error")


def interrupted() -> None:
    raise KeyboardInterrupt


def outcome(target: Path, title: str) -> str:
    """Save, and say what went wrong, if anything."""
    try:
        save(small_record(title), target, overwrite=True)
    except InputError as error:
        return str(error)
    except KeyboardInterrupt:
        return "interrupted"
    return ""


def names(place: Path) -> list[str]:
    return sorted(entry.name for entry in place.iterdir())


FAULTS = {
    "full": (full, False, False),
    "full from then on": (full, False, True),
    "broken": (broken, False, False),
    "interrupted before": (interrupted, False, False),
    "interrupted after": (interrupted, True, False),
}
SAID = {full: "No space left on device", broken: "Input/output error", interrupted: "interrupted"}
WAYS: dict[str, tuple[Callable[[Patch], None], ...]] = {
    "at once": (),
    "in steps": (in_steps,),
    "by marks": (by_marks,),
}
CASES = [
    *(("at once", old, fault) for old in ("", "old") for fault in FAULTS),
    *(("in steps", "old", fault) for fault in FAULTS),
    *(("by marks", "old", fault) for fault in ("full", "interrupted after")),
]


@pytest.mark.parametrize(("way", "old", "fault"), CASES, ids=[" ".join((w, o or "new", f)) for w, o, f in CASES])
def test_a_fault_at_any_call(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, old: str, fault: str, way: str) -> None:
    small_views(monkeypatch)
    for change in WAYS[way]:
        change(monkeypatch)
    act, after, lasting = FAULTS[fault]
    hit = []
    if old:
        save(small_record(old), tmp_path / "pattern", overwrite=False)
    for at in range(1, 100):
        work = tmp_path / f"{at}"
        target = work / "sub" / "results"
        if old:
            shutil.copytree(tmp_path / "pattern", target)
        with monkeypatch.context() as patch:
            faults = Faults(patch, act, at, after=after, lasting=lasting)
            said = outcome(target, "new")
        hit.append(faults.done)  # nothing, behind a call that fails by itself
        check(work, target, faults, said, old)
        if not faults.done:
            assert (title_of(target), said) == ("new", "")
        elif faults.done not in TIDYING:
            assert SAID[act] in said
            assert "\n" not in said
            assert act is interrupted or title_of(target) == old
        if at > len(faults.calls):
            break
        shutil.rmtree(work, ignore_errors=True)
    assert set(hit) >= {"mkdir", "open", "write", "fsync", "unlink"}
    assert ("exchange" in hit) == bool(old and way != "in steps")
    assert hit.count("rename") == (3 if old and way == "in steps" else 0 if old else 1)


def check(work: Path, target: Path, faults: Faults, said: str, old: str) -> None:
    """The old results or the new ones, whole, and nothing beside, at the latest after the next save."""
    assert title_of(target) in ("new", old), (faults.calls, said)
    if faults.done in TIDYING:
        save(small_record("new"), target, overwrite=True)
    mark = target.with_name(".results.taken")
    if faults.after and mark.exists():
        # right behind its making a mark has no name in it: it counts for nothing after a minute
        assert faults.done == "open"
        assert mark.read_bytes() == b""
        os.utime(mark, (mark.stat().st_mtime - 61, mark.stat().st_mtime - 61))
        save(small_record("new"), target, overwrite=True)
    if target.exists():
        assert names(target.parent) == ["results"]
    else:
        assert not work.exists()


def test_everything_is_on_the_disk_before_it_takes_its_place(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    small_views(monkeypatch)
    save(small_record("old"), tmp_path / "results", overwrite=False)
    faults = Faults(monkeypatch, full, 0, after=False)
    save(small_record("new"), tmp_path / "results", overwrite=True)
    taken = faults.calls.index("exchange")
    assert faults.calls[taken - 1] == "fsync"  # the folder's own, behind those of its three files
    assert faults.calls[:taken].count("fsync") == 4
    assert "write" not in faults.calls[taken:]
    assert faults.calls[taken + 1] == "fsync"  # the names above
    assert faults.calls[taken + 2 :] == ["unlink"] * 3 + ["rmdir"] + ["unlink"]  # the old results, the lock


@pytest.mark.skipif(not hasattr(os, "fork"), reason="no fork here")
@pytest.mark.parametrize("arguments", [("--kills", "10", "--each"), ("--kills", "1", "--each", "--steps")])
def test_killed_processes(arguments: tuple[str, ...], environment: Mapping[str, str]) -> None:
    command = [sys.executable, str(HERE / "kill_saves.py"), *arguments]
    done = subprocess.run(command, capture_output=True, text=True, env=environment, timeout=60, check=False)
    assert done.returncode == 0, done.stderr
    tally = Counter({name: int(n) for name, n in (line.rsplit(": ", 1) for line in done.stdout.splitlines())})
    assert tally["killed at random"] == int(arguments[1])
    assert tally["killed at a call"] > 20
    assert min(tally["old results"], tally["new results"], tally["left beside: part"]) > 0
    assert (tally["missing until the next save"] > 0) == ("--steps" in arguments)


@pytest.fixture
def small_disk(tmp_path: Path) -> Iterator[Path]:
    """A file system of 64 kB."""
    place = tmp_path / "disk"
    place.mkdir()
    mount = shutil.which("mount")
    command = [mount or "mount", "-t", "tmpfs", "-o", "size=64k", "tmpfs", str(place)]
    if not mount or subprocess.run(command, capture_output=True, check=False).returncode:
        pytest.skip("no file system can be mounted here")
    yield place
    subprocess.run(["umount", str(place)], check=True)


def fill(file: Path) -> None:
    """Write until there is no room left."""
    with contextlib.suppress(OSError), file.open("wb", 0) as opened:
        while True:
            opened.write(bytes(4096))


def test_a_full_disk(small_disk: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    small_views(monkeypatch)
    save(small_record("old"), small_disk / "results", overwrite=False)
    for title in ("much too long " * 2, "x" * 12):  # one file that does not fit, and one that almost does
        assert "No space left on device" in outcome(small_disk / "results", title)
        assert title_of(small_disk / "results") == "old"
        assert names(small_disk) == ["results"]
    fill(small_disk / "filler")
    assert "No space left on device" in outcome(small_disk / "results", "n")
    assert (title_of(small_disk / "results"), names(small_disk)) == ("old", ["filler", "results"])
    # a link into another file system is followed, and stays
    (small_disk / "filler").unlink()
    (tmp_path / "link").symlink_to(small_disk / "results")
    assert outcome(tmp_path / "link", "new") == ""
    assert (tmp_path / "link").is_symlink()
    assert (title_of(small_disk / "results"), names(small_disk)) == ("new", ["results"])
    # the file system itself cannot be replaced
    shutil.rmtree(small_disk / "results")
    assert "is a mounted file system" in outcome(small_disk, "new")
    assert names(small_disk) == []


LIMITED = """
import resource, sys
from pathlib import Path
sys.path.insert(0, sys.argv[2])
from faults import ForGood, small_record, small_views
small_views(ForGood())
from eosmuster.report.folder import save
resource.setrlimit(resource.RLIMIT_FSIZE, (int(sys.argv[3]),) * 2)
try:
    save(small_record("new"), sys.argv[1], overwrite=True)
except Exception as error:
    print(type(error).__name__, error)
"""


@pytest.mark.skipif(os.name != "posix", reason="no limits of file sizes here")
@pytest.mark.parametrize(("most", "said"), [(6000, "InputError"), (50, "InputError"), (20_000, "")])
def test_a_file_that_may_not_grow(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, environment: Mapping[str, str], most: int, said: str
) -> None:
    small_views(monkeypatch)
    target = tmp_path / "results"
    save(small_record("old"), target, overwrite=False)
    command = [sys.executable, "-c", LIMITED, str(target), str(HERE), str(most)]
    done = subprocess.run(command, capture_output=True, text=True, env=environment, timeout=60, check=True)
    assert done.stdout.partition(" ")[0] == said
    assert ("File too large" in done.stdout) == bool(said)
    assert (title_of(target), names(tmp_path)) == ("old" if said else "new", ["results"])


WRITER = """
import sys
from pathlib import Path
sys.path.insert(0, sys.argv[2])
from faults import ForGood, small_record, small_views
small_views(ForGood())
from eosmuster.report import folder
def slowly(record, file):
    print("writing", flush=True)
    sys.stdin.readline()
    file.write(record.plan_title.encode())
if sys.argv[3] == "slowly":
    folder.VIEWS["summary.csv"] = slowly
print("ready", flush=True)
sys.stdin.readline()
for i in range(8 if sys.argv[3] == "often" else 1):
    folder.save(small_record(f"{sys.argv[3]} {i}"), sys.argv[1], overwrite=True)
"""


@pytest.fixture
def writer(environment: Mapping[str, str]) -> Iterator[Callable[[Path, str], subprocess.Popen[str]]]:
    """Start another process that saves; it waits for a line, and a slow one for another line while it writes."""
    started = []

    def start(target: Path, how: str) -> subprocess.Popen[str]:
        command = [sys.executable, "-c", WRITER, str(target), str(HERE), how]
        process = subprocess.Popen(
            command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True, env=dict(environment)
        )
        started.append(process)
        assert process.stdout is not None
        assert process.stdout.readline() == "ready\n"
        return process

    yield start
    for process in started:
        process.kill()
        process.communicate()


def say(process: subprocess.Popen[str]) -> None:
    assert process.stdin is not None
    process.stdin.write("\n")
    process.stdin.flush()


def hear(process: subprocess.Popen[str]) -> str:
    assert process.stdout is not None
    return process.stdout.readline()


Writer = Callable[[Path, str], subprocess.Popen[str]]


def test_a_second_run_is_refused_or_waits(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, writer: Writer) -> None:
    small_views(monkeypatch)
    target = tmp_path / "results"
    other = writer(target, "slowly")
    say(other)
    assert hear(other) == "writing\n"
    with pytest.raises(InputError) as caught:
        save(small_record("mine"), target, overwrite=True, wait=0.1)
    message = str(caught.value)
    assert f"process {other.pid} on " in message
    assert "within 0.1 s; run again when it has finished, or choose another --out" in message
    assert "\n" not in message
    assert not target.exists()
    threading.Timer(0.1, say, [other]).start()
    save(small_record("mine"), target, overwrite=True, wait=60.0)
    assert other.wait(60) == 0
    assert (title_of(target), names(tmp_path)) == ("mine", ["results"])


def test_a_lock_dies_with_its_process(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, writer: Writer) -> None:
    small_views(monkeypatch)
    target = tmp_path / "results"
    other = writer(target, "slowly")
    say(other)
    assert hear(other) == "writing\n"
    assert names(tmp_path) == [f".results.{other.pid}.part", ".results.lock"]
    os.kill(other.pid, getattr(signal, "SIGKILL", signal.SIGTERM))
    other.wait(60)
    save(small_record("mine"), target, overwrite=True, wait=0.0)
    assert (title_of(target), names(tmp_path)) == ("mine", ["results"])


def test_runs_that_write_at_once(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, writer: Writer) -> None:
    small_views(monkeypatch)
    target = tmp_path / "new" / "results"
    others = [writer(target, "often"), writer(target, "often")]
    for other in others:
        say(other)
    seen = 0
    while any(other.poll() is None for other in others):
        seen = seen or target.exists()
        assert target.exists() == bool(seen)  # there is no moment without results any more
        time.sleep(0.001)
    assert [other.returncode for other in others] == [0, 0]
    assert title_of(target) == "often 7"
    assert names(target.parent) == ["results"]


def test_threads_that_write_at_once(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    small_views(monkeypatch)
    said = []
    threads = [
        threading.Thread(target=lambda i=i: said.append(outcome(tmp_path / "results", f"thread {i}")))
        for i in range(4)
    ]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert said == [""] * 4
    assert title_of(tmp_path / "results").startswith("thread ")
    assert names(tmp_path) == ["results"]

"""Kill processes while they save results, and see what they leave.

    python tests/fuzz/kill_saves.py --kills 200

Each process saves over and over into one folder until it is killed (``kill -9``) at a random moment. Then the folder
has to hold one of its runs, whole; what stands beside it has to be gone after the next save. ``--each`` kills one
process before every single call that changes the disk as well. ``--steps`` takes the exchange of
two names in one step away, as on systems that have none: then the folder may be missing until the next save, which
brings the old results back.
"""

from __future__ import annotations

import argparse
import os
import random
import signal
import sys
import tempfile
import time
from collections import Counter
from itertools import count
from pathlib import Path
from typing import NoReturn

if __name__ == "__main__":
    sys.path.insert(0, str(Path(__file__).resolve().parents[2] / "harness"))

from faults import Faults, ForGood, in_steps, small_record, small_views, title_of

from eosmuster.report import placing
from eosmuster.report.folder import save

SYNC = os.fsync  # what is not killed need not wait for the disk
KINDS = {"": "no results yet", "old": "old results", "run": "new results"}
LONGEST = 0.05  # seconds that a process is left alone; a save takes some milliseconds


def killed(code: int) -> None:
    """Hold that a process was killed, and did not end by itself."""
    assert os.WIFSIGNALED(code), f"a process ended by itself: {os.waitstatus_to_exitcode(code)}"
    assert os.WTERMSIG(code) == signal.SIGKILL


def save_for_ever(target: Path, started: int) -> NoReturn:
    """Save again and again, having said through a pipe that it begins."""
    os.write(started, b".")
    number = 0
    while True:
        number += 1
        save(small_record(f"run {os.getpid()} {number}"), target, overwrite=True)


def kill_at_random(target: Path, rng: random.Random) -> None:
    """Start a process that saves for ever, and kill it."""
    read, write = os.pipe()
    child = os.fork()
    if not child:
        try:
            os.fsync = SYNC
            save_for_ever(target, write)
        finally:
            os._exit(1)
    os.read(read, 1)
    for end in (read, write):
        os.close(end)
    time.sleep(rng.uniform(0.0, LONGEST))
    os.kill(child, signal.SIGKILL)
    killed(os.waitpid(child, 0)[1])


def kill_at_call(target: Path, at: int) -> bool:
    """Let a process save once and end it before the call of that number; False if there are not so many calls."""
    child = os.fork()
    if not child:
        try:
            Faults(ForGood(), lambda: os.kill(os.getpid(), signal.SIGKILL), at, after=False)
            save(small_record(f"run {os.getpid()}"), target, overwrite=True)
            os._exit(0)
        finally:
            os._exit(1)
    code = os.waitpid(child, 0)[1]
    if os.WIFEXITED(code) and not os.WEXITSTATUS(code):
        return False
    killed(code)
    return True


def look(target: Path, old: str, tally: Counter[str], *, steps: bool) -> None:
    """Hold what a killed process left; raises `AssertionError` for anything but whole folders."""
    left = sorted(entry.name for entry in target.parent.iterdir() if entry != target)
    aside = any(name.endswith(".old") for name in left)
    assert steps or not aside
    title = title_of(target)
    assert title.startswith("run ") or title == old or (not title and aside)
    tally["missing until the next save" if not title and aside else KINDS[title.partition(" ")[0]]] += 1
    for name in left:
        tally[f"left beside: {name.rpartition('.')[2]}"] += 1
    placing.recover(target, {"points.csv", "summary.csv", "manifest.json"}, alone=True)
    found = title_of(target)
    assert found == title or (aside and (found.startswith("run ") or found == old != ""))
    save(small_record("next"), target, overwrite=True)
    assert [entry.name for entry in target.parent.iterdir()] == [target.name]
    assert title_of(target) == "next"


def kills_at_random(place: Path, number: int, seed: int, tally: Counter[str], *, steps: bool) -> None:
    """Kill so many processes, half of them in a new place and half over old results."""
    rng = random.Random(seed)
    for i in range(number):
        target, old = place / f"random-{i}" / "results", ("", "old")[i % 2]
        begin(target, old)
        kill_at_random(target, rng)
        tally["killed at random"] += 1
        look(target, old, tally, steps=steps)


def kills_at_each_call(place: Path, old: str, tally: Counter[str], *, steps: bool) -> None:
    """Kill a process before every call that one save makes."""
    for at in count(1):
        target = place / f"call-{at}{old}" / "results"
        begin(target, old)
        if not kill_at_call(target, at):
            return
        tally["killed at a call"] += 1
        look(target, old, tally, steps=steps)


def begin(target: Path, old: str) -> None:
    """Make the folder above, and old results if there are to be any."""
    target.parent.mkdir()
    if old:
        save(small_record(old), target, overwrite=False)


def main() -> None:
    """Kill, look, and say what came of it."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--kills", type=int, default=200, help="processes to kill at random moments")
    parser.add_argument("--each", action="store_true", help="kill at every single call as well")
    parser.add_argument("--steps", action="store_true", help="without the exchange of two names in one step")
    parser.add_argument("--seed", type=int, default=1)
    asked = parser.parse_args()
    small_views(ForGood())
    os.fsync = lambda fd: None
    if asked.steps:
        in_steps(ForGood())
    tally = Counter[str]()
    with tempfile.TemporaryDirectory() as folder:
        kills_at_random(Path(folder), asked.kills, asked.seed, tally, steps=asked.steps)
        for old in ("old",) if asked.each and asked.steps else ("", "old") if asked.each else ():
            kills_at_each_call(Path(folder), old, tally, steps=asked.steps)
    for name, number in sorted(tally.items()):
        print(f"{name}: {number}")


if __name__ == "__main__":
    main()

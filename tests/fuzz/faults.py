"""Faults for the saving of results: every call that changes the disk can be counted, made to fail, or be the last."""

from __future__ import annotations

import json
import os
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import Any, BinaryIO, Protocol

from eosmuster.record import Record
from eosmuster.report import folder, locking, manifest, placing

CHANGES = ("mkdir", "rename", "fsync", "open", "write", "ftruncate", "unlink", "rmdir")
"""Functions of `os` that change the disk; files opened by `Path.open` for writing are watched besides."""

TIDYING = ("unlink", "rmdir")
"""Calls that take away what is no longer needed: nothing in the folder hangs on them."""


class Patch(Protocol):
    """What `pytest.MonkeyPatch` offers; a process that ends soon needs nothing more than setattr."""

    def setattr(self, owner: Any, name: str, value: Any) -> None: ...


class ForGood:
    """A patch that is never taken back."""

    def setattr(self, owner: Any, name: str, value: Any) -> None:
        setattr(owner, name, value)


class Faults:
    """Do something at the call of that number, before it or behind it; `calls` are all so far, by name.

    Parameters
    ----------
    act : raises, or ends the process
    at : number of the call, from 1
    after : let the call be done first
    lasting : do it at every later call that takes up space as well, as a disk that is full stays full
    """

    def __init__(self, patch: Patch, act: Callable[[], None], at: int, *, after: bool, lasting: bool = False) -> None:
        self.act, self.at, self.after, self.lasting = act, at, after, lasting
        self.calls: list[str] = []
        self.done = ""
        for name in CHANGES:
            patch.setattr(os, name, self.wrapped(name, getattr(os, name)))
        patch.setattr(Path, "open", self.opener(Path.open))
        found = placing._renameat2()
        if found is not None:
            exchange = self.wrapped("exchange", found)
            patch.setattr(placing, "_renameat2", lambda: exchange)

    def wrapped(self, name: str, function: Callable[..., Any]) -> Callable[..., Any]:
        def call(*args: Any, **kwargs: Any) -> Any:
            if name == "open" and not args[1] & os.O_CREAT:
                return function(*args, **kwargs)
            self.count(name)
            # the data get onto the disk all the same, later: nothing here cuts the power
            result: Any = None if name == "fsync" else function(*args, **kwargs)
            try:
                self.behind()
            except BaseException:
                if name == "open":
                    os.close(result)
                raise
            return result

        return call

    def opener(self, function: Callable[..., Any]) -> Callable[..., Any]:
        def call(path: Path, mode: str = "r", *args: Any, **kwargs: Any) -> Any:
            if mode.startswith("r"):
                return function(path, mode, *args, **kwargs)
            self.count("open")
            file = function(path, mode, *args, **kwargs)
            try:
                self.behind()
            except BaseException:
                file.close()
                raise
            return Watched(file, self)

        return call

    def count(self, name: str) -> None:
        """Note a call; what is to be done before it is done now."""
        self.calls.append(name)
        now = len(self.calls) == self.at
        if not self.after and (now or (self.done and self.lasting and name not in (*TIDYING, "rename", "exchange"))):
            self.done = self.done or name
            self.act()

    def behind(self) -> None:
        """Do what is to be done behind a call."""
        if self.after and len(self.calls) == self.at:
            self.done = self.calls[-1]
            self.act()


class Watched:
    """An open file whose writes are counted."""

    def __init__(self, file: Any, faults: Faults) -> None:
        self.file, self.faults = file, faults

    def write(self, data: Any) -> int:
        self.faults.count("write")
        written: int = self.file.write(data)
        self.faults.behind()
        return written

    def writelines(self, lines: Iterable[Any]) -> None:
        for line in lines:
            self.write(line)

    def flush(self) -> None:
        self.faults.count("write")
        self.file.flush()
        self.faults.behind()

    def __enter__(self) -> Watched:
        return self

    def __exit__(self, *args: object) -> None:
        self.file.__exit__(*args)

    def __getattr__(self, name: str) -> Any:
        return getattr(self.file, name)


def small_views(patch: Any) -> None:
    """Let folders hold two small files, so that many of them can be written."""

    def first(record: Record, file: BinaryIO) -> None:
        file.writelines(f"{record.plan_title},{i}\n".encode() for i in range(3))

    def second(record: Record, file: BinaryIO) -> None:
        file.write(record.plan_title.encode() * 4000)  # more than a file's buffer takes

    patch.setattr(folder, "VIEWS", {folder.POINTS: first, "summary.csv": second})
    patch.setattr(manifest, "reference_hashes", dict)
    patch.setattr(manifest, "_git_revision", lambda checkout: None)


def small_record(title: str) -> Record:
    """Give a record of nothing, told apart by its title."""
    return Record("invented", title, 'title = "invented"\n', (), (), ())


def in_steps(patch: Patch) -> None:
    """Take the exchange of two names in one step away."""
    patch.setattr(placing, "_renameat2", lambda: None)


def by_marks(patch: Patch) -> None:
    """Take advisory locks away."""
    patch.setattr(locking, "fcntl", None)


def title_of(place: Path) -> str:
    """Read the title of a folder's plan, having held every file against its hash; "" if there is no folder."""
    if not place.exists():
        return ""
    content = json.loads((place / "manifest.json").read_text(encoding="utf-8"))
    assert {entry.name for entry in place.iterdir()} == {*content["outputs"], "manifest.json"}
    for name, digest in content["outputs"].items():
        assert manifest.file_hash(place / name) == digest, name
        assert content["plan"]["title"].encode() in (place / name).read_bytes()
    title: str = content["plan"]["title"]
    return title

"""Single files: whole or not at all; links are followed, pipes written into, and nothing else is replaced."""

from __future__ import annotations

import os
import socket
import stat
import sys
import threading
from pathlib import Path

import pytest

from eosmuster.errors import InputError
from eosmuster.report.files import checked_file, write_whole
from eosmuster.report.manifest import FORMAT

posix = pytest.mark.skipif(os.name != "posix", reason="no pipes and devices with names here")


def written(path: Path | str, content: bytes = b"new") -> Path:
    target = checked_file(str(path), "--csv")
    write_whole(target, content, "--csv")
    return target


def test_a_file_is_made_and_replaced(tmp_path: Path) -> None:
    for content in (b"one", b"two"):
        written(tmp_path / "rows.csv", content)
        assert (tmp_path / "rows.csv").read_bytes() == content
    assert [path.name for path in tmp_path.iterdir()] == ["rows.csv"]


@pytest.mark.parametrize("there", [True, False], ids=["to a file", "to nothing yet"])
def test_links_are_followed(tmp_path: Path, there: bool) -> None:
    (tmp_path / "far").mkdir()
    if there:
        (tmp_path / "far" / "rows.csv").write_bytes(b"old")
    (tmp_path / "middle").symlink_to("far/rows.csv")
    (tmp_path / "link.csv").symlink_to("middle")
    written(tmp_path / "link.csv")
    assert (tmp_path / "link.csv").is_symlink()
    assert (tmp_path / "middle").is_symlink()
    assert (tmp_path / "far" / "rows.csv").read_bytes() == b"new"
    assert [path.name for path in (tmp_path / "far").iterdir()] == ["rows.csv"]


def test_links_in_a_circle_are_refused(tmp_path: Path) -> None:
    (tmp_path / "a").symlink_to("b")
    (tmp_path / "b").symlink_to("a")
    with pytest.raises(InputError, match=r"--csv: '.*a' cannot be a file: "):
        written(tmp_path / "a")
    assert (tmp_path / "a").is_symlink()


@posix
def test_a_named_pipe_is_written_into(tmp_path: Path) -> None:
    pipe, got = tmp_path / "pipe", []
    os.mkfifo(pipe)
    reader = threading.Thread(target=lambda: got.append(pipe.read_bytes()))
    reader.start()
    target = written(pipe)
    reader.join()
    assert target == pipe
    assert got == [b"new"]
    assert stat.S_ISFIFO(pipe.stat().st_mode)
    assert [path.name for path in tmp_path.iterdir()] == ["pipe"]


@posix
def test_a_device_is_written_into() -> None:
    """A pseudo-terminal, since its folder lets nobody replace it: a slip costs no machine its /dev/null."""
    ours, theirs = os.openpty()
    try:
        written(os.ttyname(theirs))
        assert os.read(ours, 100) == b"new"
    finally:
        os.close(ours)
        os.close(theirs)


@posix
def test_a_socket_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)  # names of sockets may not be long
    with socket.socket(socket.AF_UNIX) as made:
        made.bind("s")
        with pytest.raises(InputError, match=r"--csv: 's' is a device or a socket; name a file"):
            written("s")
    assert stat.S_ISSOCK(Path("s").stat().st_mode)


def test_what_the_command_prints_into_is_refused(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    with (tmp_path / "said.txt").open("w") as said:
        monkeypatch.setattr(sys, "stdout", said)
        with pytest.raises(InputError, match="is the file that the command prints into; name another"):
            written(tmp_path / "said.txt")
        written(tmp_path / "other.txt")


def test_a_link_into_a_results_folder_is_refused(tmp_path: Path) -> None:
    (tmp_path / "results").mkdir()
    (tmp_path / "results" / "manifest.json").write_text(f'{{"format": "{FORMAT}"}}', encoding="utf-8")
    (tmp_path / "link.csv").symlink_to("results/rows.csv")
    with pytest.raises(InputError, match="lies in the results folder"):
        written(tmp_path / "link.csv")
    assert [path.name for path in (tmp_path / "results").iterdir()] == ["manifest.json"]

"""What may lie where a plan is expected."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from eosmuster.errors import InputError
from eosmuster.plan.files import LARGEST_FILE, parse_toml, read_text
from eosmuster.plan.reading import load_plan


def refused(path: Path | str) -> str:
    with pytest.raises(InputError) as caught:
        load_plan(path)
    message = str(caught.value)
    assert "\n" not in message
    assert Path(path).name.strip("\0") in message
    return message


def test_missing(tmp_path: Path) -> None:
    assert "no such file; `eosmuster list plans`" in refused(tmp_path / "none.toml")


def test_folder(tmp_path: Path) -> None:
    assert "is a folder" in refused(tmp_path)


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="no named pipes here")
def test_pipe_does_not_hang(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "pipe.toml")
    assert "not a regular file" in refused(tmp_path / "pipe.toml")


def test_binary(tmp_path: Path) -> None:
    path = tmp_path / "plan.toml"
    path.write_bytes(b"\x89PNG\r\n\x00\x01")
    assert "binary file" in refused(path)


def test_another_encoding_names_the_line(tmp_path: Path) -> None:
    path = tmp_path / "plan.toml"
    path.write_bytes('title = "a"\nservice = "Kühlung"\n'.encode("latin-1"))
    assert "line 2 is not UTF-8" in refused(path)


def test_empty(tmp_path: Path) -> None:
    path = tmp_path / "plan.toml"
    path.touch()
    assert "is empty" in refused(path)


def test_fifty_megabytes_are_refused_without_reading_them(tmp_path: Path) -> None:
    path = tmp_path / "plan.toml"
    with path.open("wb") as file:
        file.truncate(50_000_000)  # sparse: takes no room
    assert "larger than 5 MB" in refused(path)


def test_the_largest_file_is_still_read(tmp_path: Path) -> None:
    path = tmp_path / "plan.toml"
    path.write_bytes(b"#" * LARGEST_FILE)
    assert len(read_text(path)) == LARGEST_FILE
    path.write_bytes(b"#" * (LARGEST_FILE + 1))
    with pytest.raises(InputError, match="larger than 5 MB"):
        read_text(path)


def test_a_path_the_system_cannot_take(tmp_path: Path) -> None:
    assert "cannot be read" in refused(tmp_path / ("x" * 5000))
    with pytest.raises(InputError):
        load_plan(f"{tmp_path}/a\0b.toml")


@pytest.mark.skipif(not hasattr(os, "geteuid") or os.geteuid() == 0, reason="root may read anything")
def test_no_permission(tmp_path: Path) -> None:
    path = tmp_path / "plan.toml"
    path.write_text("title = 'a'")
    path.chmod(0)
    assert "cannot be read (Permission denied)" in refused(path)


def test_an_error_at_the_end_names_the_last_line() -> None:
    with pytest.raises(InputError, match=r"at the end, line 3"):
        parse_toml('a = 1\nb = 2\nc = """', "t")

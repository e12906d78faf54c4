"""A plan's file: read whole, decoded and parsed, whatever it turns out to be."""

from __future__ import annotations

import tomllib
from collections.abc import Iterable
from pathlib import Path

from eosmuster.errors import InputError

LARGEST_FILE = 5_000_000
"""Bytes; a plan is a page, so anything larger is another file."""

_DEEPEST = 8
_TOO_DEEP = f"is nested too deeply; a plan has tables and lists of at most {_DEEPEST} levels"


def read_text(path: Path) -> str:
    """Read a UTF-8 text file of at most `LARGEST_FILE` bytes; never more than that is taken into memory.

    Raises
    ------
    InputError : missing, a folder, not a regular file, unreadable, too large, binary or not UTF-8
    """
    try:
        data = _read_bytes(path)
    except (OSError, ValueError) as error:  # ValueError: a NUL in the path
        reason = getattr(error, "strerror", None) or str(error)
        raise InputError(f"{str(path)!r} cannot be read ({reason}); give a readable TOML file") from None
    if len(data) > LARGEST_FILE:
        raise InputError(f"{path}: is larger than {LARGEST_FILE // 10**6} MB; a plan is a short TOML file")
    return _decode(data, str(path))


def _read_bytes(path: Path) -> bytes:
    if path.is_dir():
        raise InputError(f"{path}: is a folder; give the plan's TOML file")
    if not path.exists():
        raise InputError(f"{path}: there is no such file; `eosmuster list plans` shows the built-in plans")
    if not path.is_file():
        raise InputError(f"{path}: is not a regular file; give the plan's TOML file")
    with path.open("rb") as file:
        return file.read(LARGEST_FILE + 1)


def _decode(data: bytes, where: str) -> str:
    if b"\0" in data:
        raise InputError(f"{where}: is a binary file (it holds NUL bytes); a plan is TOML in UTF-8")
    try:
        return data.decode("utf-8-sig").replace("\r\n", "\n")
    except UnicodeDecodeError as error:
        line = data[: error.start].count(b"\n") + 1
        raise InputError(f"{where}: line {line} is not UTF-8; save the plan as UTF-8") from None


def parse_toml(text: str, where: str) -> dict[str, object]:
    """Parse TOML.

    Raises
    ------
    InputError : empty or invalid, with the line

    Examples
    --------
    >>> parse_toml('title = "a', "plan.toml")
    Traceback (most recent call last):
    eosmuster.errors.InputError: plan.toml: is not valid TOML: Unterminated string (at the end, line 1)
    """
    if not text.strip():
        raise InputError(f"{where}: is empty; a plan names at least its components and properties")
    try:
        data = tomllib.loads(text)
    except RecursionError:
        raise InputError(f"{where}: {_TOO_DEEP}") from None
    except ValueError as error:  # TOMLDecodeError, or an integer too long to read
        raise InputError(f"{where}: is not valid TOML: {_with_line(str(error), text)}") from None
    _refuse_deep(data, where)
    return data


def _refuse_deep(data: dict[str, object], where: str) -> None:
    """Refuse what later readers could not even quote: dotted keys nest without limit."""
    level: list[object] = [data]
    for _ in range(_DEEPEST):
        level = [inner for outer in level for inner in _inner(outer)]
    if level:
        raise InputError(f"{where}: {_TOO_DEEP}")


def _inner(value: object) -> Iterable[object]:
    """Return what a table or a list holds, nothing for a plain value."""
    if isinstance(value, dict):
        return value.values()
    return value if isinstance(value, list) else ()


def _with_line(message: str, text: str) -> str:
    """Name the line where the parser only says that the document ended."""
    return message.replace("(at end of document)", f"(at the end, line {len(text.splitlines())})")

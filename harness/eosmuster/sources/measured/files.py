"""Files of measured data, by the patterns of a plan or a whole folder: every bad one is listed, none is fatal."""

from __future__ import annotations

import glob
import os
from collections.abc import Iterable, Iterator, Sequence
from pathlib import Path

from eosmuster.components import Component
from eosmuster.errors import InputError
from eosmuster.progress import Progress
from eosmuster.quantities import shown
from eosmuster.sources.laboratory import reader as laboratory
from eosmuster.sources.laboratory.columns import descriptors_of
from eosmuster.sources.measured.repeats import combined
from eosmuster.sources.measured.table import Diagnostic, Reading
from eosmuster.sources.thermoml import reader as thermoml

TABLES = (".csv", ".tsv", ".txt")
THERMOML = ".xml"
IN_FOLDERS = (THERMOML, ".csv", ".tsv")
"""Kinds that are looked for in a folder, where a text may be anything."""

DESCRIPTOR = ".json"


def read_files(
    patterns: Sequence[str],
    folder: Path,
    progress: Progress | None = None,
    own: Sequence[Component] = (),
) -> Reading:
    """Read the files that patterns name, such as ``["lab/*.xml", "lab/density.csv"]``.

    Parameters
    ----------
    patterns : globs, ``**`` for any number of folders; or a folder, for all ThermoML and CSV files below it
    folder : what they start from
    progress : told of every file
    own : components that laboratory files may name besides the catalogue

    Returns
    -------
    what the files hold, repeated points marked. Each file is read once, whatever patterns name it.

    Raises
    ------
    InputError : a pattern that names no file, or patterns that name nothing but descriptors.
    """
    return combined(readings(_found(patterns, folder), folder, progress, own))


def evidence(patterns: Sequence[str], folder: Path) -> list[str]:
    """Name all files that `read_files` reads, in order, whatever they give, and all that may describe them.

    Raises
    ------
    InputError : a pattern that names no file, or patterns that name nothing but descriptors.
    """
    found = _found(patterns, folder)
    tables = (Path(name) for name in found if Path(name).suffix.lower() in TABLES)
    named = {*found, *(beside.as_posix() for table in tables for beside in descriptors_of(table))}
    return sorted(name for name in named if (folder / name).is_file() and os.access(folder / name, os.R_OK))


def _found(patterns: Sequence[str], folder: Path) -> list[str]:
    """Name the files of data that patterns name, each once."""
    found: dict[str, None] = {}
    for pattern in patterns:
        named = [name for name in _named(pattern, folder) if _is_file(folder / name)]
        if not named:
            raise InputError(f"references.files: {shown(pattern)} names no file in {folder}")
        found |= dict.fromkeys(name for name in named if not name.endswith(DESCRIPTOR))
    if patterns and not found:
        all_named = ", ".join(map(shown, patterns))
        raise InputError(
            f"references.files: {all_named} names no file in {folder} but descriptors; name their tables"
        )
    return list(found)


def _named(pattern: str, folder: Path) -> list[str]:
    if pattern and "\0" not in pattern and (folder / pattern).is_dir():
        return [(Path(pattern) / name).as_posix() for name in _below(folder / pattern)]
    return sorted(_matching(pattern, folder))


def _is_file(path: Path) -> bool:
    """Tell whether there is something that is no folder; a link that leads nowhere counts, and is listed as bad."""
    return (path.exists() or path.is_symlink()) and not path.is_dir()


def _matching(pattern: str, folder: Path) -> list[str]:
    try:
        return glob.glob(pattern, root_dir=folder, recursive=True)  # noqa: PTH207 (patterns may be absolute)
    except (ValueError, OSError) as error:  # a NUL character, or a folder that cannot be listed
        raise InputError(f"references.files: {shown(pattern)} cannot be looked for: {error}") from None


def read_folder(folder: Path, progress: Progress | None = None) -> Reading:
    """Read all ThermoML and CSV files below a folder; see `read_files`.

    Raises
    ------
    InputError : no such folder.
    """
    if not folder.is_dir():
        raise InputError(f"{folder} is no folder; valid is one with ThermoML or CSV files")
    return combined(readings(_below(folder), folder, progress))


def _below(folder: Path) -> list[str]:
    """Name the files of the kinds that are looked for below a folder, relative to it."""
    inside = (Path(place, name) for place, _, names in os.walk(folder) for name in names)
    return sorted(path.relative_to(folder).as_posix() for path in inside if path.suffix.lower() in IN_FOLDERS)


def readings(
    names: Iterable[str], folder: Path, progress: Progress | None = None, own: Sequence[Component] = ()
) -> Iterator[Reading]:
    """Read files one by one; nothing is kept from one to the next, and repeated points are not marked.

    Parameters
    ----------
    names : paths, relative to the folder
    """
    listed = list(names)
    for done, name in enumerate(listed):
        if progress is not None:
            progress("measured", done, len(listed))
        yield _read(folder / name, name, own)


def _read(path: Path, name: str, own: Sequence[Component]) -> Reading:
    if not path.is_file():  # a pipe or a device would be waited for
        return Reading(diagnostics=(Diagnostic(name, 0, "file", "it is no regular file"),), files=1)
    kind = path.suffix.lower()
    if kind == THERMOML:
        return thermoml.read_file(path, name)
    if kind in TABLES:
        return laboratory.read_file(path, name, own)
    valid = ", ".join((THERMOML, *TABLES))
    return Reading(
        diagnostics=(Diagnostic(name, 0, "file", f"its kind {kind!r} is not read; valid: {valid}"),), files=1
    )

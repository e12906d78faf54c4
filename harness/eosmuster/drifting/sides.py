"""The two sides of a comparison: a results folder, or a run that was not written."""

from __future__ import annotations

import csv
import io
import os
import tomllib
from collections.abc import Iterable, Mapping
from dataclasses import dataclass, field, replace
from pathlib import Path
from typing import Any, TypeVar

from eosmuster.drifting.changes import Key, Run
from eosmuster.drifting.points import BlockPoints, FilePoints, Points
from eosmuster.drifting.regions import Shape, plane_of, read_regions, shapes_of
from eosmuster.drifting.tables import grouped, key_of, read_summary, read_windows, rows_counted
from eosmuster.errors import InputError
from eosmuster.quantities import shown
from eosmuster.record import RECORD_VERSION, Record, Region, SummaryRow, WindowRow
from eosmuster.report.cells import encoded, text_cell
from eosmuster.report.manifest import FORMAT_VERSION, file_hash, manifest, read_manifest
from eosmuster.report.manifest import NAME as MANIFEST

T = TypeVar("T", SummaryRow, WindowRow)

SUMMARY, WINDOWS, REGIONS, POINTS = "summary.csv", "windows.csv", "regions.csv", "points.csv"

_DEEPEST = 12
_MAPPINGS = ("plan", "decision", "constants", "models", "references", "measured_files", "outputs", "volatile")


class OtherVersion(InputError):
    """A results folder of ours, but of a record version that this one does not read."""


@dataclass(frozen=True)
class Side:
    """What one run says.

    Attributes
    ----------
    where : how messages call it
    manifest : manifest.json, its tables being tables
    rows, windows : summary.csv and windows.csv by key, in the order of the files
    points : points.csv; None if it was not written
    folder : where the files are; None for a run that was not written
    regions : regions.csv by key, measured; empty if it was not written
    """

    where: str
    manifest: Mapping[str, Any]
    rows: Mapping[Key, SummaryRow]
    windows: Mapping[Key, tuple[WindowRow, ...]]
    points: Points | None
    folder: Path | None = None
    regions: Mapping[Key, Shape] = field(default_factory=dict)

    @property
    def run(self) -> Run:
        """The side in words."""
        return Run(self.where, str(self.manifest["plan"].get("name", "")), versions(self.manifest))

    @property
    def plan(self) -> Mapping[str, Any]:
        """The plan's tables; empty if its text is no plan's TOML."""
        return _plan(self.manifest)

    def altered(self, names: Iterable[str]) -> list[str]:
        """Give those of some files that are there and not as the run wrote them, by the manifest's SHA-256.

        Raises
        ------
        InputError : a file that cannot be read
        """
        if self.folder is None:
            return []
        digests = self.manifest["outputs"]
        here = [name for name in names if (self.folder / name).is_file()]
        return [name for name in here if digests.get(name) != sha256(self.folder / name)]


def _plan(content: Mapping[str, Any]) -> Mapping[str, Any]:
    try:
        tables = tomllib.loads(str(content["plan"].get("text", "")))
    except (ValueError, RecursionError):
        return {}
    return {} if _is_too_deep(tables) else tables


def sha256(path: Path) -> str:
    """Return the SHA-256 of a file, hexadecimal.

    Raises
    ------
    InputError : it cannot be read
    """
    try:
        return file_hash(path)
    except OSError as error:
        raise InputError(f"{path}: cannot be read: {error.strerror or error}") from None


def versions(content: Mapping[str, Any]) -> dict[str, str]:
    """Give the versions a manifest names, by package."""
    found = content["volatile"].get("versions")
    return {str(name): str(version) for name, version in found.items()} if isinstance(found, dict) else {}


def checked_manifest(folder: str | os.PathLike[str]) -> tuple[Path, dict[str, Any]]:
    """Read the manifest of a results folder.

    Returns
    -------
    the folder and its manifest, in which all that must be a table is one

    Raises
    ------
    OtherVersion : of a record version that this one does not read
    InputError : not a folder, or not one that a run wrote
    """
    try:
        path = Path(folder)
        if not path.is_dir():
            what = "is a file" if path.exists() else "is not there"
            raise InputError(f"{shown(str(path), 200)} {what}; give a results folder, as `eosmuster sweep` writes it")
    except (OSError, ValueError) as error:
        raise InputError(f"{shown(os.fspath(folder), 200)} cannot be a results folder: {error}") from None
    content = read_manifest(path)
    if content is None:
        raise InputError(f"{path} is no results folder: it has no {MANIFEST} of ours")
    found = (content.get("format_version"), content.get("record_version"))
    if found != (FORMAT_VERSION, RECORD_VERSION):
        raise OtherVersion(
            f"{path} has format version {shown(found[0])} and record version {shown(found[1])}; this eosmuster reads "
            f"{FORMAT_VERSION} and {RECORD_VERSION}, so run its plan again"
        )
    if _is_too_deep(content):
        raise InputError(f"{path / MANIFEST}: is nested more than {_DEEPEST} levels deep, as no run writes it")
    for name in _MAPPINGS:
        if not isinstance(content.get(name), dict):
            raise InputError(f"{path / MANIFEST}: {name!r} is not a table, as a run writes it")
    return path, content


def _is_too_deep(content: object) -> bool:
    level = [content]
    for _ in range(_DEEPEST):
        inner = (x.values() if isinstance(x, dict) else x for x in level if isinstance(x, (dict, list)))
        level = [item for items in inner for item in items]
    return bool(level)


def outputs(content: Mapping[str, Any]) -> dict[str, str]:
    """Give the files that a manifest says its run wrote, by name, with their SHA-256.

    Raises
    ------
    InputError : a name that is none of a file in the folder itself
    """
    found = {str(name): str(digest) for name, digest in content["outputs"].items()}
    for name in found:
        if name in ("", ".", "..", MANIFEST) or Path(name).name != name or "\0" in name:
            raise InputError(f"{MANIFEST}: outputs names {shown(name)}, which no run writes into its folder")
    return found


def read_side(folder: str | os.PathLike[str]) -> Side:
    """Read a results folder; points.csv is opened only when it is asked for points.

    Raises
    ------
    InputError : as `checked_manifest`, or a file that is missing or damaged
    """
    path, content = checked_manifest(folder)
    rows = read_summary(path / SUMMARY, rows_counted(content, "summary"))
    windows = read_windows(path / WINDOWS, rows_counted(content, "windows"))
    has_points = (path / POINTS).is_file()
    points = FilePoints(path / POINTS, {key: row.points for key, row in rows.items()}) if has_points else None
    return Side(str(folder), content, rows, windows, points, path, _regions(path / REGIONS, content))


def _regions(path: Path, content: Mapping[str, Any]) -> dict[Key, Shape]:
    """Read regions.csv, which only runs with single-phase states write."""
    count = rows_counted(content, "regions")
    if not (count or REGIONS in content["outputs"] or path.is_file()):
        return {}
    return read_regions(path, plane_of(_plan(content)), count)


def side_of_record(record: Record, where: str) -> Side:
    """Give a run that was not written as the folder it would be."""
    summary = [_as_read(row) for row in record.summary]
    windows = [_as_read(row) for row in record.windows]
    blocks = {
        Key(*map(spelled, (b.component, name, b.property, b.reference_source))): (b, i)
        for b in record.blocks
        for i, name in enumerate(b.candidates)
    }
    rows, content = {key_of(row): row for row in summary}, manifest(record, {})
    named = ((_region_key(region), region) for region in record.regions)
    regions = shapes_of(plane_of(_plan(content)), named)
    return Side(where, content, rows, grouped(windows), BlockPoints(blocks), regions=regions)


def _region_key(region: Region) -> Key:
    return Key(*map(spelled, (region.component, region.candidate, region.property, region.reference_source)))


def _as_read(row: T) -> T:
    texts: Any = {name: spelled(value) for name, value in vars(row).items() if isinstance(value, str)}
    return replace(row, **texts)


def spelled(text: str) -> str:
    """Give text as it reads back from a CSV file of a run.

    Examples
    --------
    >>> spelled("propane"), spelled("=1+1")
    ('propane', "'=1+1")
    """
    cell = encoded(text_cell(text)).decode()
    return next(csv.reader(io.StringIO(cell, newline="")), [""])[0] if cell else ""

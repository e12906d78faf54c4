"""A results folder: complete or absent.

Everything is written into a hidden sibling, and put onto the disk, before it takes its place in one step (`placing`);
one run at a time does that (`locking`).
"""

from __future__ import annotations

import os
from collections.abc import Callable, Collection, Iterator
from datetime import datetime
from pathlib import Path
from typing import BinaryIO

from eosmuster.errors import InputError
from eosmuster.quantities import SINGLE_PHASE
from eosmuster.record import Record
from eosmuster.report import destination, placing
from eosmuster.report.cells import encoded
from eosmuster.report.locking import WAIT, locked
from eosmuster.report.manifest import NAME as MANIFEST
from eosmuster.report.manifest import file_hash, manifest, manifest_text
from eosmuster.report.markdown import summary_markdown
from eosmuster.report.points import write_points
from eosmuster.report.record_file import NAME as RECORD
from eosmuster.report.regions import write_regions, write_regions_json
from eosmuster.report.tables import write_summary, write_windows
from eosmuster.report.workbook import NAME as WORKBOOK

POINTS = "points.csv"
DOSSIER = "dossier.html"

View = Callable[[Record, BinaryIO], None]


def _write_markdown(record: Record, file: BinaryIO) -> None:
    file.write(encoded(summary_markdown(record)))


def _write_dossier(record: Record, file: BinaryIO) -> None:
    from eosmuster.report.dossier.page import write_dossier

    write_dossier(record, file)


def _write_workbook(record: Record, file: BinaryIO) -> None:
    from eosmuster.report.workbook import write_workbook

    write_workbook(record, file)


def _write_record(record: Record, file: BinaryIO) -> None:
    from eosmuster.report.record_file import write_record

    write_record(record, file)


VIEWS: dict[str, View] = {
    POINTS: write_points,
    "summary.csv": write_summary,
    "windows.csv": write_windows,
    "regions.csv": write_regions,
    "regions.json": write_regions_json,
    "summary.md": _write_markdown,
    DOSSIER: _write_dossier,
    WORKBOOK: _write_workbook,
    RECORD: _write_record,
}
"""Every file of a results folder but the manifest, and what writes it.

A view that needs a heavy library, or is rarely asked for, is a function here that imports it when called.
"""


def _has_regions(record: Record) -> bool:
    return record.regions_asked and any(block.property in SINGLE_PHASE for block in record.blocks)


ONLY_IF: dict[str, Callable[[Record], bool]] = {
    "regions.csv": _has_regions,
    "regions.json": _has_regions,
    RECORD: lambda record: record.part is not None,
}
"""Files that not every record has: name -> whether this one does. Any other view is always written."""

LITTER = {".DS_Store", "Thumbs.db", "desktop.ini"}  # what file managers leave in any folder


def save(
    record: Record,
    folder: str | os.PathLike[str],
    *,
    points: bool = True,
    dossier: bool = True,
    workbook: bool = False,
    overwrite: bool,
    started: datetime | None = None,
    wait: float = WAIT,
) -> Path:
    """Write a record as a results folder.

    Parameters
    ----------
    record : the run
    folder : its parents are made if they are missing
    points, dossier, workbook : write points.csv, dossier.html, results.xlsx as well
    overwrite : an earlier results folder may be replaced (nothing else ever is)
    started : when the run began (with a time zone), for the manifest
    wait : seconds to wait for another run that is writing there

    Returns
    -------
    the absolute path of the folder

    Raises
    ------
    InputError : a place where results must not go (a file, a folder with anything else in it, the current
        folder or one above it, the home folder or one above it, inside another results folder, a mounted
        file system), one that cannot be written, or one where another run is still writing. Whatever was there
        is as it was.

    Notes
    -----
    However this ends - an interruption, a full disk, ``kill -9``, a power cut - the folder is the old one or the
    new one, complete. Only where the system cannot exchange two names in one step a killed process may leave the
    old one beside, under a hidden name; the next save brings it back.
    """
    target = checked(folder, overwrite=overwrite)
    known = _known()
    wanted = {POINTS: points, DOSSIER: dossier, WORKBOOK: workbook}
    omitted = {name for name, asked in wanted.items() if not asked}
    try:
        with placing.parents(target), locked(target, wait) as alone:
            placing.recover(target, known, alone=alone)
            with placing.beside(target, known) as part:
                _write(record, part, omitted, started)
                if target.exists():  # again: until now others may have written there
                    destination.refuse_irreplaceable(target, known, overwrite=overwrite)
                placing.put(part, target)
    except OSError as error:
        reason = error.strerror or str(error)
        raise InputError(f"{target}: cannot write the results there: {reason}; choose another --out") from error
    return target


def checked(folder: str | os.PathLike[str], *, overwrite: bool) -> Path:
    """Resolve where results shall go; raise `InputError` in one sentence if they must not.

    Nothing is touched, so this can be asked before the work begins.
    """
    return destination.destination(folder, _known(), overwrite=overwrite)


def written(record: Record, omitted: Collection[str] = (WORKBOOK,)) -> Iterator[tuple[str, View]]:
    """Give the views that a record's folder has, in the order in which they are written."""
    for name, view in VIEWS.items():
        if name not in omitted and (name not in ONLY_IF or ONLY_IF[name](record)):
            yield name, view


def _known() -> set[str]:
    return {*VIEWS, MANIFEST, *LITTER}


def _write(record: Record, part: Path, omitted: Collection[str], started: datetime | None) -> None:
    hashes = {}
    for name, view in written(record, omitted):
        with (part / name).open("wb") as file:
            view(record, file)
            _onto_the_disk(file)
        hashes[name] = file_hash(part / name)
    content = manifest(record, hashes, points=POINTS in hashes, started=started)
    with (part / MANIFEST).open("wb") as file:
        file.write(encoded(manifest_text(content)))
        _onto_the_disk(file)


def _onto_the_disk(file: BinaryIO) -> None:
    file.flush()
    os.fsync(file.fileno())

"""record.npz: a record as it was measured, saved and loaded without running anything that a file says.

An uncompressed ZIP archive, as `numpy.savez` writes it, of one flat array a kind of number and a JSON header. What
lies in them one behind the other follows from the order in which `packing` takes records apart; loading puts them
together by the types of the fields and believes the file nothing else.
"""

from __future__ import annotations

import hashlib
import io
import json
import os
import struct
import zipfile
from collections.abc import Mapping
from pathlib import Path
from typing import Any, BinaryIO, cast

import numpy as np
from numpy.typing import NDArray

from eosmuster.errors import InputError
from eosmuster.quantities import UNITS
from eosmuster.record import (
    POINT_VERDICTS,
    RECORD_VERSION,
    REGION_EDGES,
    SUMMARY_VERDICTS,
    WINDOW_ENDS,
    Block,
    Record,
    Region,
    Ring,
)
from eosmuster.report.packing import KINDS, Packed, pack, unpack

NAME = "record.npz"
FORMAT = "eosmuster record"

LARGEST = 8 * 2**30
"""Bytes of a file; 20 million points against three references take 1.6 GB."""

LARGEST_HEADER = 64 * 2**20
"""Bytes of its JSON header: names, notes and texts, each once."""

_HEADER = "header.json"
_MEMBERS = {_HEADER, *(f"{kind}.npy" for kind in KINDS)}
_DAMAGED = (
    *(OSError, ValueError, KeyError, IndexError, TypeError, OverflowError, MemoryError, RecursionError),
    *(EOFError, NotImplementedError, RuntimeError, struct.error, zipfile.BadZipFile),
)


def write_record(record: Record, file: BinaryIO) -> None:
    """Write a record; the same record gives the same bytes.

    Parameters
    ----------
    file : opened for writing bytes
    """
    packed = pack(record)
    header = {"format": FORMAT, "record_version": record.version, "content": packed.content}
    with zipfile.ZipFile(cast(BinaryIO, _Stream(file)), "w", zipfile.ZIP_STORED) as archive:
        archive.writestr(zipfile.ZipInfo(_HEADER), json.dumps(header))
        for kind, array in packed.arrays.items():
            with archive.open(zipfile.ZipInfo(f"{kind}.npy"), "w", force_zip64=True) as member:
                np.lib.format.write_array(member, array, allow_pickle=False)


class _Stream:
    """A file that can only be written on: an archive comes out the same wherever it is written."""

    def __init__(self, file: BinaryIO) -> None:
        self.write, self.flush = file.write, file.flush


def read_record(path: str | os.PathLike[str]) -> Record:
    """Read a record.

    Raises
    ------
    InputError : not such a file, damaged, of another record version, too large, or with content that no run gives;
        one sentence
    """
    try:
        with Path(path).open("rb") as file:
            return load(file, str(path))
    except OSError as error:
        raise InputError(f"{path} cannot be read: {error.strerror or error}") from error


def read_checked(path: Path, digest: str) -> Record:
    """Read a record whose file has to have the SHA-256 `digest`: that of the manifest beside it.

    Raises
    ------
    InputError : it has another, or anything that `read_record` refuses
    """
    try:
        with path.open("rb") as file:
            if hashlib.file_digest(file, "sha256").hexdigest() != digest:
                raise InputError(f"{path} is not as its run wrote it: its SHA-256 is not the manifest's")
            return load(file, str(path))
    except OSError as error:
        raise InputError(f"{path} cannot be read: {error.strerror or error}") from error


def load(file: BinaryIO, where: str) -> Record:
    """Read a record from an open file; `where` begins every message. Raises as `read_record` does."""
    if (size := file.seek(0, os.SEEK_END)) > LARGEST:
        raise InputError(f"{where}: is larger than {LARGEST // 2**30} GiB, which no record is")
    try:
        with zipfile.ZipFile(file) as archive:
            _check_members(archive, size)
            header = json.loads(archive.read(_HEADER))
            content = _content(header, where)
            arrays = {kind: _array(archive.read(f"{kind}.npy"), kind) for kind in KINDS}
        record = unpack(Record, Packed(content, arrays))
        _check(record)
    except _DAMAGED as error:
        reason = " ".join(str(error).split())[:200] or type(error).__name__
        raise InputError(f"{where}: is no record of eosmuster, or is damaged ({reason})") from error
    return record


def _check_members(archive: zipfile.ZipFile, size: int) -> None:
    """Refuse anything but our members, whole and as they are: nothing in them can grow when it is read."""
    members = archive.infolist()
    if sorted(m.filename for m in members) != sorted(_MEMBERS):
        raise ValueError("not the members of a record")
    for member in members:
        if member.compress_type != zipfile.ZIP_STORED or member.flag_bits & 1:
            raise ValueError(f"{member.filename} is compressed or encrypted")
    if sum(m.file_size for m in members) > size or archive.getinfo(_HEADER).file_size > LARGEST_HEADER:
        raise ValueError("members larger than the file, or a header larger than any record's")


def _content(header: object, where: str) -> Any:
    if not isinstance(header, Mapping) or header.get("format") != FORMAT:
        raise ValueError("not the header of a record")
    version = header.get("record_version")
    if version != RECORD_VERSION or isinstance(version, bool):
        raise InputError(
            f"{where}: its record version is {str(version)[:20]}, and this is version {RECORD_VERSION}; "
            "use the version of eosmuster that wrote it"
        )
    return header["content"]


def _array(data: bytes, kind: str) -> NDArray[Any]:
    """Read one array; its size has to be that of the member, so nothing is taken that is not there."""
    member = io.BytesIO(data)
    if np.lib.format.read_magic(member) != (1, 0):
        raise ValueError("not an array as it is written here")
    shape, _, dtype = np.lib.format.read_array_header_1_0(member)
    rest = data[member.tell() :]
    if dtype != KINDS[kind] or len(shape) != 1 or shape[0] * dtype.itemsize != len(rest):
        raise ValueError(f"{kind} is not the array that it has to be")
    return np.frombuffer(rest, dtype)


def _check(record: Record) -> None:
    """Refuse content that no run gives and that views would stumble over."""
    if record.version != RECORD_VERSION:
        raise ValueError("two record versions in one file")
    for block in record.blocks:
        _check_block(block)
    for region in record.regions:
        _check_region(region)
    allowed = [
        (SUMMARY_VERDICTS, (row.verdict for row in record.summary)),
        (WINDOW_ENDS, (end for row in record.windows for end in (row.from_end, row.to_end))),
        ([unit for units in UNITS.values() for unit in units], record.display.values()),
    ]
    for known, found in allowed:
        if strange := set(found) - set(known):
            raise ValueError(f"{min(strange)!r} is none of {', '.join(known)}")


def _check_block(block: Block) -> None:
    m, n = len(block.candidates), block.temperature.size
    states = ("temperature", "pressure", "reduced_temperature", "reference", "reference_uncertainty_pct", "limit_pct")
    every = ("predicted", "deviation_pct", "probability_inside", "verdict", "note")
    shapes = {getattr(block, name).shape for name in states} | {(n,)}
    if len(block.independence) != m or shapes != {(n,)} or {getattr(block, x).shape for x in every} != {(m, n)}:
        raise ValueError(f"arrays of unlike shapes for {block.component!r}, {block.property}")
    for codes, count in ((block.verdict, len(POINT_VERDICTS)), (block.note, len(block.notes))):
        if codes.size and not 0 <= codes.min() <= codes.max() < count:
            raise ValueError(f"a verdict or note that there is not, for {block.component!r}, {block.property}")


def _check_region(region: Region) -> None:
    def is_whole(ring: Ring) -> bool:
        shape = (len(ring.reasons),)
        known = bool(ring.reasons) and set(ring.reasons) <= set(REGION_EDGES)
        return known and ring.temperature.shape == ring.pressure.shape == shape

    if not all(map(is_whole, (region.outline, *region.holes))):
        raise ValueError(f"an outline that is none, for {region.component!r}, {region.property}")

"""Running a results folder again from its own manifest: whether all is as it was, and the same comes out."""

from __future__ import annotations

import hashlib
import json
import os
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, replace
from io import RawIOBase
from pathlib import Path
from typing import Any, BinaryIO, cast

from eosmuster.drifting.agreement import DEFAULT, Agreement
from eosmuster.drifting.changes import CAUSES, Change
from eosmuster.drifting.comparing import Drift, compare
from eosmuster.drifting.evidence import evidence
from eosmuster.drifting.manifests import Difference, differences
from eosmuster.drifting.sides import (
    POINTS,
    Side,
    checked_manifest,
    outputs,
    read_side,
    sha256,
    side_of_record,
    versions,
)
from eosmuster.drifting.text import drift_text, headline, wrapped
from eosmuster.errors import InputError
from eosmuster.plan.parts import plan_part, read_part
from eosmuster.plan.reading import parse_plan
from eosmuster.plan.schema import Plan
from eosmuster.plan.states import choose_regions
from eosmuster.progress import Progress, silent
from eosmuster.quantities import shown
from eosmuster.record import Record
from eosmuster.report.cells import encoded
from eosmuster.report.folder import View, checked, save, written
from eosmuster.report.manifest import NAME as MANIFEST
from eosmuster.report.manifest import manifest_text, reference_hashes
from eosmuster.report.text import some
from eosmuster.sweeping.run import run

PLAN_FOLDER = "plan_folder"
"""Key of the manifest's ``volatile`` that says where the plan's file was: its measured files are found from there."""

_BY_VERSION = ("reference:library", "prediction:code")
"""Causes of what differs by version: the results say whether it matters."""

_REFERENCE_FILE, _MEASURED_FILE = "reference file ", "measured file "
_OTHERWISE = "the manifest says otherwise than this run: "
_MOST = 20


@dataclass(frozen=True)
class Replay:
    """What a replay showed.

    Attributes
    ----------
    folder : as it was given
    findings : what is not as the manifest says, one sentence each: outputs, reference files, measured files, and all
        else that the manifest says, but for what is volatile
    remarks : what else a reader must know, e.g. another version of the reference library
    identical, different : outputs that came out again byte for byte, and those that did not
    drift : from the folder to this run; None if the folder's tables cannot be read any more
    """

    folder: str
    findings: tuple[str, ...]
    remarks: tuple[str, ...]
    identical: tuple[str, ...]
    different: tuple[str, ...]
    drift: Drift | None

    @property
    def same(self) -> bool:
        """Whether everything is as it was, and the same numbers came out."""
        return not self.findings and self.drift is not None and not self.drift

    def __str__(self) -> str:
        return replay_text(self)


def replay(
    folder: str | os.PathLike[str],
    *,
    plan_folder: str | os.PathLike[str] | None = None,
    out: str | os.PathLike[str] | None = None,
    tolerance: float = DEFAULT,
    progress: Progress = silent,
) -> Replay:
    """Verify a results folder, run its plan again, and compare; nothing is written unless `out` says where.

    Parameters
    ----------
    plan_folder : where the plan's measured files are found from; None for what the manifest says
    out : a folder for the new results
    tolerance : relative; see `eosmuster.drifting.agreement`

    Raises
    ------
    InputError : not a results folder, of another record version, or a plan that cannot be run again
    NothingJudged : as a sweep does
    """
    agreement = Agreement(tolerance)
    path, content = checked_manifest(folder)
    names = outputs(content)
    place = None if out is None else _checked_out(out, path)
    plan = _plan(path, content, plan_folder)
    found = [*_outputs(path, names), *_measured(plan, content)]
    altered = {name for name, _ in found}
    tables = _tables(folder, altered)
    old = Side(str(folder), content, {}, {}, None, path) if tables is None else tables
    record = run(plan, progress)
    new = side_of_record(record, "this run")
    drift = None if tables is None else compare(tables, new, agreement)
    changes = drift.changes if drift else evidence(old, new).changes
    identical, different = _bytes(record, names)
    if place is not None:
        save(record, place, points=POINTS in names, overwrite=True)
    references = _references(content, changes)
    unlike = list(differences(content, _as_written(new.manifest, names)))
    return Replay(
        str(folder),
        (*(sentence for _, sentence in found), *references, *_contradictions(changes, unlike, altered)),
        tuple(_remarks(content, changes, unlike)),
        identical,
        different,
        drift,
    )


def _checked_out(out: str | os.PathLike[str], replayed: Path) -> Path:
    target = checked(out, overwrite=True)
    if target == replayed.resolve():
        raise InputError(f"--out {target} is the folder that is replayed, which stays as it is; choose another")
    return target


def _plan(folder: Path, content: Mapping[str, Any], plan_folder: str | os.PathLike[str] | None) -> Plan:
    """Read the plan out of the manifest, so that its measured files are found."""
    text, name = (content["plan"].get(key) for key in ("text", "name"))
    if not isinstance(text, str) or not isinstance(name, str):
        raise InputError(f"{folder / MANIFEST}: plan has no text and name, so it cannot be run again")
    where = f"{folder / MANIFEST}, plan"
    plan = parse_plan(text, name, where)
    if content["regions"].get("asked") is False:
        plan = choose_regions(plan, False)
    part = content.get("part")
    if isinstance(part, dict):
        plan = plan_part(plan, *read_part(f"{part.get('number')}/{part.get('of')}", where))
    if not plan.reference_files:
        return plan
    recorded = content["volatile"].get(PLAN_FOLDER)
    given = plan_folder if plan_folder is not None else recorded
    if not isinstance(given, (str, os.PathLike)) or not given:
        raise InputError(
            f"{folder}: its plan has measured files ({', '.join(plan.reference_files)}), and "
            "its manifest does not say where from; give --plan-folder DIR, the folder of the plan's file"
        )
    place = Path(given)
    if not place.is_dir():
        what = "--plan-folder" if plan_folder is not None else "the folder of the plan's file"
        hint = "" if plan_folder is not None else "; give --plan-folder DIR"
        raise InputError(f"{what} {shown(str(place), 200)} is no folder{hint}")
    return replace(plan, path=str(place / "plan.toml"))  # only its folder counts


def _tables(folder: str | os.PathLike[str], altered: set[str]) -> Side | None:
    """Read the folder's tables; None if a file that was altered cannot be read any more."""
    try:
        side = read_side(folder)
    except InputError:
        if not altered:
            raise
        return None
    return replace(side, points=None) if POINTS in altered else side


def _outputs(folder: Path, names: Mapping[str, str]) -> Iterator[tuple[str, str]]:
    """Yield name and sentence of every output that is not as its run wrote it."""
    for name, digest in names.items():
        if not (folder / name).is_file():
            yield name, f"{name} is missing"
        elif (now := sha256(folder / name)) != digest:
            yield name, f"{name} is not as its run wrote it: SHA-256 {now[:12]}, manifest {shown(digest[:12])}"


def _measured(plan: Plan, content: Mapping[str, Any]) -> Iterator[tuple[str, str]]:
    """Yield name and sentence of every measured file that is not as its run read it."""
    place = Path(plan.path).parent
    for name, digest in content["measured_files"].items() if plan.reference_files else ():
        if not (place / name).is_file():
            yield f"measured file {name}", f"measured file {name} is missing in {place}"
        elif (now := sha256(place / name)) != digest:
            was = f"manifest {shown(str(digest)[:12])}"
            yield f"measured file {name}", f"measured file {name} has changed: SHA-256 {now[:12]}, {was}"


def _references(content: Mapping[str, Any], changes: tuple[Change, ...]) -> Iterator[str]:
    """Say which reference files the run used are other ones today, and what such a change can move."""
    now = reference_hashes()
    for name, digest in content["references"].items():
        cause = next((c.cause for c in changes if c.what == f"{_REFERENCE_FILE}{name}"), "")
        meaning = f" ({CAUSES[cause]})" if cause else ""
        if name not in now:
            yield f"reference file {name} is missing today{meaning}"
        elif now[name] != digest:
            yield f"reference file {name} has changed{meaning}"


def _as_written(content: Mapping[str, Any], names: Mapping[str, str]) -> dict[str, Any]:
    """Give the manifest of a run as it reads back from a folder with the files named."""
    counted = {**content["points"], "written": POINTS in names}
    again: dict[str, Any] = json.loads(encoded(manifest_text({**content, "points": counted})))
    return again


def _contradictions(changes: Sequence[Change], unlike: Sequence[Difference], told: set[str]) -> Iterator[str]:
    """Say where the manifest itself is not what the run gives.

    The same versions give the same manifest. Other ones may word it otherwise, so then only what moves numbers, or
    follows from the plan whatever version runs it, speaks against the manifest.
    """
    other = _other_versions(changes)
    for change in changes:
        measured = change.what.startswith(_MEASURED_FILE) and change.what not in told
        moves = other and change.cause not in ("", *_BY_VERSION)
        if measured or (moves and not change.what.startswith((_MEASURED_FILE, _REFERENCE_FILE))):
            yield f"{_OTHERWISE}{change}"
    yield from (f"{_OTHERWISE}{one}" for one in unlike if one.of_the_plan or not other)


def _other_versions(changes: Sequence[Change]) -> bool:
    return any(c.cause in _BY_VERSION and not c.what.startswith(_REFERENCE_FILE) for c in changes)


def _remarks(content: Mapping[str, Any], changes: Sequence[Change], unlike: Sequence[Difference]) -> Iterator[str]:
    new = [name for name in reference_hashes() if name not in content["references"]]
    if new:
        yield f"new since then: {some(len(new), 'reference file')}, e.g. {new[0]}"
    known = versions(content)
    for change in changes:
        if change.what in known or (change.cause in _BY_VERSION and not change.what.startswith(_REFERENCE_FILE)):
            yield str(change)
    if _other_versions(changes):
        yield from (f"{_OTHERWISE}{one}" for one in unlike if not one.of_the_plan)


class _Digest(RawIOBase):
    """A file that keeps nothing but the SHA-256 of what is written."""

    def __init__(self) -> None:
        self.hash = hashlib.sha256()

    def writable(self) -> bool:
        return True

    def write(self, data: Any, /) -> int:
        self.hash.update(data)
        return len(data)


def _digest(view: View, record: Record) -> str:
    file = _Digest()
    view(record, cast(BinaryIO, file))
    return file.hash.hexdigest()


def _bytes(record: Record, names: Mapping[str, str]) -> tuple[tuple[str, ...], tuple[str, ...]]:
    """Tell which outputs come out again byte for byte, and which do not."""
    views = dict(written(record))
    same = {name: name in views and _digest(views[name], record) == digest for name, digest in names.items()}
    return tuple(n for n, s in same.items() if s), tuple(n for n, s in same.items() if not s)


def replay_text(found: Replay, width: int = 100) -> str:
    """Say what a replay showed in lines of at most `width` columns, without a last newline."""
    rows = headline(found.drift) if found.drift is not None else "the tables cannot be compared"
    answer = f"replay: {'the same' if found.same else 'differs'}; {rows}"
    files = some(len(found.identical), "file")
    again = f"{files} of {len(found.identical) + len(found.different)} came out byte for byte"
    if found.different:
        again += f", not {', '.join(found.different)}"
    lines = [*wrapped(answer, width), *wrapped(again, width)]
    for sentence in found.findings[:_MOST]:
        lines += wrapped(f"differs: {sentence}", width)
    if len(found.findings) > _MOST:
        lines.append(f"and {len(found.findings) - _MOST} more of these")
    for sentence in found.remarks[:_MOST]:
        lines += wrapped(f"note: {sentence}", width)
    if len(found.remarks) > _MOST:
        lines.append(f"and {len(found.remarks) - _MOST} more of these")
    return "\n".join([*lines, *(["", drift_text(found.drift, width)] if found.drift else [])])

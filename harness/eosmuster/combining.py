"""Parts of a run put together: the same record as if one run had swept the whole plan."""

from __future__ import annotations

import json
import os
from collections.abc import Collection, Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass, fields, replace
from pathlib import Path
from typing import Any

from eosmuster.components import equation_citations
from eosmuster.errors import InputError
from eosmuster.plan.parts import MOST_PARTS
from eosmuster.plan.reading import parse_plan
from eosmuster.plan.schema import Plan
from eosmuster.quantities import shown
from eosmuster.record import Record
from eosmuster.report.manifest import NAME as MANIFEST
from eosmuster.report.manifest import manifest, read_manifest
from eosmuster.report.record_file import NAME as RECORD_FILE
from eosmuster.report.record_file import read_checked
from eosmuster.report.text import list_within
from eosmuster.sources.library_gate import LIBRARY
from eosmuster.sweeping.measured import PREFIX as MEASURED
from eosmuster.sweeping.ordering import by_component
from eosmuster.sweeping.series import refuse_empty

_OWN = (
    *("blocks", "summary", "windows", "regions", "left_out", "conflicts"),
    *("citations", "part", "plan_title", "plan_folder"),
)
"""Fields in which parts may differ; all others are the whole plan's and the same in every part."""


@dataclass(frozen=True)
class Part:
    """One part of a run, as its folder has it."""

    folder: Path
    manifest: Mapping[str, Any]
    record: Record

    @property
    def number(self) -> tuple[int, int]:
        """Which part it is, of how many."""
        return self.record.part or (1, 1)


def combine(folders: Sequence[str | os.PathLike[str]]) -> tuple[Plan, Record]:
    """Put the parts of a run together.

    Parameters
    ----------
    folders : the results folders of all parts, in any order

    Returns
    -------
    the whole plan, and the record that one run of it gives

    Raises
    ------
    InputError : a folder that holds no part, one that was changed, a part missing or twice, or parts of different
        plans, versions, reference data or measured files; one sentence
    NothingJudged : no part has anything, as a run of the whole plan would say
    """
    parts = sorted((read_part(folder) for folder in folders), key=lambda part: part.number)
    _check_numbers(parts)
    _check_alike(parts)
    first = parts[0]
    where = f"{first.folder / MANIFEST}, plan"
    plan = parse_plan(first.record.plan_text, first.record.plan_name, where)
    record = merge(plan, parts)
    if not record.blocks:
        refuse_empty([])
    return plan, record


def read_part(folder: str | os.PathLike[str]) -> Part:
    """Read the results folder of one part.

    Raises
    ------
    InputError : it is none, or was changed since it was written
    """
    path = Path(folder)
    if not path.is_dir():
        raise InputError(f"{shown(str(path), 200)} is no folder; give the results folders of all parts")
    content = read_manifest(path)
    if content is None:
        raise InputError(f"{path} is no results folder (no {MANIFEST} of ours in it); give the folders of all parts")
    outputs = content.get("outputs")
    digest = outputs.get(RECORD_FILE) if isinstance(outputs, dict) else None
    if not isinstance(digest, str):
        raise InputError(
            f"{path} holds no part of a run (no {RECORD_FILE}); `eosmuster sweep PLAN --part K/N` writes one"
        )
    record = read_checked(path / RECORD_FILE, digest)
    if record.part is None or not 1 <= record.part[0] <= record.part[1] <= MOST_PARTS:
        raise InputError(f"{path} holds a whole run, not a part of one")
    return Part(path, content, record)


def _check_numbers(parts: Sequence[Part]) -> None:
    """Refuse a part that is missing or there twice."""
    if not parts:
        raise InputError("no part to put together; give the results folders of all parts")
    of = parts[0].number[1]
    for part in parts:
        if part.number[1] != of:
            raise InputError(
                f"{parts[0].folder} is one of {of} parts and {part.folder} one of {part.number[1]}; "
                "give the parts of one run"
            )
    holders: dict[int, Path] = {}
    for part in parts:
        number = part.number[0]
        if number in holders:
            raise InputError(f"{holders[number]} and {part.folder} both hold part {number} of {of}; give each once")
        holders[number] = part.folder
    missing = [str(number) for number in range(1, of + 1) if number not in holders]
    if missing:
        what = f"part {missing[0]} is" if len(missing) == 1 else f"parts {list_within(missing, 80)} are"
        raise InputError(f"{what} missing of the {of}; give the folders of all of them")


def _check_alike(parts: Sequence[Part]) -> None:
    """Refuse parts of different runs, and such that this installation cannot speak for."""
    first, here = parts[0], manifest(parts[0].record, {})
    for part in parts:
        for what, of_part, of_here in _of_installation(part.manifest, here):
            if of_part != of_here:
                raise InputError(f"{part.folder}: {what} {of_part} when it was run, and {of_here} here; use the same")
        for what, mine, others in _of_run(part.record, first.record):
            if mine != others:
                raise InputError(f"{part.folder} and {first.folder} differ in {what}; give the parts of one run")


def _of_installation(of_part: Mapping[str, Any], here: Mapping[str, Any]) -> Iterator[tuple[str, str, str]]:
    """Yield what was there when a part was run, and what is here: versions and reference data."""
    versions, now = (_mapping(_mapping(c.get("volatile")).get("versions")) for c in (of_part, here))
    for name in ("eosmuster", "CoolProp"):
        yield f"{name} was", shown(versions.get(name)), shown(now.get(name))
    data, today = (_mapping(content.get("references")) for content in (of_part, here))
    for name in sorted({*data, *today}):
        yield f"reference file {shown(name)} was", _digest(data, name), _digest(today, name)


def _mapping(value: object) -> Mapping[str, Any]:
    return value if isinstance(value, dict) else {}


def _digest(hashes: Mapping[str, Any], name: str) -> str:
    return f"SHA-256 {str(hashes[name])[:12]}" if name in hashes else "not there"


_NAMES = {
    "plan_name": "the name of the plan",
    "plan_text": "the plan",
    "decision": "the decision rule",
    "files": "the measured files",
}


def _of_run(mine: Record, others: Record) -> Iterator[tuple[str, str, str]]:
    """Yield what all parts of a run have in common."""
    for field in sorted(fields(Record), key=lambda field: field.name not in _NAMES):
        if field.name not in _OWN:
            what = _NAMES.get(field.name, field.name)
            here, there = (json.dumps(getattr(r, field.name), default=dict) for r in (mine, others))
            yield what, here, there


def merge(plan: Plan, parts: Sequence[Part]) -> Record:
    """Put the records of all parts of a plan together; see `combine` for what is held before."""
    names = [component.name for component in plan.components]
    rows = [replace(plan, part=part.number).rows for part in parts]
    mine = {part.number[0]: {names[row] for row in of_part} for part, of_part in zip(parts, rows, strict=True)}
    for part in parts:
        _check_components(part, mine[part.number[0]])

    record = replace(
        parts[0].record,
        plan_title=plan.title,
        part=None,
        blocks=_joined(parts, "blocks"),
        summary=_joined(parts, "summary"),
        windows=_joined(parts, "windows"),
        regions=_joined(parts, "regions"),
        left_out=_shared(parts, "left_out", names, mine),
        conflicts=_shared(parts, "conflicts", names, mine),
        citations=_citations(part.record.citations for part in parts),
    )
    return by_component(record, names)


def _joined(parts: Sequence[Part], name: str) -> tuple[Any, ...]:
    return tuple(item for part in parts for item in getattr(part.record, name))


def _shared(
    parts: Sequence[Part], name: str, components: Collection[str], mine: Mapping[int, Collection[str]]
) -> tuple[Any, ...]:
    """Join what begins with a name: of no component, it is the same in all parts; else the part's that has it."""
    common = [[item for item in getattr(part.record, name) if item[0] not in components] for part in parts]
    for part, of_part in zip(parts, common, strict=True):
        if of_part != common[0]:
            raise InputError(f"{part.folder} and {parts[0].folder} differ in {name}; give the parts of one run")
    own = (x for part in parts for x in getattr(part.record, name) if x[0] in mine[part.number[0]])
    return (*common[0], *own)


def _check_components(part: Part, mine: Collection[str]) -> None:
    """Refuse results of components that are not in the part: another version has dealt them out otherwise."""
    record = part.record
    found = {block.component for block in record.blocks} | {row.component for row in record.summary}
    found |= {row.component for row in record.windows} | {region.component for region in record.regions}
    for name in sorted(found - set(mine)):
        number, of = part.number
        raise InputError(f"{part.folder} holds results of {shown(name)}, which is not in part {number} of {of}")


def _citations(found: Iterable[Mapping[str, str]]) -> dict[str, str]:
    """Join citations by key, in the order of a run: handbooks, the library, its equations, measured files."""
    every = {key: text for citations in found for key, text in citations.items()}

    def place(key: str) -> tuple[bool, bool, bool, str]:
        return key.startswith(MEASURED), key in equation_citations(), key == LIBRARY, key

    return {key: every[key] for key in sorted(every, key=place)}

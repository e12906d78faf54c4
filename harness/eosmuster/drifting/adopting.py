"""The only way to change a baseline: with a reason, at once, and written down beside it.

``adoptions.md`` inside the baseline is a record of every adoption. It goes on from one adoption to the next, and
since no run writes such a file, a sweep never replaces a folder that has one.
"""

from __future__ import annotations

import contextlib
import getpass
import os
import shutil
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from eosmuster.drifting.agreement import DEFAULT, Agreement
from eosmuster.drifting.comparing import Drift, compare
from eosmuster.drifting.sides import OtherVersion, Side, checked_manifest, outputs, read_side, sha256, versions
from eosmuster.drifting.text import brief, cause_counts, flip, headline, name_of
from eosmuster.errors import InputError
from eosmuster.report import destination, placing
from eosmuster.report.cells import encoded
from eosmuster.report.folder import LITTER, VIEWS
from eosmuster.report.locking import WAIT, locked
from eosmuster.report.manifest import NAME as MANIFEST
from eosmuster.report.manifest import read_manifest
from eosmuster.report.mdtable import escaped
from eosmuster.report.text import some

ADOPTIONS = "adoptions.md"
LONGEST_REASON = 1000
"""Characters a reason may have: it is read in a list of many."""

_MOST_FLIPS = 40
_LARGEST = 64 * 2**20  # bytes: no record of adoptions grows so large
_HEADING = """# Adoptions

When this baseline was replaced, by whom and why; the latest comes last. `eosmuster drift BASELINE RESULTS --adopt` \
writes this file, and nothing else replaces the folder it is in.
"""


@dataclass(frozen=True)
class Adoption:
    """What an adoption did.

    Attributes
    ----------
    baseline : the folder that was replaced
    drift : from the old baseline to the new one; None if the old one is of a record version that is not read
    entry : what was added to adoptions.md
    """

    baseline: Path
    drift: Drift | None
    entry: str


def checked_reason(reason: str | None) -> str:
    """Give a reason without blanks around it.

    Raises
    ------
    InputError : none, an empty one, or one that is too long
    """
    if reason is None:
        raise InputError("--adopt replaces the baseline, so it needs a reason; give --reason TEXT")
    text = " ".join(reason.split())
    if not any(character.isalnum() for character in text):
        raise InputError('--reason is empty; say why the new results are right, e.g. --reason "new library reviewed"')
    if len(text) > LONGEST_REASON:
        raise InputError(f"--reason has {len(text)} characters; at most {LONGEST_REASON} are kept, so be brief")
    return text


def adopt(
    baseline: str | os.PathLike[str],
    results: str | os.PathLike[str],
    reason: str | None,
    tolerance: float = DEFAULT,
    wait: float = WAIT,
) -> Adoption:
    """Replace a baseline by other results, and write down when, why and what changed.

    Parameters
    ----------
    baseline, results : results folders; the latter stays as it is
    reason : why the new results are right, at most `LONGEST_REASON` characters
    tolerance : of the drift that is written down
    wait : seconds to wait for another process that writes there

    Raises
    ------
    InputError : no reason, a folder that is none of ours or holds anything else, results that are not as their run
        wrote them, or a place that cannot be written. The baseline is as it was then.
    """
    why = checked_reason(reason)
    source, content = checked_manifest(results)
    known = {*VIEWS, MANIFEST, ADOPTIONS, *LITTER, *outputs(content)}
    target = _checked_target(baseline, source, known)
    new = read_side(results)
    _refuse_altered(new, source, outputs(content))
    before = sha256(target / MANIFEST)
    drift = _drift(target, new, Agreement(tolerance))
    entry = "\n".join(_entry(target, new, drift, why, (before, sha256(source / MANIFEST)))) + "\n"
    try:
        with locked(target, wait) as alone:
            placing.recover(target, known, alone=alone)
            with placing.beside(target, known) as part:
                _copy(source, part, content)
                (part / ADOPTIONS).write_bytes(_so_far(target) + encoded(entry))
                for path in part.iterdir():
                    _onto_the_disk(path)
                destination.refuse_irreplaceable(target, known, overwrite=True)
                if sha256(target / MANIFEST) != before:
                    raise InputError(f"{target} was replaced while it was compared; ask for its drift again")
                placing.put(part, target)
    except OSError as error:
        raise InputError(f"{target}: cannot be replaced: {error.strerror or error}; it is as it was") from error
    return Adoption(target, drift, entry)


def _checked_target(baseline: str | os.PathLike[str], source: Path, known: set[str]) -> Path:
    with contextlib.suppress(OtherVersion):  # of an earlier eosmuster, and still ours
        checked_manifest(baseline)
    target = destination.destination(baseline, known, overwrite=True)
    if target == source.resolve():
        raise InputError(f"{target} is both baseline and results; there is nothing to adopt")
    return target


def _refuse_altered(side: Side, source: Path, names: Mapping[str, str]) -> None:
    missing = [name for name in names if not (source / name).is_file()]
    if missing or (missing := side.altered(names)):
        raise InputError(
            f"{side.where}: {missing[0]} is not as its run wrote it (its SHA-256 is not the manifest's), so it is no "
            "baseline; run the plan again"
        )


def _drift(target: Path, new: Side, agreement: Agreement) -> Drift | None:
    try:
        return compare(read_side(target), new, agreement)
    except OtherVersion:
        return None


def _copy(source: Path, part: Path, content: Mapping[str, Any]) -> None:
    """Copy what a run wrote, and make sure that it is that."""
    for name, digest in {**outputs(content), MANIFEST: sha256(source / MANIFEST)}.items():
        shutil.copyfile(source / name, part / name)
        if sha256(part / name) != digest:
            raise InputError(f"{source / name} changed while it was copied; try again when its run is done")


def _so_far(target: Path) -> bytes:
    """Give the record of earlier adoptions as it is, or its heading."""
    file = target / ADOPTIONS
    if not file.exists():
        return encoded(_HEADING)
    if file.stat().st_size > _LARGEST:
        raise InputError(f"{file} is larger than {_LARGEST // 2**20} MiB; put it away and start a new one")
    text = file.read_bytes()
    return text if text.endswith(b"\n") or not text else text + b"\n"


def _onto_the_disk(path: Path) -> None:
    with path.open("rb+") as file:
        os.fsync(file.fileno())


def _entry(target: Path, new: Side, drift: Drift | None, reason: str, manifests: tuple[str, str]) -> Iterator[str]:
    """Write one adoption: when, by whom, why, what it is now, and the drift in short."""
    user = _user()
    by = f" by {escaped(brief(user))}" if user else ""
    yield f"\n## {datetime.now(UTC).isoformat(timespec='seconds')}{by}\n"
    yield f"Reason: {escaped(reason, 2 * LONGEST_REASON)}\n"
    old = read_manifest(target) or {}
    yield f"- plan: {_step(*(_plan_name(content) for content in (old, new.manifest)))}"
    known = [versions({"volatile": content.get("volatile") or {}}) for content in (old, new.manifest)]
    steps = (
        f"{brief(n)} {_step(*(brief(v.get(n, '?')) for v in known))}" for n in dict.fromkeys([*known[0], *known[1]])
    )
    yield f"- versions: {escaped(', '.join(steps), 600)}"
    yield f"- SHA-256 of {MANIFEST}: {manifests[0]} -> {manifests[1]}"
    if drift is None:
        yield "- drift: not known, since the old baseline was of another record version"
        return
    yield f"- {headline(drift)}"
    if drift:
        yield f"- causes: {escaped(cause_counts(drift), 600)}"
    yield from (f"- note: {escaped(brief(remark, 400), 400)}" for remark in drift.remarks)
    for row in drift.flips[:_MOST_FLIPS]:
        yield f"- {escaped(name_of(row))}: {escaped(flip(row))}"
    if len(drift.flips) > _MOST_FLIPS:
        yield f"- and {some(len(drift.flips) - _MOST_FLIPS, 'more flipped verdict')}"


def _user() -> str:
    """Name whoever runs this: by the environment, else by the password database; "" if neither knows."""
    try:
        return getpass.getuser()
    except (ImportError, KeyError, OSError):
        return ""


def _plan_name(content: Mapping[str, Any]) -> str:
    plan = content.get("plan")
    return escaped(brief(plan.get("name", "?") if isinstance(plan, dict) else "?"))


def _step(old: str, new: str) -> str:
    return old if old == new else f"{old} -> {new}"

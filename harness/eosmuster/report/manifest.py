"""manifest.json: what a results folder was made from, so that it can be checked and run again.

Everything outside ``volatile`` follows from the plan, the reference data and the code, so two runs of the
same give the same text. ``volatile`` says when and where it was made and is never compared.
"""

from __future__ import annotations

import hashlib
import json
import math
import os
import platform
import sys
from collections.abc import Mapping
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

import numpy as np

from eosmuster import paths
from eosmuster.record import Record

NAME = "manifest.json"
FORMAT = "eosmuster results"
FORMAT_VERSION = 1

_UNKNOWN = "unknown"
_LARGEST = 64 * 2**20  # bytes: a file larger than this is not a manifest of ours


def manifest(
    record: Record, outputs: Mapping[str, str], *, points: bool = True, started: datetime | None = None
) -> dict[str, Any]:
    """Describe a run.

    Parameters
    ----------
    record : the run
    outputs : name -> SHA-256 of every other file of the folder
    points : whether points.csv is among them
    started : when the run began (with a time zone), for its duration

    Returns
    -------
    what JSON can hold; a number that is not finite is null. Keys keep this order.
    """
    return {
        "format": FORMAT,
        "format_version": FORMAT_VERSION,
        "record_version": record.version,
        "plan": {"name": record.plan_name, "title": record.plan_title, "text": record.plan_text},
        **({"part": {"number": record.part[0], "of": record.part[1]}} if record.part else {}),
        "decision": jsonable(record.decision),
        "points": {"rows": sum(block.predicted.size for block in record.blocks), "written": points},
        "summary": {"rows": len(record.summary)},
        "windows": {"rows": len(record.windows)},
        "regions": {"rows": len(record.regions), **({} if record.regions_asked else {"asked": False})},
        "measured_files": dict(record.files),
        "contested": [{"component": c, "property": p, "finding": s} for c, p, s in record.conflicts],
        "left_out": [{"what": what, "why": why} for what, why in record.left_out],
        **({"notes": [{"what": what, "note": note} for what, note in record.notes]} if record.notes else {}),
        "constants": jsonable(record.constants),
        "models": jsonable(record.models),
        "citations": jsonable(record.citations),
        "references": reference_hashes(),
        "outputs": dict(sorted(outputs.items())),
        "volatile": _volatile(started) | {"plan_folder": record.plan_folder or None},
    }


def manifest_text(content: Mapping[str, Any]) -> str:
    """Write a manifest as JSON, one key a line.

    Examples
    --------
    >>> print(manifest_text({"format": "x", "left_out": []}), end="")
    {
     "format": "x",
     "left_out": []
    }
    """
    return json.dumps(content, indent=1, ensure_ascii=False, allow_nan=False) + "\n"


def read_manifest(folder: Path) -> dict[str, Any] | None:
    """Read the manifest of a results folder; None if the folder is not one of ours."""
    try:
        file = folder / NAME
        if file.stat().st_size > _LARGEST:
            return None
        content = json.loads(file.read_text(encoding="utf-8"))
    except (OSError, ValueError, RecursionError):
        return None
    return content if isinstance(content, dict) and content.get("format") == FORMAT else None


def jsonable(value: object) -> Any:
    """Turn mappings, tuples and NumPy values into what JSON can hold.

    Examples
    --------
    >>> jsonable({"Tc": np.float64(369.89), "range": (1, float("nan"))})
    {'Tc': 369.89, 'range': [1, None]}
    """
    if isinstance(value, Mapping):
        return {str(key): jsonable(item) for key, item in value.items()}
    if isinstance(value, (list, tuple)):
        return [jsonable(item) for item in value]
    if isinstance(value, (np.ndarray, np.generic)):
        return jsonable(value.tolist())
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    return value if value is None or isinstance(value, (str, int)) else str(value)


def file_hash(path: Path) -> str:
    """Return the SHA-256 of a file, hexadecimal."""
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def reference_hashes() -> dict[str, str]:
    """Return the SHA-256 of every file of the reference data, by its path below their folder."""
    folder = paths.references_folder()
    files = (f for f in sorted(folder.rglob("*")) if f.is_file())
    relative = ((f.relative_to(folder), f) for f in files)
    return {r.as_posix(): file_hash(f) for r, f in relative if not any(p.startswith((".", "__")) for p in r.parts)}


def _volatile(started: datetime | None) -> dict[str, Any]:
    now = datetime.now(UTC)
    return {
        "versions": {
            "eosmuster": _version("eosmuster"),
            "python": platform.python_version(),
            "numpy": np.__version__,
            "CoolProp": _version("CoolProp"),
        },
        "platform": f"{platform.system()} {platform.release()} {platform.machine()}",
        "git_revision": _git_revision(Path(__file__).resolve().parents[3]),
        "finished": now.isoformat(timespec="seconds"),
        "duration_s": None if started is None else round((now - started).total_seconds(), 3),
    }


def _version(distribution: str) -> str:
    """Return the version of a package: its own word if it is loaded, else what its installer wrote down."""
    loaded = getattr(sys.modules.get(distribution), "__version__", None)
    if loaded is not None:
        return str(loaded)
    from importlib import metadata

    try:
        return metadata.version(distribution)
    except metadata.PackageNotFoundError:
        return _UNKNOWN


def _git_revision(checkout: Path) -> str | None:
    """Return the revision the source tree is at, "-dirty" behind it if it was changed; None if it is no checkout."""
    if not (checkout / ".git").exists():
        return None
    import subprocess

    # optional locks would write into the checkout
    command = ["git", "--no-optional-locks", "-C", str(checkout), "describe", "--always", "--dirty"]
    plain = {name: value for name, value in os.environ.items() if not name.startswith("GIT_")}
    try:
        done = subprocess.run(
            [*command, "--abbrev=40", "--exclude=*"], capture_output=True, text=True, timeout=5, check=True, env=plain
        )
    except (OSError, subprocess.SubprocessError):
        return None
    return done.stdout.strip() or None

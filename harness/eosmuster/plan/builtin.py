"""The plans that come with the package: TOML files beside this module, read like anybody's own."""

from __future__ import annotations

from pathlib import Path

from eosmuster.errors import InputError, suggestion
from eosmuster.plan.files import read_text
from eosmuster.plan.reading import parse_plan
from eosmuster.plan.schema import Plan
from eosmuster.quantities import shown

DEFAULT = "broad"
"""The plan that is swept where none is named."""

_FOLDER = Path(__file__).resolve().parent / "builtin"


def names() -> tuple[str, ...]:
    """Return the names of the built-in plans, the default first.

    Examples
    --------
    >>> names()
    ('broad', 'ammonia-compressor', 'ammonia-refrigeration', 'lpg-pump', 'lpg-storage')
    """
    found = sorted(path.stem for path in _FOLDER.glob("*.toml"))
    return (DEFAULT, *(name for name in found if name != DEFAULT))


def text(name: str) -> str:
    """Return the TOML of a built-in plan.

    Raises
    ------
    InputError : there is no such plan
    """
    if name not in names():
        raise InputError(f"unknown built-in plan {shown(name)}; {suggestion(name[:60], names())}")
    return read_text(_FOLDER / f"{name}.toml")


def load(name: str) -> Plan:
    """Return a built-in plan; its `path` is "".

    Raises
    ------
    InputError : there is no such plan
    """
    return parse_plan(text(name), name, f"built-in plan {name}")

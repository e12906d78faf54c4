"""Two manifests of one plan held against each other, key by key."""

from __future__ import annotations

import json
from collections.abc import Iterator, Mapping, Sequence
from typing import Any, NamedTuple

from eosmuster.drifting.text import brief

ELSEWHERE = ("measured_files", "references", "outputs", "volatile")
"""Keys that are not compared here: files are held against their hashes, and ``volatile`` is never compared."""

_COUNTS = ("points", "summary", "windows", "regions")
_ENTRIES = ("constants", "models")
_LONGEST = 80


class Difference(NamedTuple):
    """What two manifests say differently.

    Attributes
    ----------
    path : the keys that lead there, and of a list what it holds
    old, new : JSON, None where there is none
    """

    path: tuple[str, ...]
    old: str | None
    new: str | None

    @property
    def of_the_plan(self) -> bool:
        """Whether it follows from the plan, whatever version runs it: a count of rows, a whole component or model."""
        return self.path[0] in _COUNTS or (self.path[0] in _ENTRIES and len(self.path) <= 2)

    def __str__(self) -> str:
        what = ", ".join(brief(key, _LONGEST) for key in self.path)
        if self.old is None or self.new is None:
            return f"{what} {'is new' if self.old is None else 'has gone'}"
        return f"{what}: {brief(self.old, _LONGEST)} -> {brief(self.new, _LONGEST)}"


def differences(old: Mapping[str, Any], new: Mapping[str, Any]) -> Iterator[Difference]:
    """Yield all that two manifests say differently, apart from `ELSEWHERE`.

    Examples
    --------
    >>> old, new = {"points": {"rows": 7}, "models": {}}, {"points": {"rows": 8}, "models": {"PR": {}}}
    >>> [str(one) for one in differences(old, new)]
    ['points, rows: 7 -> 8', 'models, PR is new']
    """
    kept = [{key: value for key, value in content.items() if key not in ELSEWHERE} for content in (old, new)]
    yield from _unlike((), *kept)


def _unlike(path: tuple[str, ...], old: object, new: object) -> Iterator[Difference]:
    if isinstance(old, dict) and isinstance(new, dict):
        for key in {**old, **new}:
            if key not in old or key not in new:
                yield Difference(
                    (*path, str(key)), *(_json(side[key]) if key in side else None for side in (old, new))
                )
            else:
                yield from _unlike((*path, str(key)), old[key], new[key])
    elif isinstance(old, list) and isinstance(new, list):
        yield from _unlike_lists(path, list(map(_json, old)), list(map(_json, new)))
    elif _json(old) != _json(new):
        yield Difference(path, _json(old), _json(new))


def _unlike_lists(path: tuple[str, ...], old: Sequence[str], new: Sequence[str]) -> Iterator[Difference]:
    """Yield what a list lost and what it gained; the whole of it where only order or repeats differ."""
    before, now = set(old), set(new)
    yield from (Difference((*path, item), item, None) for item in old if item not in now)
    yield from (Difference((*path, item), None, item) for item in new if item not in before)
    if before == now and list(old) != list(new):
        yield Difference(path, ", ".join(old), ", ".join(new))


def _json(value: object) -> str:
    return json.dumps(value, ensure_ascii=False, sort_keys=True)

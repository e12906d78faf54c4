"""The order of everything in a record: by component, so that parts of a run can be put together."""

from __future__ import annotations

from collections.abc import Callable, Iterable, Sequence
from dataclasses import replace
from typing import TypeVar

from eosmuster.record import Record

T = TypeVar("T")


def by_component(record: Record, names: Sequence[str]) -> Record:
    """Order a record by component, in the plan's order, and leave the rest of the order as it is.

    What belongs to none of the components comes first, what a candidate cannot do at all behind everything that was
    judged.

    Parameters
    ----------
    names : of the plan's components, in its order
    """

    def ordered(items: Iterable[T], name_of: Callable[[T], str]) -> tuple[T, ...]:
        return tuple(in_order(items, names, name_of))

    rows = ordered(record.summary, lambda row: row.component)
    return replace(
        record,
        blocks=ordered(record.blocks, lambda block: block.component),
        summary=tuple(sorted(rows, key=lambda row: row.verdict == "unavailable")),
        windows=ordered(record.windows, lambda row: row.component),
        regions=ordered(record.regions, lambda region: region.component),
        left_out=ordered(record.left_out, lambda left: left[0]),
        conflicts=ordered(record.conflicts, lambda conflict: conflict[0]),
    )


def in_order(items: Iterable[T], names: Sequence[str], name_of: Callable[[T], str]) -> list[T]:
    """Sort by component, in the order of `names`; what belongs to none comes first, of equals the earlier.

    Examples
    --------
    >>> in_order(["b1", "x", "a1", "b2"], ["a", "b"], lambda item: item[0])
    ['x', 'a1', 'b1', 'b2']
    """
    place = {name: i for i, name in enumerate(names)}
    return sorted(items, key=lambda item: place.get(name_of(item), -1))

"""Two runs -> drift."""

from __future__ import annotations

import os
from collections.abc import Iterable, Iterator
from typing import TYPE_CHECKING

from eosmuster.drifting import causes, notes
from eosmuster.drifting.agreement import DEFAULT, Agreement
from eosmuster.drifting.changes import (
    APPEARED,
    CAUSES,
    FLIPPED,
    MOVED,
    VANISHED,
    Comparison,
    Key,
    RegionChange,
    RowChange,
    worst_first,
)
from eosmuster.drifting.evidence import evidence
from eosmuster.drifting.markdown import drift_markdown
from eosmuster.drifting.matching import Moved, moved
from eosmuster.drifting.points import pairs
from eosmuster.drifting.regions import region_change
from eosmuster.drifting.sides import POINTS, REGIONS, SUMMARY, WINDOWS, Side, read_side
from eosmuster.drifting.table import COLUMNS, values
from eosmuster.drifting.text import drift_text
from eosmuster.record import SummaryRow
from eosmuster.report.text import some

if TYPE_CHECKING:
    import pandas as pd


class Drift(Comparison):
    """What changed between two runs, and why; true if anything did. Printed, it is what the command line shows."""

    @property
    def table(self) -> pd.DataFrame:
        """The rows that drifted, with the columns of the CSV file."""
        import pandas as pd

        return pd.DataFrame([values(row) for row in self.rows], columns=list(COLUMNS))

    @property
    def markdown(self) -> str:
        """The drift for a reader, less than 1 MiB."""
        return drift_markdown(self)

    def __str__(self) -> str:
        return drift_text(self)


def drift(old: str | os.PathLike[str], new: str | os.PathLike[str], tolerance: float = DEFAULT) -> Drift:
    """Say what changed between two results folders, and why.

    Parameters
    ----------
    old, new : folders that ``eosmuster sweep`` wrote
    tolerance : relative; see `eosmuster.drifting.agreement`

    Raises
    ------
    InputError : not a results folder, damaged, of another record version, or a tolerance that is none
    """
    agreement = Agreement(tolerance)
    return compare(read_side(old), read_side(new), agreement)


def compare(old: Side, new: Side, agreement: Agreement) -> Drift:
    """Compare two runs row by row, and the points of the rows that changed where both have them."""
    found = evidence(old, new)
    setting = causes.Setting(old, new, found, agreement)
    unequal = {key: columns for key in old.rows if key in new.rows and (columns := _unequal(setting, key))}
    points = _points(setting, list(unequal))
    rows = [
        *(_kept(setting, key, columns, points.get(key)) for key, columns in unequal.items()),
        *_lone(setting),
    ]
    kept = sum(key in new.rows for key in old.rows)
    came_or_moved = {row.key for row in rows if row.region}
    return Drift(
        old.run,
        new.run,
        agreement.tolerance,
        tuple(worst_first(rows)),
        kept - len(unequal),
        found.changes,
        tuple(_remarks(setting, bool(unequal), bool(points))),
        sum(key in new.regions and key not in came_or_moved for key in old.regions),
    )


def _unequal(setting: causes.Setting, key: Key) -> tuple[str, ...]:
    """Name the columns of summary.csv in which a row does not agree, and those of `causes.VIEWS` that do not."""
    old, new = setting.old.rows[key], setting.new.rows[key]
    columns = [c for c in setting.agreement.moved(old, new) if c != "contested" or not _newly_compared(old, new)]
    before, now = (side.windows.get(key, ()) for side in (setting.old, setting.new))
    same = len(before) == len(now) and all(map(setting.agreement.windows, before, now))
    region = _region(setting, key)
    return (*columns, *(name for name, changed in zip(causes.VIEWS, (not same, region), strict=True) if changed))


def _newly_compared(old: SummaryRow, new: SummaryRow) -> bool:
    """Tell whether only one of two rows had another reference beside its own, which agrees: that moves nothing."""
    return {old.contested, new.contested} == {"", "no"}


def _region(setting: causes.Setting, key: Key) -> RegionChange | None:
    return region_change(setting.old.regions.get(key), setting.new.regions.get(key), setting.agreement)


def _points(setting: causes.Setting, keys: list[Key]) -> dict[Key, Moved]:
    old, new = setting.old.points, setting.new.points
    if old is None or new is None:
        return {}
    return {
        key: moved(before, now, setting.coordinates(key.property), setting.agreement)
        for key, before, now in pairs(old, new, keys)
    }


def _kept(setting: causes.Setting, key: Key, columns: tuple[str, ...], points: Moved | None) -> RowChange:
    old, new = setting.old.rows[key], setting.new.rows[key]
    why = _ordered(causes.of_kept_row(setting, key, columns, points))
    return RowChange(
        key,
        FLIPPED if old.verdict != new.verdict else MOVED,
        why,
        old,
        new,
        notes.note(setting, key, columns, why, points),
        points.points if points else None,
        points.worst if points else None,
        _region(setting, key),
    )


def _lone(setting: causes.Setting) -> Iterator[RowChange]:
    old, new = setting.old.rows, setting.new.rows
    for key in [*(k for k in old if k not in new), *(k for k in new if k not in old)]:
        why, note = causes.of_lone_row(setting, key)
        state = VANISHED if key in old else APPEARED
        region = _region(setting, key)
        yield RowChange(key, state, _ordered(why), old.get(key), new.get(key), note, region=region)


def _ordered(why: Iterable[str]) -> tuple[str, ...]:
    return tuple(sorted(why, key=list(CAUSES).index))


def _remarks(setting: causes.Setting, changed: bool, with_points: bool) -> Iterator[str]:
    sides = (setting.old, setting.new)
    for side in sides:
        for name in side.altered([SUMMARY, WINDOWS, REGIONS, *([POINTS] if with_points else [])]):
            yield f"{side.where}: {name} is not as its run wrote it (its SHA-256 is not the manifest's)"
    without = [side.where for side in sides if side.points is None]
    if changed and without:
        yield f"causes are by the means of each row, since there is no {POINTS} in {' and '.join(without)}"
    yield from _comparisons(setting)


def _comparisons(setting: causes.Setting) -> Iterator[str]:
    """Say how many rows can be compared with another reference in one of the runs alone, and are not contested."""
    old, new = setting.old.rows, setting.new.rows
    found = [new[key].contested for key in old if key in new and _newly_compared(old[key], new[key])]
    if count := found.count("no"):
        are, were = ("is", "was") if count == 1 else ("are", "were")
        yield f"{some(count, 'row')} {are} compared with another reference now, which agrees, and {were} not before"
    if count := found.count(""):
        are, were = ("is", "was") if count == 1 else ("are", "were")
        yield f"{some(count, 'row')} {were} compared with another reference before, which agreed, and {are} not now"

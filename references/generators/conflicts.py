"""Write references/conflicts.csv again: which references handed out by default contradict each other.

Every property that is watched, of every fluid: the library and all handbook sources in use are held against each
other as a precheck does it (`eosmuster.diagnose.conflicts`), each source with one vote.

    python references/generators/conflicts.py
"""

from __future__ import annotations

import csv
from collections.abc import Iterable, Iterator
from pathlib import Path

from eosmuster.components import Component, catalogue
from eosmuster.prechecks.references import WATCHED, conflict_of, sources_of
from eosmuster.sources import library

TABLE = Path(__file__).resolve().parents[1] / "conflicts.csv"
COLUMNS = ("component", "property", "alone", "sentence", "source")


def conflict_rows(components: Iterable[Component]) -> Iterator[dict[str, str]]:
    """Give a row for everything that is contested."""
    for component in components:
        for name in WATCHED:
            found = conflict_of(component, name, list(sources_of(component, name, include_excluded=False)))
            if found is not None:
                yield {
                    "component": component.name,
                    "property": name,
                    "alone": "|".join(found.alone),
                    "sentence": found.sentence,
                    "source": f"{library.LIBRARY} {library.version()}",
                }


def write() -> None:
    """Write the table."""
    with TABLE.open("w", encoding="utf-8", newline="") as stream:
        writer = csv.DictWriter(stream, COLUMNS, lineterminator="\n")
        writer.writeheader()
        writer.writerows(conflict_rows(catalogue().values()))


if __name__ == "__main__":
    write()

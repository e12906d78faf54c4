"""Write references/handbook/shared_equations.csv again: cited tables computed from the library's own equation.

A source may say so; else a table is taken for such where it agrees with the library better than two independent
equations do: by `AGREEMENT` and less, as a median, in vapor pressure and in both saturated densities.

    python references/generators/shared_equations.py
"""

from __future__ import annotations

import csv
from collections.abc import Iterable, Iterator
from pathlib import Path

import numpy as np

from eosmuster.components import Component, catalogue
from eosmuster.sources import handbook, library
from eosmuster.sources.cited import Table

TABLE = Path(__file__).resolve().parents[1] / "handbook" / "shared_equations.csv"
COLUMNS = ("component", "cas", "source", "certainty", "evidence")

AGREEMENT = 0.02
"""% of the value: a hundredth of what the handbooks of one fluid commonly differ by."""

COMPARED = ("saturation_pressure", "liquid_density", "vapor_density")

FEWEST = 3
"""Values in which a table must agree, property by property."""

STATED = {
    ("Water", "iapws-r6-95"): "the release defines IAPWS-95, which is the library's own equation of water",
}
"""(component, source) -> what the source says of itself."""


def shared_rows(components: Iterable[Component]) -> Iterator[dict[str, str]]:
    """Give a row for every table that shares its equation with the library."""
    for component in components:
        for source, tables in _by_source(component).items():
            said = STATED.get((component.name, source))
            evidence = said or _agreement(component, tables)
            if evidence:
                yield {
                    "component": component.name,
                    "cas": component.cas,
                    "source": source,
                    "certainty": "stated" if said else "by agreement",
                    "evidence": evidence,
                }


def _by_source(component: Component) -> dict[str, dict[str, Table]]:
    found: dict[str, dict[str, Table]] = {}
    for name in COMPARED if component.cas else ():
        for table in handbook.tables(component.cas, name):
            found.setdefault(table.citation, {})[name] = table
    return found


def _agreement(component: Component, tables: dict[str, Table]) -> str:
    """Say how well all properties agree; "" if one does not, or is missing."""
    said = []
    for name in COMPARED:
        if name not in tables:
            return ""
        one = tables[name]
        own = library.saturation(component, one.temperature, [name]).values[name]
        known = np.isfinite(own)
        if known.sum() < FEWEST:
            return ""
        median = float(np.median(np.abs(100.0 * (one.values[known] / own[known] - 1.0))))
        if not median < AGREEMENT:
            return ""
        said.append(f"{name.replace('_', ' ')} {median:.2g} % ({int(known.sum())} values)")
    return f"median deviations from {library.LIBRARY} {library.version()}: {', '.join(said)}"


def write() -> None:
    """Write the table."""
    with TABLE.open("w", encoding="utf-8", newline="") as stream:
        writer = csv.DictWriter(stream, COLUMNS, lineterminator="\n")
        writer.writeheader()
        writer.writerows(shared_rows(catalogue().values()))


if __name__ == "__main__":
    write()

"""Cited handbook values: correlations with their range, and tables of fixed states.

Everything is read from the CSV tables of ``references/handbook``, each row of which names its source in
``references/bibliography.bib``. Values leave here in SI and molar. A correlation is never extrapolated:
outside its range it gives NaN. Rows that grossly contradict other evidence stay in the tables, marked
``excluded`` with that evidence in their note, and are handed out only when asked for.
"""

from __future__ import annotations

import math
from collections import defaultdict
from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cache
from types import MappingProxyType

import numpy as np

from eosmuster.components import catalogue
from eosmuster.errors import InputError, suggestion
from eosmuster.reference_rows import Row, flag, number, rows
from eosmuster.sources.cited import Correlation, Table
from eosmuster.sources.correlations import FORMS
from eosmuster.sources.printed import last_digits

CORRELATION_FILES: Mapping[str, str] = MappingProxyType(
    {
        "saturation_pressure": "vapor_pressure.csv",
        "liquid_density": "liquid_density.csv",
        "enthalpy_of_vaporization": "enthalpy_of_vaporization.csv",
    }
)
SHARED_FILE = "handbook/shared_equations.csv"
TABLE_FILES = ("saturation_tables.csv", "heats_of_vaporization.csv", "normal_boiling_points.csv")


NO_WITNESS = (
    "no evidence of its own",  # it repeats another row
    "another substance's row",
    "parahydrogen",
    "a decimal point seems lost",
    "the transcription carries M",
    "a sublimation pressure",
)
"""Said in the note of an excluded row that is no witness either: its numbers are not, or not its own, measurements of
that property of that substance."""


@dataclass(frozen=True)
class Count:
    """How much one source gives of one property; `rows` counts correlations, or tabulated values."""

    property: str
    source: str
    components: int
    rows: int
    excluded: int


@dataclass(frozen=True)
class Coverage:
    """For how many components there is something of a property, rows excluded by default not counted.

    Attributes
    ----------
    property : a name of `eosmuster.quantities.PROPERTIES`
    correlations, tables : components with at least one correlation, with at least one tabulated value
    either : components with at least one of the two
    missing : components of the catalogue with a CAS number that have neither, by name
    """

    property: str
    correlations: int
    tables: int
    either: int
    missing: tuple[str, ...]


def correlations(cas: str, property: str, *, include_excluded: bool = False) -> tuple[Correlation, ...]:  # noqa: A002
    """Give the correlations of a property for the component of that CAS number; empty if there is none."""
    found = _correlations(property).get(cas, ())
    return found if include_excluded else tuple(c for c in found if not c.excluded)


def tables(cas: str, property: str, *, include_excluded: bool = False) -> tuple[Table, ...]:  # noqa: A002
    """Give the tables of a property for the component of that CAS number; empty if there is none.

    Normal boiling points are tables of `boiling_temperature` at 101325 Pa with one value each.

    Examples
    --------
    >>> water = tables("7732-18-5", "saturation_pressure")[0]
    >>> water.source, water.temperature.tolist()
    ('handbook:iapws-r6-95', [275.0, 450.0, 625.0])
    """
    found = _tables().get((cas, property), ())
    return found if include_excluded else tuple(t for t in found if not t.excluded)


def is_witness(reference: Correlation | Table) -> bool:
    """Tell whether an excluded reference may be heard as a witness all the same, by its note.

    >>> [(c.source, is_witness(c)) for c in correlations("355-25-9", "saturation_pressure", include_excluded=True)]
    [('handbook:antoine-landolt-boernstein-20', False)]
    """
    return not any(reason in reference.note for reason in NO_WITNESS)


def shares_library_equation(cas: str, source: str) -> bool:
    """Tell whether a source (as results name it) has its values of a component from the library's own equation.

    As far as ``references/handbook/shared_equations.csv`` knows: each row with the evidence, which the source states,
    or an agreement that two independent equations do not have.

    >>> shares_library_equation("7732-18-5", "handbook:iapws-r6-95")
    True
    """
    return (cas, source) in _shared()


@cache
def _shared() -> frozenset[tuple[str, str]]:
    return frozenset((row["cas"], f"handbook:{row['source']}") for _, row in rows(SHARED_FILE))


def counts() -> tuple[Count, ...]:
    """Give what there is, by property and source, excluded rows counted beside."""
    tally: dict[tuple[str, str], list[tuple[str, int, bool]]] = defaultdict(list)
    for name in CORRELATION_FILES:
        for c in (c for found in _correlations(name).values() for c in found):
            tally[c.property, c.source].append((c.cas, 1, c.excluded))
    for t in (t for found in _tables().values() for t in found):
        tally[t.property, t.source].append((t.cas, t.values.size, t.excluded))
    return tuple(_count(*key, entries) for key, entries in sorted(tally.items()))


def _count(name: str, source: str, entries: Iterable[tuple[str, int, bool]]) -> Count:
    kept = [(cas, rows) for cas, rows, excluded in entries if not excluded]
    left_out = sum(rows for _, rows, excluded in entries if excluded)
    return Count(name, source, len({cas for cas, _ in kept}), sum(rows for _, rows in kept), left_out)


def coverage() -> tuple[Coverage, ...]:
    """Give for how many components there is something, by property.

    >>> [(c.property, c.either) for c in coverage() if c.property == "boiling_temperature"]
    [('boiling_temperature', 102)]
    """
    known = {c.cas: c.name for c in catalogue().values() if c.cas}
    properties = dict.fromkeys([*CORRELATION_FILES, *sorted(name for _, name in _tables())])
    return tuple(_coverage(name, known) for name in properties)


def _coverage(name: str, known: Mapping[str, str]) -> Coverage:
    formulas = {cas for cas in known if correlations(cas, name)}
    tabulated = {cas for cas in known if tables(cas, name)}
    missing = tuple(known[cas] for cas in known if cas not in formulas | tabulated)
    return Coverage(name, len(formulas), len(tabulated), len(formulas | tabulated), missing)


@cache
def _correlations(name: str) -> Mapping[str, tuple[Correlation, ...]]:
    by_cas: dict[str, list[Correlation]] = defaultdict(list)
    for where, row in rows(f"handbook/{CORRELATION_FILES[name]}") if name in CORRELATION_FILES else ():
        by_cas[row["cas"]].append(_correlation(where, row))
    return MappingProxyType({cas: tuple(found) for cas, found in by_cas.items()})


def _correlation(where: str, row: Row) -> Correlation:
    if row["form"] not in FORMS:
        raise InputError(f"{where}: form {row['form']!r} is unknown; {suggestion(row['form'], FORMS)}")
    form = FORMS[row["form"]]
    return Correlation(
        component=row["component"],
        cas=row["cas"],
        property=form.property,
        source=f"handbook:{form.label}-{row['source']}",
        citation=row["source"],
        from_K=number(where, row, "from_K"),
        to_K=number(where, row, "to_K"),
        form=form.name,
        coefficients=tuple(number(where, row, column) for column in form.columns),
        note=row["note"],
        excluded=flag(where, row),
    )


@cache
def _tables() -> Mapping[tuple[str, str], tuple[Table, ...]]:
    grouped: dict[tuple[str, str, str, bool], list[tuple[str, Row]]] = defaultdict(list)
    for where, row in (line for file in TABLE_FILES for line in rows(f"handbook/{file}")):
        name = row.get("property", "boiling_temperature")
        grouped[row["cas"], name, row["source"], flag(where, row)].append((where, row))
    found: dict[tuple[str, str], list[Table]] = defaultdict(list)
    for (cas, name, _, _), lines in grouped.items():
        found[cas, name].append(_table(name, lines))
    return MappingProxyType({key: tuple(group) for key, group in found.items()})


def _table(name: str, lines: list[tuple[str, Row]]) -> Table:
    value_column = "value" if "value" in lines[0][1] else "temperature_K"
    states = sorted(
        (
            number(where, row, "temperature_K"),
            number(where, row, "pressure_Pa") if row.get("pressure_Pa") else math.nan,
            number(where, row, value_column),
            digit,
        )
        for (where, row), digit in zip(lines, _last_digits(lines, value_column), strict=True)
    )
    columns = np.array(states).T
    columns.setflags(write=False)  # handed out again and again
    first = lines[0][1]
    return Table(
        component=first["component"],
        cas=first["cas"],
        property=name,
        source=f"handbook:{first['source']}",
        citation=first["source"],
        temperature=columns[0],
        pressure=columns[1],
        values=columns[2],
        last_digit=columns[3],
        note="; ".join(dict.fromkeys(row["note"] for _, row in lines if row["note"])),
        excluded=flag(*lines[0]),
    )


def _last_digits(lines: list[tuple[str, Row]], value_column: str) -> list[float]:
    """Give the unit of the last printed digit, SI; pressures were printed in bar and are carried in Pa."""
    printed = last_digits([row["printed_value"] for _, row in lines], whole=lines[0][1]["printed_unit"] != "Pa")
    if lines[0][1]["printed_unit"] == "degC":
        return [float(d) for d in printed]
    scale = (number(w, row, value_column) / number(w, row, "printed_value") for w, row in lines)
    return [float(d) * s for d, s in zip(printed, scale, strict=True)]

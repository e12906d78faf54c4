"""Cited handbook values: correlations with their range, tables of fixed states, and the bibliography.

Everything is read from the CSV tables of ``references/handbook``, each row of which names its source in
``references/bibliography.bib``. Values leave here in SI and molar. A correlation is never extrapolated:
outside its range it gives NaN. Rows that grossly contradict other evidence stay in the tables, marked
``excluded`` with that evidence in their note, and are handed out only when asked for.
"""

from __future__ import annotations

import csv
import math
from collections import defaultdict
from collections.abc import Iterable, Iterator, Mapping
from dataclasses import dataclass
from functools import cache
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.errors import InputError, suggestion
from eosmuster.paths import references_folder
from eosmuster.sources.bibliography import bibliography as bibliography  # noqa: PLC0414 (handed on)
from eosmuster.sources.correlations import FORMS, Coefficients
from eosmuster.sources.inversion import invert

Floats = NDArray[np.float64]

CORRELATION_FILES: Mapping[str, str] = MappingProxyType(
    {
        "saturation_pressure": "vapor_pressure.csv",
        "liquid_density": "liquid_density.csv",
        "enthalpy_of_vaporization": "enthalpy_of_vaporization.csv",
    }
)
TABLE_FILES = ("saturation_tables.csv", "normal_boiling_points.csv")


@dataclass(frozen=True)
class Correlation:
    """One property of one component as a formula in temperature, valid from `from_K` to `to_K`.

    Attributes
    ----------
    component, cas : which substance
    property : a name of `eosmuster.quantities.PROPERTIES`
    source : key people see, ``handbook:<form>-<citation>``
    citation : key into `bibliography`
    from_K, to_K : ends of the range, both included
    form : a name of `eosmuster.sources.correlations.FORMS`
    coefficients : in that form's order
    note : what a reader must know, or ""
    excluded : True for a row left out by default; the note says on which evidence

    Examples
    --------
    >>> methane = correlations("74-82-8", "saturation_pressure")[0]
    >>> methane.source
    'handbook:wagner-mcgarry-1983'
    >>> methane(np.array([50.0, 111.67])).round(-2)
    array([    nan, 101600.])
    >>> round(methane.temperature_at(101325.0), 2)
    111.63
    """

    component: str
    cas: str
    property: str
    source: str
    citation: str
    from_K: float
    to_K: float
    form: str
    coefficients: Coefficients
    note: str = ""
    excluded: bool = False

    def __call__(self, temperature: ArrayLike) -> Floats:
        """Give the property (SI) at temperatures in K, same shape; NaN outside the range."""
        kelvin, inside = self._gated(temperature)
        result = np.full(kelvin.shape, np.nan)
        result[inside] = FORMS[self.form].value(kelvin[inside], self.coefficients)
        return result

    def slope(self, temperature: ArrayLike) -> Floats:
        """Give dp/dT in Pa/K, same shape; NaN outside the range. Only vapour pressures have one."""
        kelvin, inside = self._gated(temperature)
        log_slope = FORMS[self.form].log_slope
        if log_slope is None:
            raise InputError(f"{self.source}: {self.property} has no slope here; only vapour pressures have one")
        result = self(kelvin)
        result[inside] *= log_slope(kelvin[inside], self.coefficients)
        return result

    def _gated(self, temperature: ArrayLike) -> tuple[Floats, NDArray[np.bool_]]:
        kelvin = np.asarray(temperature, dtype=np.float64)
        return kelvin, (kelvin >= self.from_K) & (kelvin <= self.to_K)

    def temperatures_at(self, pressure: ArrayLike) -> Floats:
        """Give the boiling temperatures (K) at pressures in Pa, same shape; NaN where outside the range."""
        p = np.asarray(pressure, dtype=np.float64)
        found = invert(FORMS[self.form], self.coefficients, p.reshape(-1), (self.from_K, self.to_K))
        return found.reshape(p.shape)

    def temperature_at(self, pressure: float) -> float:
        """Give the boiling temperature (K) at one pressure in Pa; NaN where outside the range."""
        return float(self.temperatures_at(pressure))


@dataclass(frozen=True)
class Table:
    """Tabulated values of one property of one component, from one source, in order of temperature.

    Attributes
    ----------
    component, cas, property, source, citation, note, excluded : as in `Correlation`
    temperature : K, shape (n,)
    pressure : Pa where the source states the condition by pressure, else NaN; shape (n,)
    values : SI, shape (n,)
    """

    component: str
    cas: str
    property: str
    source: str
    citation: str
    temperature: Floats
    pressure: Floats
    values: Floats
    note: str = ""
    excluded: bool = False


@dataclass(frozen=True)
class Count:
    """How much one source gives of one property; `rows` counts correlations, or tabulated values."""

    property: str
    source: str
    components: int
    rows: int
    excluded: int


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


@cache
def _correlations(name: str) -> Mapping[str, tuple[Correlation, ...]]:
    by_cas: dict[str, list[Correlation]] = defaultdict(list)
    for where, row in _rows(CORRELATION_FILES[name]) if name in CORRELATION_FILES else ():
        by_cas[row["cas"]].append(_correlation(where, row))
    return MappingProxyType({cas: tuple(found) for cas, found in by_cas.items()})


def _correlation(where: str, row: Mapping[str, str]) -> Correlation:
    if row["form"] not in FORMS:
        raise InputError(f"{where}: form {row['form']!r} is unknown; {suggestion(row['form'], FORMS)}")
    form = FORMS[row["form"]]
    return Correlation(
        component=row["component"],
        cas=row["cas"],
        property=form.property,
        source=f"handbook:{form.label}-{row['source']}",
        citation=row["source"],
        from_K=_number(where, row, "from_K"),
        to_K=_number(where, row, "to_K"),
        form=form.name,
        coefficients=tuple(_number(where, row, column) for column in form.columns),
        note=row["note"],
        excluded=_flag(where, row),
    )


@cache
def _tables() -> Mapping[tuple[str, str], tuple[Table, ...]]:
    grouped: dict[tuple[str, str, str, bool], list[tuple[str, Mapping[str, str]]]] = defaultdict(list)
    for where, row in (line for file in TABLE_FILES for line in _rows(file)):
        name = row.get("property", "boiling_temperature")
        grouped[row["cas"], name, row["source"], _flag(where, row)].append((where, row))
    found: dict[tuple[str, str], list[Table]] = defaultdict(list)
    for (cas, name, _, _), lines in grouped.items():
        found[cas, name].append(_table(name, lines))
    return MappingProxyType({key: tuple(group) for key, group in found.items()})


def _table(name: str, lines: list[tuple[str, Mapping[str, str]]]) -> Table:
    value_column = "value" if "value" in lines[0][1] else "temperature_K"
    states = sorted(
        (
            _number(where, row, "temperature_K"),
            _number(where, row, "pressure_Pa") if row.get("pressure_Pa") else math.nan,
            _number(where, row, value_column),
        )
        for where, row in lines
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
        note="; ".join(dict.fromkeys(row["note"] for _, row in lines if row["note"])),
        excluded=_flag(*lines[0]),
    )


def _rows(file: str) -> Iterator[tuple[str, Mapping[str, str]]]:
    """Read a table: where each row stands, for messages, and its cells by column name."""
    with (references_folder() / "handbook" / file).open(encoding="utf-8", newline="") as stream:
        lines = csv.reader(stream)
        header = next(lines)
        for cells in lines:
            where = f"references/handbook/{file}, line {lines.line_num}"
            if len(cells) != len(header):
                raise InputError(f"{where}: {len(cells)} cells, but the header names {len(header)} columns")
            row = dict(zip(header, cells, strict=True))
            if not row["source"]:
                raise InputError(f"{where}: no source; name a key of references/bibliography.bib")
            yield where, row


def _number(where: str, row: Mapping[str, str], column: str) -> float:
    try:
        value = float(row[column])
    except ValueError:
        value = math.nan
    if not math.isfinite(value):
        raise InputError(f"{where}: {column} is {row[column]!r}; write a finite number")
    return value


def _flag(where: str, row: Mapping[str, str]) -> bool:
    if row["excluded"] not in {"yes", "no"}:
        raise InputError(f"{where}: excluded is {row['excluded']!r}; write yes or no")
    return row["excluded"] == "yes"

"""Cited critical constants, with the errors their sources state.

Read from ``references/critical_constants``, in which every row names its source in ``references/bibliography.bib``.
Rows that another source contradicts grossly stay in, marked ``excluded`` with that evidence in their note, and are
handed out only when asked for.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cache
from types import MappingProxyType

from eosmuster.reference_rows import Row, flag, number_or_none, rows
from eosmuster.sources.handbook import Count

FILE = "critical_constants/critical_constants.csv"
PREFIX = "critical:"
"""What the names of these sources begin with; the key of the citation follows."""


@dataclass(frozen=True)
class CriticalConstants:
    """Critical constants of one component from one source.

    Attributes
    ----------
    component, cas : which substance
    critical_temperature : K
    critical_pressure : Pa
    critical_density : mol/m3; sources print the critical volume, whose reciprocal this is
    acentric_factor : dimensionless. Each of the four is None where the source gives none
    errors : field name -> error the source prints beside the value, in the unit of the field; None if the source
        prints none. A coverage factor was not transcribed
    source : key people see, ``critical:<citation>``
    citation : key into `eosmuster.sources.bibliography.bibliography`
    excluded : True for a row left out by default; the note says on which evidence
    note : what a reader must know, or ""

    Examples
    --------
    >>> crc = critical_constants("74-98-6")[0]
    >>> crc.source, crc.critical_temperature, crc.critical_pressure
    ('critical:crc-95', 369.9, 4250000.0)
    >>> crc.errors["critical_temperature"], crc.errors["critical_pressure"]
    (0.1, 10000.0)
    """

    component: str
    cas: str
    critical_temperature: float | None
    critical_pressure: float | None
    critical_density: float | None
    acentric_factor: float | None
    # a plain dict: a mappingproxy can be neither pickled (process pools) nor hashed
    errors: Mapping[str, float] | None = field(hash=False)
    source: str
    citation: str
    excluded: bool = False
    note: str = ""


def critical_constants(cas: str, *, include_excluded: bool = False) -> tuple[CriticalConstants, ...]:
    """Give the critical constants of the component of that CAS number, one entry a source; empty if there is none.

    >>> [c.citation for c in critical_constants("110-82-7")]
    ['crc-95', 'passut-danner-1973']
    >>> [c.citation for c in critical_constants("110-82-7", include_excluded=True)]
    ['crc-95', 'iupac-critical-5', 'passut-danner-1973']
    """
    found = _constants().get(cas, ())
    return found if include_excluded else tuple(c for c in found if not c.excluded)


def counts() -> tuple[Count, ...]:
    """Give how many rows each source has; the property is ``critical_constants``.

    >>> sum(count.components for count in counts()) > 200
    True
    """
    everything = [c for found in _constants().values() for c in found]
    return tuple(
        Count(
            "critical_constants",
            source,
            sum(c.source == source and not c.excluded for c in everything),
            sum(c.source == source and not c.excluded for c in everything),
            sum(c.source == source and c.excluded for c in everything),
        )
        for source in sorted({c.source for c in everything})
    )


@cache
def _constants() -> Mapping[str, tuple[CriticalConstants, ...]]:
    found: dict[str, list[CriticalConstants]] = defaultdict(list)
    for where, row in rows(FILE):
        found[row["cas"]].append(_entry(where, row))
    return MappingProxyType({cas: tuple(entries) for cas, entries in found.items()})


def _entry(where: str, row: Row) -> CriticalConstants:
    volume = number_or_none(where, row, "critical_volume_m3_mol")
    return CriticalConstants(
        component=row["component"],
        cas=row["cas"],
        critical_temperature=number_or_none(where, row, "critical_temperature_K"),
        critical_pressure=number_or_none(where, row, "critical_pressure_Pa"),
        critical_density=None if volume is None else 1.0 / volume,
        acentric_factor=number_or_none(where, row, "acentric_factor"),
        errors=_errors(where, row, volume),
        source=PREFIX + row["source"],
        citation=row["source"],
        excluded=flag(where, row),
        note=row["note"],
    )


def _errors(where: str, row: Row, volume: float | None) -> Mapping[str, float] | None:
    """Give the printed errors; a relative error of the volume is the same of the density."""
    error = number_or_none(where, row, "critical_volume_error_m3_mol")
    given = {
        "critical_temperature": number_or_none(where, row, "critical_temperature_error_K"),
        "critical_pressure": number_or_none(where, row, "critical_pressure_error_Pa"),
        "critical_density": None if error is None or volume is None else error / volume**2,
    }
    return {name: value for name, value in given.items() if value is not None} or None

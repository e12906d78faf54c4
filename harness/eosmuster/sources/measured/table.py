"""The one table that every reader of measured data yields: sets of points, and what was wrong on the way.

A set holds the points of one property of one substance in one phase, from one block of one file, in SI and
molar. What could not be read is a diagnostic with file and block, and counts the values that were lost by it.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, field
from types import MappingProxyType
from typing import Any

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component

Floats = NDArray[np.float64]

ORIGINS = ("none", "author", "combined", "rounding floor")
"""Where a standard uncertainty comes from: nowhere (it is NaN); stated for the property; stated for the property
and its state together; or half a unit of the last printed digit over sqrt(3), which is more than what was stated."""

NO_UNCERTAINTY, AUTHOR, COMBINED, ROUNDING = range(len(ORIGINS))

CODES: Mapping[str, str] = MappingProxyType(
    {
        "file": "the file, or the rest of it, could not be read",
        "block": "a block could not be read",
        "substance": "the substance is unknown, ambiguous, or contradicts itself",
        "presentation": "not direct values",
        "phase": "a phase that is not judged, or that contradicts the rest",
        "state": "the state is not settled by what is given, or depends on more",
        "values": "a block without values",
        "row": "rows without a value, or that cannot be read",
        "writing": "how a file or a number is written had to be found out, or cannot be known for sure",
        "column": "a column that is not read",
        "uncertainty": "a stated uncertainty that cannot be, or a level that had to be assumed",
        "rounding": "a stated uncertainty below the rounding of the value itself",
        "repeated": "points that another block or file holds too",
    }
)
"""What the codes of diagnostics mean."""

ONLY_SAID = ("substance", "phase", "state", "writing", "uncertainty", "rounding", "repeated")
"""Codes of what is only said, and leaves nothing out, where no value was lost by it."""


@dataclass(frozen=True)
class Source:
    """Where a set comes from.

    Attributes
    ----------
    file : as it was named to the reader
    doi : of the paper, "" where the file names none
    citation : authors, title, journal, year, as far as the file has them
    descriptor : the file beside it that says how to read it, named likewise; "" where there is none
    """

    file: str
    doi: str = ""
    citation: str = ""
    descriptor: str = ""

    @property
    def name(self) -> str:
        """The DOI, else the file."""
        return self.doi or self.file

    @property
    def reference(self) -> str:
        """The whole reference on one line, as far as the file has it.

        >>> Source("lab/a.xml", "10.1234/x", "Nobody, N.: On water. J. Invented Data 7 (2031) 1").reference
        'Nobody, N.: On water. J. Invented Data 7 (2031) 1. doi:10.1234/x'
        >>> Source("lab/a.csv").reference
        'lab/a.csv, which names no publication'
        """
        link = f"doi:{self.doi}" if self.doi else ""
        said = f"{self.citation.rstrip('.')}." if self.citation and link else self.citation
        return " ".join(filter(None, (said, link))) or f"{self.file}, which names no publication"


@dataclass(frozen=True, eq=False)
class MeasuredSet:
    """Points of one property of one substance, from one block.

    Attributes
    ----------
    source, block, series : where they stand: file, block (counted from 1), and the property's number in the block
    component : the substance
    written : the substance as the file names it
    property : a name of `eosmuster.quantities.PROPERTIES`, or ``density`` (single phase)
    phase : ``liquid``, ``vapor``, ``fluid`` (the file does not tell) or ``two-phase``
    state : ``saturated`` or ``single_phase``
    method : of measurement, in the file's words; "" if it has none
    rows : (n,), number of the row in the block, or of the line in the file; counted from 1
    temperature, pressure : (n,), K and Pa, as far as they were given; NaN where not
    values : (n,), SI and molar
    standard_uncertainty : (n,) of the values, SI; NaN where there is none
    rounding : (n,), half a unit of the last printed digit over sqrt(3), SI; NaN where the digits are unknown
    temperature_uncertainty, pressure_uncertainty : (n,), standard uncertainties of the state; NaN where not given
    digits : (n,), significant digits of the printed value; 0 where unknown
    origin : (n,), index into `ORIGINS`
    level_assumed : (n,), True where an expanded uncertainty came without a usable level or coverage factor
    repeats : (n,), True for points that an earlier block or file holds already
    """

    source: Source
    block: int
    series: int
    component: Component
    written: str
    property: str
    phase: str
    state: str
    method: str
    rows: NDArray[np.int64]
    temperature: Floats
    pressure: Floats
    values: Floats
    standard_uncertainty: Floats
    rounding: Floats
    temperature_uncertainty: Floats
    pressure_uncertainty: Floats
    digits: NDArray[np.int64]
    origin: NDArray[np.int8]
    level_assumed: NDArray[np.bool_]
    repeats: NDArray[np.bool_]

    def __len__(self) -> int:
        return self.values.size


@dataclass(frozen=True, eq=False)
class BinarySet:
    """Two-phase equilibrium of two substances: bubble points, with the vapour where it was measured.

    Attributes
    ----------
    source : where it comes from
    blocks : the blocks it was joined from
    components, written : both substances, and their names in the file
    measured : what was measured, among ``pressure``, ``temperature``, ``liquid_fraction``, ``vapor_fraction``;
        the rest is the state
    method : of measurement
    temperature, pressure : (n,), K and Pa
    liquid_fraction, vapor_fraction : (n,), mole fractions of the first substance; the vapour's may be NaN
    uncertainty : standard uncertainty (n,), SI, of each measured quantity, by its name; NaN where there is none
    """

    source: Source
    blocks: tuple[int, ...]
    components: tuple[Component, Component]
    written: tuple[str, str]
    measured: tuple[str, ...]
    method: str
    temperature: Floats
    pressure: Floats
    liquid_fraction: Floats
    vapor_fraction: Floats
    uncertainty: Mapping[str, Floats]

    def __len__(self) -> int:
        return self.temperature.size


@dataclass(frozen=True)
class Diagnostic:
    """What was wrong with a file or a block, in one sentence.

    Attributes
    ----------
    file : as it was named to the reader
    block : counted from 1; 0 for the file as a whole
    code : a key of `CODES`
    sentence : what is wrong, without file and block
    lost : how many values were left out because of it; 0 where they were read all the same
    """

    file: str
    block: int
    code: str
    sentence: str
    lost: int = 0

    @property
    def left_out(self) -> bool:
        """Whether anything was not read because of it: values, or a column, a row, a block, a file."""
        return bool(self.lost) or self.code not in ONLY_SAID

    def __str__(self) -> str:
        return f"{self.file}{f', block {self.block}' if self.block else ''}: {self.sentence}"


@dataclass(frozen=True)
class Reading:
    """What one file, or many, gave.

    Attributes
    ----------
    sets, binaries : what was read
    diagnostics : what was wrong
    unread : values of properties, phases and mixtures nobody judges here, counted by what they are
    files : how many files were read
    values : how many values the files hold, read or not
    """

    sets: tuple[MeasuredSet, ...] = ()
    binaries: tuple[BinarySet, ...] = ()
    diagnostics: tuple[Diagnostic, ...] = ()
    unread: Mapping[str, int] = field(default_factory=dict)
    files: int = 0
    values: int = 0


COLUMNS = (
    *("doi", "file", "block", "row", "component", "cas", "property", "phase", "state"),
    *("temperature_K", "pressure_Pa", "value", "standard_uncertainty", "uncertainty_from", "level_assumed"),
    *("digits", "method", "repeated"),
)
"""The columns of `columns`."""


def columns(sets: Iterable[MeasuredSet]) -> dict[str, Any]:
    """Give the points of sets as one table: column name -> one value a point, in the order of `COLUMNS`.

    Examples
    --------
    >>> {name: len(column) for name, column in columns([]).items()}["value"]
    0
    """
    table: dict[str, list[Any]] = {name: [] for name in COLUMNS}
    for one in sets:
        n = len(one)
        for name, value in _shared(one).items():
            table[name].extend([value] * n)
        for name, values in _own(one).items():
            table[name].extend(values)
    return table


def _shared(one: MeasuredSet) -> dict[str, Any]:
    where = {"doi": one.source.doi, "file": one.source.file, "block": one.block, "method": one.method}
    what = {"component": one.component.name, "cas": one.component.cas, "property": one.property}
    return where | what | {"phase": one.phase, "state": one.state}


def _own(one: MeasuredSet) -> dict[str, Sequence[Any]]:
    return {
        "row": one.rows.tolist(),
        "temperature_K": one.temperature.tolist(),
        "pressure_Pa": one.pressure.tolist(),
        "value": one.values.tolist(),
        "standard_uncertainty": one.standard_uncertainty.tolist(),
        "uncertainty_from": [ORIGINS[code] for code in one.origin],
        "level_assumed": one.level_assumed.tolist(),
        "digits": one.digits.tolist(),
        "repeated": one.repeats.tolist(),
    }

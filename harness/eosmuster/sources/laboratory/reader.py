"""Own laboratory data in CSV: with a Table Schema descriptor beside the file, or with units in the header.

Each line is a state with the values measured at it::

    component, temperature [degC], saturation_pressure [kPa], u(saturation_pressure) [kPa]
    propane, 20.00, 836.4, 0.3

Quantities are the properties of `eosmuster.quantities.PROPERTIES`, ``density`` (single phase, with temperature,
pressure and phase), ``temperature`` and ``pressure``. ``u(...)`` is a standard uncertainty, ``U(..., k=2)`` an
expanded one. What cannot be read is a diagnostic, never an exception, and nothing is guessed silently.
"""

from __future__ import annotations

from collections import defaultdict
from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path

from eosmuster.components import Component, find
from eosmuster.errors import InputError
from eosmuster.quantities import shown
from eosmuster.sources.laboratory.columns import (
    DIMENSIONS,
    STATE,
    Column,
    Descriptor,
    column,
    descriptor_beside,
    holds_values,
)
from eosmuster.sources.laboratory.points import beside, sets_of
from eosmuster.sources.laboratory.table import Key, Table
from eosmuster.sources.laboratory.text import DELIMITERS, LARGEST_FILE, decoded, delimiter_of, header_of, lines_of
from eosmuster.sources.measured.faults import listed
from eosmuster.sources.measured.table import Diagnostic, MeasuredSet, Reading, Source

Line = tuple[int, list[str]]
"""Its number, and its cells."""

VALUES = tuple(name for name in DIMENSIONS if name not in STATE)
"""Quantities whose columns hold measured values."""


def read_file(path: Path, shown_as: str = "", own: Sequence[Component] = ()) -> Reading:
    """Read one CSV file.

    Parameters
    ----------
    path : of the file; its descriptor is looked for beside it
    shown_as : its name in diagnostics and sources; the path where none is given
    own : components that are known besides the catalogue, by their names

    Returns
    -------
    whatever could be read, and a diagnostic for everything that could not. Repeated points are not marked yet.
    """
    name = shown_as or str(path)
    try:
        if path.stat().st_size > LARGEST_FILE:
            raise InputError(f"it is larger than {LARGEST_FILE >> 20} MiB")
        data, descriptor = path.read_bytes(), descriptor_beside(path)
    except OSError as error:
        return _refused(name, f"cannot be opened: {error.strerror}")
    except InputError as error:
        return _refused(name, str(error))
    return read_text(data, name, descriptor, own)


def read_text(data: bytes, name: str, descriptor: Descriptor | None = None, own: Sequence[Component] = ()) -> Reading:
    r"""Read the bytes of a CSV file, as `read_file` does.

    Examples
    --------
    >>> reading = read_text(b"component,temperature [K],saturation_pressure [bar]\npropane,300,9.978\n", "a.csv")
    >>> reading.sets[0].values, reading.sets[0].component.name
    (array([997800.]), 'n-Propane')
    """
    descriptor = descriptor or Descriptor()
    text, remark = decoded(data)
    told = [Diagnostic(name, 0, "writing", remark)] if remark else []
    try:
        delimiter, lines = _lines(text, descriptor)
    except InputError as error:
        return _refused(name, str(error), told)
    if delimiter != "," and not descriptor.delimiter:
        told.append(Diagnostic(name, 0, "writing", f"its cells are delimited by {DELIMITERS[delimiter]}, it seems"))
    columns_told, columns = _columns(lines, name, descriptor)
    whole, whole_told = _whole(name, descriptor, columns)
    strays, rows = _strays(name, lines, descriptor)
    finder = _Finder(own)
    table = Table(rows, columns, whole, descriptor.missing, finder)
    lost = sum(one.lost for one in (*columns_told, *strays))
    beside_it = Path(name).with_name(descriptor.file).as_posix() if descriptor.file else ""
    source = Source(name, citation=descriptor.citation, descriptor=beside_it)
    return _reading(table, finder, source, [*told, *columns_told, *whole_told, *strays], lost)


def _refused(name: str, why: str, before: Sequence[Diagnostic] = ()) -> Reading:
    return Reading(diagnostics=(*before, Diagnostic(name, 0, "file", why)), files=1)


def _lines(text: str, descriptor: Descriptor) -> tuple[str, list[Line]]:
    """Give the delimiter and all lines, the header first."""
    header = header_of(text)
    if not header:
        raise InputError("it is empty")
    if "\0" in text:
        raise InputError("it holds NUL characters, so it is no table of text")
    delimiter = descriptor.delimiter or delimiter_of(header)
    if len(delimiter) != 1:
        raise InputError(f"its delimiter is declared as {shown(delimiter)}; valid is one character")
    lines = list(lines_of(text, delimiter))
    if not lines:
        raise InputError("it holds nothing but empty cells")
    return delimiter, lines


def _whole(name: str, descriptor: Descriptor, columns: dict[Key, Column]) -> tuple[dict[str, str], list[Diagnostic]]:
    """Give what a descriptor says of all lines, where no column says it of each."""
    twice = [key for key in descriptor.whole if (key, False) in columns]
    told = [
        Diagnostic(name, 0, "column", f"its descriptor names a {key}, but there is a column of it") for key in twice
    ]
    return {key: text for key, text in descriptor.whole.items() if key not in twice}, told


def _strays(name: str, lines: Sequence[Line], descriptor: Descriptor) -> tuple[list[Diagnostic], list[Line]]:
    """Leave out the lines that have another number of cells than the header: a value of each property a line."""
    (first, header), rows = lines[0], lines[1:]
    fitting = [(number, cells) for number, cells in rows if len(cells) == len(header)]
    strays = [(number, cells) for number, cells in rows if len(cells) != len(header)]
    if not strays:
        return [], fitting
    number, cells = strays[0]
    named = listed("line", [line for line, _ in strays])
    sentence = (
        f"{named} left out: another number of cells than the {len(header)} of the header in line {first}, "
        f"{len(cells)} in line {number}; a decimal comma or a delimiter in a text does that"
    )
    values = sum(holds_values(title, descriptor.fields.get(title, {})) for title in header)
    return [Diagnostic(name, 1, "row", sentence, len(strays) * values)], fitting


def _columns(lines: Sequence[Line], name: str, descriptor: Descriptor) -> tuple[list[Diagnostic], dict[Key, Column]]:
    """Find what the columns hold; a column that is not known, or holds what another does too, is not read."""
    header = lines[0][1]
    told: list[Diagnostic] = []
    found: dict[Key, list[Column]] = defaultdict(list)
    for place, title in enumerate(header):
        try:
            one = column(title, place, descriptor.fields.get(title, {}))
        except InputError as error:
            told.append(Diagnostic(name, 0, "column", str(error), _values(lines, place, descriptor)))
        else:
            found[one.quantity, one.uncertainty].append(one)
    told += (
        Diagnostic(name, 0, "column", f"its descriptor has a field {shown(title)} that is no column")
        for title in sorted(descriptor.fields.keys() - set(header))
    )
    for (quantity, _), several in found.items():
        if len(several) > 1:
            titles = " and ".join(shown(one.title) for one in several)
            sentence = f"{titles} are both {quantity}; neither is read"
            lost = sum(_values(lines, one.place, descriptor) for one in several)
            told.append(Diagnostic(name, 0, "column", sentence, lost))
    return told, {key: several[0] for key, several in found.items() if len(several) == 1}


def _values(lines: Sequence[Line], place: int, descriptor: Descriptor) -> int:
    """Count the measured values in a column, whether or not it can be read."""
    header = lines[0][1]
    if not holds_values(header[place], descriptor.fields.get(header[place], {})):
        return 0
    return sum(len(row) == len(header) and row[place] not in descriptor.missing for _, row in lines[1:])


@dataclass
class _Finder:
    """Finds components by name, remembers which, and knows those of the plan besides the catalogue."""

    own: Sequence[Component]
    found: dict[str, Component | str] = field(default_factory=dict)

    def __call__(self, written: str) -> Component:
        if written not in self.found:
            self.found[written] = self._find(written)
        found = self.found[written]
        if isinstance(found, str):
            raise InputError(found)
        return found

    def _find(self, written: str) -> Component | str:
        for one in self.own:
            if one.name.casefold() == written.casefold():
                return one
        try:
            return find(written)
        except InputError as error:
            return str(error)

    def told(self, name: str) -> list[Diagnostic]:
        """Say which components the file names in two ways."""
        names: dict[str, list[str]] = defaultdict(list)
        for written, one in self.found.items():
            if not isinstance(one, str):
                names[one.name].append(written)
        return [
            Diagnostic(name, 1, "substance", f"{' and '.join(map(shown, several))} are the same, {component}")
            for component, several in names.items()
            if len(several) > 1
        ]


def _reading(table: Table, finder: _Finder, source: Source, told: Sequence[Diagnostic], lost: int) -> Reading:
    name = source.file
    sets: list[MeasuredSet] = []
    found, values = list(told), lost
    for quantity in VALUES:
        more, wrong, count = sets_of(table, quantity, source)
        sets, values = sets + more, values + count
        found += wrong
    if not any((quantity, False) in table.columns for quantity in VALUES):
        found.append(Diagnostic(name, 0, "file", f"no column holds measured values; valid: {', '.join(VALUES)}"))
    found += (*beside(table, name), *finder.told(name))
    return Reading(tuple(sets), diagnostics=tuple(found), files=1, values=values)

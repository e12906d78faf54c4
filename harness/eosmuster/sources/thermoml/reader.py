"""Measured data in ThermoML, the IUPAC standard for thermodynamic property data, both forms of the archive.

Sources: Frenkel et al., Pure Appl. Chem. 78 (2006) 541, doi 10.1351/pac200678030541, and the schema's version 4.0.
Pure substances are read into `MeasuredSet`, bubble points of two into `BinarySet`. A bad block or file is a
diagnostic, never an exception that loses the rest.
"""

from __future__ import annotations

import re
from collections import Counter, defaultdict
from pathlib import Path
from typing import BinaryIO

from eosmuster.components import Component
from eosmuster.errors import InputError
from eosmuster.quantities import shown
from eosmuster.sources.measured.substances import Description, resolve
from eosmuster.sources.measured.table import Diagnostic, MeasuredSet, Reading, Source
from eosmuster.sources.thermoml.binary import Equilibrium
from eosmuster.sources.thermoml.block import Block
from eosmuster.sources.thermoml.header import Reference, description, references
from eosmuster.sources.thermoml.joining import joined
from eosmuster.sources.thermoml.nodes import text, texts
from eosmuster.sources.thermoml.shape import BLOCK, ROW, Node, Shape, nodes
from eosmuster.sources.thermoml.stream import BrokenOff, read_parts

_GIVEN_NAMES = re.compile(r"\s*\[[^\[\]]*\]\Z")
_LONGEST_CITATION = 600
"""Characters; a sound citation is far shorter."""


def read_file(path: Path, shown_as: str = "") -> Reading:
    """Read one ThermoML file.

    Parameters
    ----------
    path : of the file
    shown_as : its name in diagnostics and sources; the path where none is given

    Returns
    -------
    whatever could be read, and a diagnostic for everything that could not; nothing is raised for bad content.
    Repeated points are not marked yet: `eosmuster.sources.measured.repeats.combined` does that, for one file or many.
    """
    name = shown_as or str(path)
    try:
        with path.open("rb") as stream:
            return read_stream(stream, name)
    except OSError as error:
        return Reading(diagnostics=(Diagnostic(name, 0, "file", f"cannot be opened: {error.strerror}"),), files=1)


def read_stream(stream: BinaryIO, name: str) -> Reading:
    """Read ThermoML from a stream of bytes, as `read_file` does.

    Examples
    --------
    >>> import io
    >>> print(read_stream(io.BytesIO(b"<html/>"), "lab/page.xml").diagnostics[0])
    lab/page.xml: it is not ThermoML: its root is 'html' of the namespace ''
    """
    file = _File(name)
    try:
        read_parts(stream, file.take)
    except BrokenOff as error:
        file.break_off(str(error), error.skipped)
    return file.reading()


class _File:
    """Takes the parts of one file, and gives what they hold."""

    def __init__(self, name: str) -> None:
        self._name = name
        self._source = Source(name)
        self._compounds = Compounds()
        self._block = Block(1, self._compounds)
        self._sets: list[MeasuredSet] = []
        self._binaries: list[Equilibrium] = []
        self._diagnostics: list[Diagnostic] = []
        self._unread: Counter[str] = Counter()
        self._values = 0

    def take(self, kind: str, shape: Shape, texts: list[str], skipped: int) -> bool:
        """Take one part; False if the rest of the block is not wanted."""
        if kind == ROW:
            return self._block.add(shape, texts)
        if kind == BLOCK:
            self._close(skipped)
            return True
        elements = nodes(shape, texts)
        if kind == "Citation":
            self._source = cited(self._name, elements)
        elif kind == "Compound":
            self._compounds.add(elements)
        else:
            self._block.declare(kind, elements)
        return True

    def _close(self, skipped: int) -> None:
        """Take what the block that ends has, and make ready for the next."""
        block = self._block
        self._sets += block.sets(self._source)
        if block.binary is not None:
            self._binaries.append(block.binary.equilibrium(block.number))
        diagnostics, unread, values = block.account(self._name, skipped)
        self._diagnostics += diagnostics
        self._unread += unread
        self._values += values
        self._block = Block(block.number + 1, self._compounds)

    def break_off(self, why: str, skipped: int) -> None:
        """Note that the rest cannot be read; rows of a block that has not ended are left out."""
        block, lost = self._block, self._block.seen + skipped
        begun = f"; what block {block.number} held so far is left out" if block.begun else ""
        self._diagnostics.append(Diagnostic(self._name, 0, "file", f"{why}{begun}", lost))
        self._values += lost

    def reading(self) -> Reading:
        """Give what was read."""
        binaries, diagnostics, unread = joined(self._source, self._binaries)
        return Reading(
            sets=tuple(self._sets),
            binaries=tuple(binaries),
            diagnostics=(*self._diagnostics, *diagnostics),
            unread=dict(self._unread + unread),
            files=1,
            values=self._values,
        )


class Compounds:
    """The compounds of a file; called with a block's references, gives the substance and the file's name for it."""

    def __init__(self) -> None:
        self._described: dict[Reference, set[Description]] = defaultdict(set)
        self._found: dict[Description, Component | str] = {}

    def add(self, elements: list[Node]) -> None:
        """Take a ``Compound``."""
        for reference in references(elements):
            self._described[reference].add(description(elements))

    def __call__(self, pointers: tuple[Reference, ...]) -> tuple[Component, str]:
        """Find a substance; raises `InputError` with the reason if it cannot be told."""
        found = [self._described[one] for one in pointers if one in self._described]
        meant = set.intersection(*found) if found else set()
        if len(meant) != 1:
            named = ", ".join(f"{kind} {number}" for kind, number in pointers) or "nothing"
            which = "several compounds of the file are" if found else "no compound of the file is"
            raise InputError(f"its substance is {shown(named)}, which {which}")
        (said,) = meant
        if said not in self._found:
            try:
                self._found[said] = resolve(said)
            except InputError as error:
                self._found[said] = str(error)
        resolved = self._found[said]
        if isinstance(resolved, str):
            raise InputError(resolved)
        return resolved, next(iter(said.names), said.inchikey or said.cas)


def cited(name: str, elements: list[Node]) -> Source:
    r"""Read a ``Citation``: authors: title. journal volume (year) pages.

    The archive writes given names in brackets behind the initials, which are left out.

    >>> cited("a.xml", [("sAuthor", "Nobody, N.[Nora]"), ("sTitle", "On water."), ("yrPubYr", "2031")]).citation
    'Nobody, N.: On water. (2031)'
    """
    journal = " ".join(filter(None, (text(elements, "sPubName"), text(elements, "sVol"))))
    year = text(elements, "yrPubYr")
    where = " ".join(filter(None, (journal, f"({year})" if year else "", text(elements, "sPage"))))
    people = "; ".join(_GIVEN_NAMES.sub("", author) for author in texts(elements, "sAuthor"))
    title = text(elements, "sTitle").rstrip(".")
    what = " ".join(filter(None, (f"{title}." if title else "", where)))
    return Source(name, text(elements, "sDOI"), ": ".join(filter(None, (people, what)))[:_LONGEST_CITATION])

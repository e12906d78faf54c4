"""One ThermoML block while it is read: what of it is wanted, its rows, and an account of every value in it."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass, field

from eosmuster.components import Component
from eosmuster.errors import InputError
from eosmuster.sources.measured.table import Diagnostic, MeasuredSet, Source
from eosmuster.sources.thermoml.binary import BinaryRows, is_binary
from eosmuster.sources.thermoml.header import Header, Reference
from eosmuster.sources.thermoml.rows import Rows
from eosmuster.sources.thermoml.shape import VALUE, Node, Shape, nodes
from eosmuster.sources.thermoml.wanted import Refused, Wanted, is_ours, wanted

Known = Callable[[tuple[Reference, ...]], tuple[Component, str]]
"""Finds the substance a block points at, and the name the file has for it; raises `InputError` if it cannot."""

Lost = tuple[str, str, int]
"""Code, sentence and lost values of a diagnostic."""


@dataclass
class Block:
    """A block, from its first declaration to its end.

    Attributes
    ----------
    number : counted from 1
    known : finds substances
    header : what it declares
    pure, binary : where its rows go, if they are wanted
    component, written : of a pure substance
    refused : properties of ours that cannot be read
    whole : why nothing of the block can be read, as code and sentence
    begun : whether it has values
    values : how many values were seen outside `pure` and `binary`
    """

    number: int
    known: Known
    header: Header = field(default_factory=Header)
    pure: Rows | None = None
    binary: BinaryRows | None = None
    component: Component | None = None
    written: str = ""
    refused: list[Refused] = field(default_factory=list)
    whole: tuple[str, str] | None = None
    begun: bool = False
    values: int = 0

    def declare(self, kind: str, elements: list[Node]) -> None:
        """Take a declaration; one that comes after the first row makes the block unreadable."""
        if not self.begun:
            self.header.add(kind, elements)
            return
        self.values = self.seen
        self.pure = self.binary = None
        self.whole = "block", f"a {kind} is declared after its first values"

    @property
    def seen(self) -> int:
        """How many values its rows held so far, but those that were skipped."""
        taker = self.pure or self.binary
        return self.values + (sum(taker.seen.values()) if taker is not None else 0)

    def add(self, shape: Shape, texts: list[str]) -> bool:
        """Take a row; False if the rest of the block is not wanted."""
        if not self.begun:
            self.begun = True
            self._begin()
        taker = self.pure or self.binary
        if taker is not None:
            taker.add(shape, texts)
            return True
        self.values += sum(name == VALUE for name, _ in nodes(shape, texts))
        return False

    def _begin(self) -> None:
        header = self.header
        if header.ambiguous():
            self.whole = "block", "a number is missing, or stands for two properties or two variables"
        elif len(header.components) == 1 and any(map(is_ours, header.properties)):
            self._begin_pure()
        elif len(header.components) == 2 and is_binary(header):
            self.binary = BinaryRows.of(header, self.known)

    def _begin_pure(self) -> None:
        try:
            self.component, self.written = self.known(self.header.components[0])
        except InputError as error:
            self.whole = "substance", str(error)
            return
        found = [wanted(self.header, p, self.component) for p in self.header.properties if is_ours(p)]
        self.refused = [one for one in found if isinstance(one, Refused)]
        chosen = [one for one in found if isinstance(one, Wanted)]
        if chosen:
            self.pure = Rows(self.header, chosen)

    def sets(self, source: Source) -> list[MeasuredSet]:
        """Give the sets of a pure substance."""
        if self.pure is None or self.component is None:
            return []
        return self.pure.sets(source, self.number, self.component, self.written)

    def account(self, file: str, skipped: int) -> tuple[list[Diagnostic], Counter[str], int]:
        """Close the block: diagnostics, values nobody judges by what they are, and all values there were."""
        taker = self.pure or self.binary
        if not self.begun:
            return [Diagnostic(file, self.number, "values", "it has no values")], Counter(), 0
        if taker is None:
            told, nobodys = self._unread(self.values + skipped)
            return [Diagnostic(file, self.number, *one) for one in told], nobodys, self.values + skipped
        found = taker.diagnostics(file, self.number)
        for one in self.refused:
            lost = taker.seen[one.declared.number]
            found.append(Diagnostic(file, self.number, one.code, f"{one.declared.name}: {one.sentence}", lost))
        accounted = {one.declared.number for one in self.refused} | taker.read
        names = {p.number: p.name for p in self.header.properties}
        unread: Counter[str] = Counter()
        for number, count in taker.seen.items():
            if number not in accounted:
                unread[names.get(number, "undeclared")] += count
        return found, +unread, sum(taker.seen.values())

    def _unread(self, values: int) -> tuple[list[Lost], Counter[str]]:
        """Account for the values of a block of which nothing is read."""
        if self.whole is not None:
            return [(*self.whole, values)], Counter()
        if not self.header.components:
            return [("block", "it names no substance", values)], Counter()
        if self.refused:  # which values are of which property is not looked into
            first, *others = [(one.code, f"{one.declared.name}: {one.sentence}") for one in self.refused]
            return [(*first, values), *((*one, 0) for one in others)], Counter()
        label = self.header.names if len(self.header.components) == 1 else f"{self.header.names} (mixture)"
        return [], Counter({label: values})

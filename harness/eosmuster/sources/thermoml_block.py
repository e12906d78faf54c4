"""One ThermoML block while it is read: what of it is wanted, its rows, and an account of every value in it."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable
from dataclasses import dataclass, field

from eosmuster.components import Component
from eosmuster.errors import InputError
from eosmuster.sources.measured import Diagnostic, MeasuredSet, Source
from eosmuster.sources.thermoml_binary import BinaryRows, is_binary
from eosmuster.sources.thermoml_header import Header, Reference
from eosmuster.sources.thermoml_rows import Rows
from eosmuster.sources.thermoml_stream import VALUE, Node
from eosmuster.sources.thermoml_wanted import Refused, Wanted, is_ours, wanted

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
    refused : properties of ours that cannot be read, or one reason for the whole block
    unread : what the rest of its values is counted as
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

    def add(self, row: list[Node]) -> bool:
        """Take a row; False if the rest of the block is not wanted."""
        if not self.begun:
            self.begun = True
            self._begin()
        taker = self.pure or self.binary
        if taker is not None:
            taker.add(row)
            return True
        self.values += sum(name == VALUE for name, _ in row)
        return not self.header.components  # a reaction is no block, and nothing would end the skipping

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
            return self._account_of_unread(file, self.values + skipped)
        found = taker.diagnostics(file, self.number)
        found += [
            Diagnostic(
                file, self.number, one.code, f"{one.declared.name}: {one.sentence}", taker.seen[one.declared.number]
            )
            for one in self.refused
        ]
        accounted = {one.declared.number for one in self.refused} | taker.read
        names = {p.number: p.name for p in self.header.properties}
        unread = Counter({names.get(n, "undeclared"): count for n, count in taker.seen.items() if n not in accounted})
        return found, +unread, sum(taker.seen.values())

    def _account_of_unread(self, file: str, values: int) -> tuple[list[Diagnostic], Counter[str], int]:
        if self.whole is not None:
            return [Diagnostic(file, self.number, *self.whole, values)], Counter(), values
        if not self.header.components:
            return [Diagnostic(file, self.number, "block", "it names no substance", values)], Counter(), values
        if self.refused:
            lost = [values] + [0] * (len(self.refused) - 1)  # what lies in which of several is not looked into
            sentences = [(one.code, f"{one.declared.name}: {one.sentence}") for one in self.refused]
            return (
                [Diagnostic(file, self.number, *s, n) for s, n in zip(sentences, lost, strict=True)],
                Counter(),
                values,
            )
        label = self.header.names if len(self.header.components) == 1 else f"{self.header.names} (mixture)"
        return [], Counter({label: values}), values

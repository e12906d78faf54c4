"""A shortcut through ThermoML: rows written like one that was parsed before are read by a regular expression.

Nine tenths of a file are rows, and those of a block are written alike but for their numbers. Such a row is cut
out of what the parser gets, and handed out as it would have been. The expression allows for no more than the bare
form: names without attributes, texts without references, blanks in between. Where anything could give the same
bytes another meaning (a comment, a CDATA section, another default namespace, another encoding, a tag that has not
ended) nothing is cut out, and the parser reads everything. A test holds both ways against each other.
"""

from __future__ import annotations

import re
from functools import lru_cache
from typing import Protocol

from eosmuster.sources.thermoml.shape import NAMESPACE, ROW, Shape

_BEGIN, _END = f"<{ROW}>".encode(), f"</{ROW}>".encode()
_ROOT = re.compile(rb"<(?:[\w.-]+:)?DataReport[\s>]")
_SIMPLE_TAG = re.compile(rb"</?[A-Za-z][A-Za-z0-9_.-]*[ \t\r\n]*>[ \t\r\n]*\Z")
_OTHER_MARKUP = re.compile(rb"<[!?]")
_BLANKS, _TEXT = "[ \t\r\n]*", "([ \t\r\n!-%'-;=?-~]*)"  # printable ASCII but & < >
_TAIL = 200
_MOST_SHAPES, _LONGEST_SHAPE = 8, 200
_MOST_HELD = 1 << 20
"""Bytes of a row that has not ended; a longer one is left to the parser."""


class Parser(Protocol):
    """What the shortcut needs of the parser."""

    plain: bool
    """False where bytes may mean something else than they seem to."""

    @property
    def begun(self) -> bool:
        """Whether the root was there."""

    @property
    def shapes(self) -> list[Shape]:
        """Shapes of the rows that were parsed, the latest last."""

    def parse(self, data: bytes) -> None:
        """Parse the next bytes."""

    def expects_rows(self) -> bool:
        """Tell whether a row may come next, and nothing is open but its block."""

    def take_rows(self, shape: Shape, rows: list[list[str]], lines: int) -> None:
        """Take rows that were not parsed, and how many lines they filled."""


class Shortcut:
    """Feeds a parser with everything but the rows it need not see."""

    def __init__(self, parser: Parser) -> None:
        self._parser = parser
        self._held = b""
        self._tail = b""

    def feed(self, chunk: bytes) -> None:
        """Take the next bytes of the file."""
        data, self._held = self._held + chunk, b""
        text, done = "", 0
        while self._parser.plain:
            begin = data.find(_BEGIN, done)
            if begin < 0:
                break
            end = data.find(_END, begin)
            if end < 0:
                if len(data) - begin < _MOST_HELD:
                    self._pass(data[done:begin])
                    self._held = data[begin:]
                    return
                break
            text = text or data.decode("latin-1")  # one character a byte, and the expression knows only ASCII
            self._pass(data[done:begin])
            done = self._cut(data, text, begin)
            if done == begin:
                done = end + len(_END)
                self._pass(data[begin:done])
        self._pass(data[done:])

    def close(self) -> None:
        """Take the end of the file."""
        held, self._held = self._held, b""
        self._pass(held)

    def _cut(self, data: bytes, text: str, begin: int) -> int:
        """Hand out the rows that begin here, and give where they end; where they begin, if none can be cut out."""
        if not (self._parser.expects_rows() and _SIMPLE_TAG.search(self._tail)):
            return begin
        for shape in reversed(self._parser.shapes[-_MOST_SHAPES:]):
            pattern = _pattern(shape) if len(shape) < _LONGEST_SHAPE else None
            found = pattern.match(text, begin) if pattern else None
            if pattern is None or found is None:
                continue
            rows, end = [], begin
            while found is not None:
                rows.append(list(found.groups()))
                end = found.end()
                found = pattern.match(text, end)
            self._parser.take_rows(shape, rows, data.count(b"\n", begin, end))
            return end
        return begin

    def _pass(self, data: bytes) -> None:
        """Let the parser see bytes, and note what makes the next ones doubtful."""
        if not data:
            return
        looked_at = self._tail[-1:] + data
        if not self._parser.begun:
            root = _ROOT.search(data)
            looked_at = data[root.start() :] if root else b""
        if _OTHER_MARKUP.search(looked_at):
            self._parser.plain = False
        self._parser.parse(data)
        self._tail = (self._tail + data[-_TAIL:])[-_TAIL:]


@lru_cache(maxsize=64)
def _pattern(shape: Shape) -> re.Pattern[str] | None:
    """Give an expression for rows of a shape, with a group for every element in the order of their ends.

    >>> row = tuple(f"{NAMESPACE}}}{name}" if name else None for name in ("NumValues", "nVarValue", None, None))
    >>> _pattern(row).match("<NumValues> <nVarValue>5</nVarValue> </NumValues>").groups()
    ('5', '')
    """
    parts: list[str] = []
    open_names: list[str] = []
    for name, following in zip(shape, (*shape[1:], None), strict=True):
        if name is None:
            parts.append(f"()</{open_names.pop()}>" if parts[-1] != _TEXT else f"</{open_names.pop()}>")
        else:
            space, _, local = name.rpartition("}")
            if space != NAMESPACE:
                return None
            open_names.append(re.escape(local))
            parts += [f"<{open_names[-1]}>", *([_TEXT] if following is None else [])]
            if following is None:
                continue
        parts.append(_BLANKS)
    return re.compile(_BLANKS + "".join(parts))

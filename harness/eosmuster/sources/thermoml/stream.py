"""ThermoML as a stream of parts: nothing is resolved, nothing is fetched, and little is kept in memory.

The parser is expat itself. A document type definition is refused where it begins, so there are no entities
beyond the five of XML, and expat fetches nothing by itself. Every part (a compound, a declaration, a row of
values) is handed out as it ends and forgotten; a file of any length needs the memory of its largest part.

A part is handed out as its shape and its texts.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import BinaryIO
from xml.parsers import expat

from eosmuster.errors import InputError
from eosmuster.quantities import shown
from eosmuster.sources.thermoml.shape import BLOCK, DEEPEST, NAMESPACE, ROOT, ROW, TOO_DEEP, VALUE, Shape, known
from eosmuster.sources.thermoml.shortcut import Shortcut

_AROUND = {
    **dict.fromkeys(("Citation", "Compound", BLOCK), ROOT),
    **dict.fromkeys(("Component", "Property", "PhaseID", "Constraint", "Variable", ROW), BLOCK),
}
"""Parts that are handed out -> the element they lie in."""

_PARTS = {f"{NAMESPACE}}}{name}": name for name in _AROUND}
_PATHS = {
    name: tuple(f"{NAMESPACE}}}{one}" for one in ((ROOT,) if a == ROOT else (ROOT, a))) for name, a in _AROUND.items()
}
"""A part as the parser names it -> its name, and the elements it lies in, the root first."""

_CHUNK = 1 << 16
_SHAPES_KEPT = 8
_MOST_ELEMENTS = 200_000
_MOST_BYTES = 4 << 20
"""Bounds on what one part may hold; the longest abstract of a paper is far below a thousandth of them."""

Take = Callable[[str, Shape, list[str], int], bool]


class BrokenOff(InputError):
    """The rest of a file cannot be read: why, and how many values were ``skipped`` in the block that has no end."""

    def __init__(self, why: str, skipped: int) -> None:
        super().__init__(why)
        self.skipped = skipped


def read_parts(stream: BinaryIO, take: Take, *, shortcut: bool = True) -> None:
    """Hand the parts of a ThermoML file to `take` as they end.

    Parameters
    ----------
    stream : bytes of the file
    take : called with the name of a part, its shape and texts (none for a block, whose parts went before it), and
        the number of values that were skipped in a block (0 for anything else); if it answers False to a row, the
        rest of the block is skipped and only its values are counted
    shortcut : read rows that are written alike by a regular expression; False is for tests, and gives the same

    Raises
    ------
    BrokenOff : not ThermoML, not well formed, cut off, a document type definition, or beyond all bounds; what was
        handed out before is sound.

    Examples
    --------
    >>> import io
    >>> from eosmuster.sources.thermoml.shape import nodes
    >>> text = f"<DataReport xmlns='{NAMESPACE}'><Compound><sCommonName>x</sCommonName></Compound></DataReport>"
    >>> read_parts(io.BytesIO(text.encode()), lambda name, *part: print(name, nodes(*part[:2])) or True)
    Compound [('sCommonName', 'x')]
    >>> read_parts(io.BytesIO(b"<!DOCTYPE x><DataReport/>"), print)  # doctest: +ELLIPSIS
    Traceback (most recent call last):
    eosmuster.sources.thermoml.stream.BrokenOff: it has a document type definition (line 1); ...
    """
    parser = _Parser(take)
    feeder = Shortcut(parser) if shortcut else None
    feed = parser.parse if feeder is None else feeder.feed
    chunk = stream.read(_CHUNK).lstrip(b" \t\r\n")  # blanks before the declaration are a fault nobody means
    try:
        while chunk:
            feed(chunk)
            chunk = stream.read(_CHUNK)
        if feeder is not None:
            feeder.close()
        parser.close()
    except InputError as error:
        raise BrokenOff(str(error), parser.skipped) from None
    except expat.ExpatError as error:
        raise BrokenOff(parser.what_is_wrong(error), parser.skipped) from None
    except (LookupError, ValueError) as error:  # an encoding nobody knows, or of more than one byte
        if parser.begun:
            raise
        raise BrokenOff(f"its encoding cannot be read: {shown(str(error))}", 0) from None
    finally:
        parser.release()


_CUT_OFF = {
    expat.errors.codes[message]
    for message in (
        *(expat.errors.XML_ERROR_NO_ELEMENTS, expat.errors.XML_ERROR_UNCLOSED_TOKEN),
        *(expat.errors.XML_ERROR_UNCLOSED_CDATA_SECTION, expat.errors.XML_ERROR_PARTIAL_CHAR),
    )
}


_PLAIN_ENCODINGS = frozenset({None, "utf-8", "us-ascii", "ascii", "iso-8859-1", "latin-1", "windows-1252"})


class _Parser:
    """Expat with handlers that note names and texts, one part at a time.

    Attributes
    ----------
    begun : whether the root was there
    plain : whether rows may be cut out; see `eosmuster.sources.thermoml.shortcut`
    shapes : of the rows that were parsed, each once
    """

    def __init__(self, take: Take) -> None:
        self._parser = expat.ParserCreate(None, "}")
        self._parser.buffer_text = True
        self._parser.ordered_attributes = True  # a list is made faster than a dictionary, and nobody looks at it
        self._parser.StartDoctypeDeclHandler = self._refuse
        self._parser.StartElementHandler = self._begin
        self._parser.StartNamespaceDeclHandler = self._namespace
        self._parser.XmlDeclHandler = self._declaration
        self._take = take
        self._path: list[str] = []  # the elements that are open and were begun before the last part
        self._shape: list[str | None] = []  # what began and ended since then
        self._texts: list[str] = []
        self._pieces: list[str] = []
        self._skipping, self._skipped = False, 0
        self._default, self._fed, self._lines = "", 0, 0
        self.begun = False
        self.plain = True
        self.shapes: list[Shape] = []

    def parse(self, data: bytes) -> None:
        """Parse the next bytes."""
        self._fed += len(data)
        self._parser.Parse(data, False)
        waiting = self._fed - self._parser.CurrentByteIndex
        text = sum(map(len, self._pieces))
        if waiting > _MOST_BYTES or text > _MOST_BYTES or len(self._shape) > _MOST_ELEMENTS:
            raise InputError(f"one element in line {self._line} has no end within reason")

    @property
    def _line(self) -> int:
        return self._parser.CurrentLineNumber + self._lines

    def what_is_wrong(self, error: expat.ExpatError) -> str:
        """Say why the file cannot be parsed."""
        if not self._fed:
            return "it is empty"
        if error.code in _CUT_OFF:
            return f"it breaks off in line {error.lineno + self._lines}"
        return f"it is not well formed in line {error.lineno + self._lines}: {expat.ErrorString(error.code)}"

    @property
    def skipped(self) -> int:
        """How many values were skipped of a block that has not ended."""
        return self._skipped if self._skipping else 0

    def close(self) -> None:
        """Tell that there are no more bytes."""
        self._parser.Parse(b"", True)

    def release(self) -> None:
        """Drop the handlers, which hold the parser that holds them: thousands of files would wait for collection."""
        self._parser.StartElementHandler = self._parser.EndElementHandler = None
        self._parser.CharacterDataHandler = self._parser.StartDoctypeDeclHandler = None
        self._parser.StartNamespaceDeclHandler = self._parser.XmlDeclHandler = None

    def _refuse(self, *_: object) -> None:
        raise InputError(f"it has a document type definition (line {self._line}); without one it can be read")

    def _declaration(self, _version: str, encoding: str | None, _standalone: int) -> None:
        self.plain &= (encoding.casefold() if encoding else None) in _PLAIN_ENCODINGS

    def _namespace(self, prefix: str | None, uri: str | None) -> None:
        if self.begun:
            self.plain = False
        elif prefix is None:
            self._default = uri or ""

    def _begin(self, name: str, _: object) -> None:
        space, _, root = name.rpartition("}")
        if (space, root) != (NAMESPACE, ROOT):
            raise InputError(f"it is not ThermoML: its root is {shown(root)} of the namespace {shown(space)}")
        self.begun = True
        self.plain &= self._default == NAMESPACE
        self._path.append(name)
        self._read_on()

    def _read_on(self) -> None:
        """Set the handlers that note everything: closures, since they run once for every element."""
        begin, end_text, clear, join = self._shape.append, self._texts.append, self._pieces.clear, "".join
        pieces, parts, end_of_part = self._pieces, _PARTS, self._end_of_part

        def start(name: str, _attributes: object) -> None:
            begin(name)
            clear()

        def end(name: str) -> None:
            begin(None)
            end_text(join(pieces))  # of an element with others in it this is no text, and nobody asks for it
            if name in parts:
                end_of_part(name)

        self._parser.StartElementHandler = start
        self._parser.EndElementHandler = end
        self._parser.CharacterDataHandler = pieces.append

    def _end_of_part(self, name: str) -> None:
        """Hand out a part if it lies where it should, and forget what there was since the last one."""
        shape, texts = self._shape, self._texts
        if shape[0] != name or len(shape) != 2 * len(texts):  # something else since the last part
            self._leave_out_what_is_around()
        part = _PARTS[name]
        given, own = (tuple(shape), texts.copy()) if part != BLOCK else ((), [])  # its parts went before it
        shape.clear()
        texts.clear()
        if tuple(self._path) != _PATHS[part]:
            around = next((_PARTS[one] for one in self._path if one in _PARTS), None)
            if around is not None:  # elsewhere, as in a reaction, they are none of ours
                raise InputError(f"a {part} lies in a {around} (line {self._line}), where none can be")
            return
        if part == ROW and given not in self.shapes[-_SHAPES_KEPT:]:
            self.shapes = [*self.shapes[1 - _SHAPES_KEPT :], given]
        if not self._take(part, given, own, 0) and part == ROW:
            self._skip_rest()

    def expects_rows(self) -> bool:
        """Tell whether a row may come next, and nothing is open but its block."""
        return self.plain and (self._skipping or (tuple(self._path) == _PATHS[ROW] and not self._shape))

    def take_rows(self, shape: Shape, rows: list[list[str]], lines: int) -> None:
        """Take rows that were not parsed, and how many lines they filled."""
        self._lines += lines
        taken = 0
        while taken < len(rows) and not self._skipping:
            if not self._take(ROW, shape, rows[taken], 0):
                self._skip_rest()
            taken += 1
        self._skipped += (len(rows) - taken) * shape.count(known(VALUE))

    def _leave_out_what_is_around(self) -> None:
        """Reduce shape and texts to the last element that ended, and put on the path what is still open."""
        begun: list[tuple[int, int]] = []
        last, ended = (0, 0), 0
        for place, name in enumerate(self._shape):
            if name is not None:
                begun.append((place, ended))
                continue
            if begun:
                last = begun.pop()
            else:
                self._path.pop()
                last = (place, ended)
            ended += 1
        self._path += (self._shape[place] or "" for place, _ in begun)
        if len(self._path) > DEEPEST:
            raise InputError(TOO_DEEP)
        del self._shape[: last[0]]
        del self._texts[: last[1]]

    def _skip_rest(self) -> None:
        """Set the handlers that count values until the block ends."""
        self._skipping, self._skipped = True, 0
        block, value = known(BLOCK), known(VALUE)

        def end(name: str) -> None:
            if name == value:
                self._skipped += 1
            elif name == block:
                self._skipping = False
                del self._path[1:]
                self._take(BLOCK, (), [], self._skipped)
                self._read_on()

        self._parser.StartElementHandler = None
        self._parser.EndElementHandler = end
        self._parser.CharacterDataHandler = None

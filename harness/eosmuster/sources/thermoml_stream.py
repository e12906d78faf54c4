"""ThermoML as a stream of parts: nothing is resolved, nothing is fetched, and little is kept in memory.

The parser is expat itself. A document type definition is refused where it begins, so there are no entities
beyond the five of XML, and expat fetches nothing by itself. Every part (a compound, a declaration, a row of
values) is handed out as it ends and forgotten; a file of any length needs the memory of its largest part.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import BinaryIO, TypeAlias
from xml.parsers import expat

from eosmuster.errors import InputError
from eosmuster.quantities import shown

NAMESPACE = "http://www.iupac.org/namespaces/ThermoML"
ROOT = "DataReport"

Content: TypeAlias = "str | list[Node]"
Node: TypeAlias = tuple[str, Content]
"""An element: its name, and its text or the elements in it, in order."""

BLOCK = "PureOrMixtureData"
VALUE = "PropertyValue"

_TOP = 2
_PARTS = {
    **dict.fromkeys(("Citation", "Compound", BLOCK, "ReactionData"), _TOP),
    **dict.fromkeys(("Component", "Property", "PhaseID", "Constraint", "Variable", "NumValues"), _TOP + 1),
}
"""Parts that are handed out -> how many elements they lie in, counted with one for the document."""

_READ = (
    *("sAuthor", "sPubName", "yrPubYr", "sTitle", "sDOI", "sVol", "sPage"),
    *("RegNum", "nOrgNum", "nCASRNum", "nCompIndex", "sStandardInChIKey", "sCASName", "sIUPACName", "sCommonName"),
    *("sFormulaMolec", "Property-MethodID", "PropertyGroup", "ePropName", "eMethodName", "sMethodName"),
    *("CriticalEvaluation", "Prediction", "PropPhaseID", "ePropPhase", "ePresentation", "nPropNumber", "ePhase"),
    *("CombinedUncertainty", "nCombUncertAssessNum", "nCombCoverageFactor", "nCombUncertLevOfConfid"),
    *("PropUncertainty", "nUncertAssessNum", "nCoverageFactor", "nUncertLevOfConfid", "ConstraintID"),
    *("ConstraintType", "ConstraintPhaseID", "eConstraintPhase", "nConstraintValue", "nConstrDigits"),
    *("ConstrUncertainty", "nStdUncertValue", "nExpandUncertValue", "nVarNumber", "VariableID", "VariableType"),
    *("VarPhaseID", "eVarPhase", "VarUncertainty", "eTemperature", "ePressure", "eComponentComposition"),
    *("eSolventComposition", "eMiscellaneous", "eBioVariables", "eParticipantAmount", "VariableValue", "nVarValue"),
    *("nVarDigits", VALUE, "nPropValue", "nPropDigits", "PropLimit", "nCombStdUncertValue"),
    *("nCombExpandUncertValue", "AsymCombStdUncert", "AsymCombExpandUncert", "AsymStdUncert", "AsymExpandUncert"),
    *("nPositiveValue", "nNegativeValue"),
    # groups of properties, each with the property's name and method in it
    *("Criticals", "VaporPBoilingTAzeotropTandP", "PhaseTransition", "CompositionAtPhaseEquilibrium"),
    *("ActivityFugacityOsmoticProp", "VolumetricProp", "HeatCapacityAndDerivedProp", "TransportProp"),
    *("ExcessPartialApparentEnergyProp", "RefractionSurfaceTensionSoundSpeed", "BioProperties"),
)
_NAMES = {f"{NAMESPACE}}}{name}": name for name in _READ}
_PART_NAMES = {f"{NAMESPACE}}}{name}": name for name in _PARTS}
"""Elements that are kept; all others are read over, with everything in them."""

_CHUNK = 1 << 16
_DEEPEST = 100
_MOST_ELEMENTS = 200_000
_MOST_BYTES = 4 << 20
"""Bounds on what one part may hold; the longest abstract of a paper is far below a thousandth of them."""

Take = Callable[[str, "list[Node]", int], bool]


def read_parts(stream: BinaryIO, take: Take) -> None:
    """Hand the parts of a ThermoML file to `take` as they end.

    Parameters
    ----------
    stream : bytes of the file
    take : called with the name of a part, the elements in it, and the number of values that were skipped in a
        block (0 for anything else); if it answers False, the rest of the block is skipped and only its
        values are counted

    Raises
    ------
    InputError : not ThermoML, not well formed, cut off, a document type definition, or beyond all bounds; what
        was handed out before is sound.

    Examples
    --------
    >>> import io
    >>> text = f"<DataReport xmlns='{NAMESPACE}'><Compound><sCommonName>x</sCommonName></Compound></DataReport>"
    >>> read_parts(io.BytesIO(text.encode()), lambda *part: print(part) or True)
    ('Compound', [('sCommonName', 'x')], 0)
    >>> read_parts(io.BytesIO(b"<!DOCTYPE x><DataReport/>"), print)
    Traceback (most recent call last):
    eosmuster.errors.InputError: it has a document type definition (line 1); without one it can be read
    """
    reader = _Reader(take)
    fed = 0
    first = stream.read(_CHUNK).lstrip(b" \t\r\n")  # blanks before the declaration are a fault nobody means
    try:
        chunk = first
        while chunk:
            fed += len(chunk)
            reader.feed(chunk, fed)
            chunk = stream.read(_CHUNK)
        reader.close()
    except expat.ExpatError as error:
        raise InputError(_what_is_wrong(error, fed)) from None
    except (LookupError, ValueError) as error:  # an encoding nobody knows, or of more than one byte
        if reader.begun:
            raise
        raise InputError(f"its encoding cannot be read: {shown(str(error))}") from None
    finally:
        reader.release()


_CUT_OFF = {
    expat.errors.codes[message]
    for message in (
        *(expat.errors.XML_ERROR_NO_ELEMENTS, expat.errors.XML_ERROR_UNCLOSED_TOKEN),
        *(expat.errors.XML_ERROR_UNCLOSED_CDATA_SECTION, expat.errors.XML_ERROR_PARTIAL_CHAR),
    )
}


def _what_is_wrong(error: expat.ExpatError, fed: int) -> str:
    if not fed:
        return "it is empty"
    if error.code in _CUT_OFF:
        return f"it breaks off in line {error.lineno}"
    return f"it is not well formed in line {error.lineno}, column {error.offset}: {expat.ErrorString(error.code)}"


class _Reader:
    """Expat with handlers that build small lists, one part at a time."""

    def __init__(self, take: Take) -> None:
        self._parser = expat.ParserCreate(None, "}")
        self._parser.buffer_text = True
        self._parser.StartDoctypeDeclHandler = self._refuse
        self._parser.StartElementHandler = self._begin
        self._take = take
        self._stack: list[list[Node]] = [[]]
        self._pieces: list[str] = []
        self.begun = False

    def feed(self, chunk: bytes, fed: int) -> None:
        self._parser.Parse(chunk, False)
        waiting = fed - self._parser.CurrentByteIndex
        held = sum(map(len, self._stack)) + len(self._stack)
        if waiting > _MOST_BYTES or sum(map(len, self._pieces)) > _MOST_BYTES or held > _MOST_ELEMENTS:
            raise InputError(f"one element in line {self._parser.CurrentLineNumber} has no end within reason")
        if len(self._stack) > _DEEPEST:
            raise InputError(f"its elements are nested more than {_DEEPEST} deep")

    def close(self) -> None:
        self._parser.Parse(b"", True)

    def release(self) -> None:
        """Drop the handlers, which hold the parser that holds them: thousands of files would wait for collection."""
        self._parser.StartElementHandler = self._parser.EndElementHandler = None
        self._parser.CharacterDataHandler = self._parser.StartDoctypeDeclHandler = None

    def _refuse(self, *_: object) -> None:
        line = self._parser.CurrentLineNumber
        raise InputError(f"it has a document type definition (line {line}); without one it can be read")

    def _begin(self, name: str, _: object) -> None:
        space, _, root = name.rpartition("}")
        if (space, root) != (NAMESPACE, ROOT):
            raise InputError(f"it is not ThermoML: its root is {shown(root)} of the namespace {shown(space)}")
        self.begun = True
        self._stack.append([])
        self._read_on()

    def _read_on(self) -> None:
        """Set the handlers that build: written as closures, since they run once for every element."""
        stack, pieces = self._stack, self._pieces
        push, pop, clear = stack.append, stack.pop, pieces.clear
        plain, part, depth, take, skip_rest = _NAMES.get, _PART_NAMES.get, _PARTS, self._take, self._skip_rest
        leaf = False

        def start(_name: str, _attributes: object) -> None:
            nonlocal leaf
            if leaf:  # the element around this one has no list yet
                push([])
            leaf = True
            clear()

        def end(full_name: str) -> None:
            nonlocal leaf
            content: Content
            if leaf:
                leaf = False
                content = pieces[0] if len(pieces) == 1 else "".join(pieces)
            else:
                content = pop()
            name = plain(full_name)
            if name is not None:
                stack[-1].append((name, content))
                return
            name = part(full_name)
            if name is None:
                return
            if depth[name] != len(stack):
                stack[-1].append((name, content))
            elif not take(name, content if isinstance(content, list) else [], 0) and len(stack) > _TOP:
                skip_rest()

        self._parser.StartElementHandler = start
        self._parser.EndElementHandler = end
        self._parser.CharacterDataHandler = pieces.append

    def _skip_rest(self) -> None:
        """Set the handlers that count values until the block ends."""
        skipped = 0
        block, value = f"{NAMESPACE}}}{BLOCK}", f"{NAMESPACE}}}{VALUE}"

        def end(full_name: str) -> None:
            nonlocal skipped
            if full_name == value:
                skipped += 1
            elif full_name == block:
                del self._stack[_TOP:]
                self._take(BLOCK, [], skipped)
                self._read_on()

        self._parser.StartElementHandler = None
        self._parser.EndElementHandler = end
        self._parser.CharacterDataHandler = None

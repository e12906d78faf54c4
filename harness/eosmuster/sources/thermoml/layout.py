"""What the rows of a ThermoML block hold, and where: found out once for all rows of one shape.

Rows are alike if their elements are, and if the numbers by which they refer to variables, properties and
assessments of uncertainty are: such rows are a group, and its numbers are read as columns.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

from eosmuster.quantities import shown
from eosmuster.sources.measured.table import AUTHOR, COMBINED
from eosmuster.sources.measured.uncertainty import coverage_factor
from eosmuster.sources.thermoml.header import Factors
from eosmuster.sources.thermoml.nodes import within
from eosmuster.sources.thermoml.shape import VALUE, Content, Node

_ASSESSMENTS = {
    "CombinedUncertainty": (
        *(COMBINED, "nCombUncertAssessNum", "nCombStdUncertValue", "nCombExpandUncertValue"),
        *("AsymCombStdUncert", "AsymCombExpandUncert"),
    ),
    "PropUncertainty": (
        *(AUTHOR, "nUncertAssessNum", "nStdUncertValue", "nExpandUncertValue"),
        *("AsymStdUncert", "AsymExpandUncert"),
    ),
}
_ASSESSMENTS["VarUncertainty"] = _ASSESSMENTS["PropUncertainty"]

REFERRING = ("nVarNumber", "nPropNumber", "nUncertAssessNum", "nCombUncertAssessNum")
"""Elements by which a row refers to what its block declares."""

TWICE = "it is given twice"


@dataclass(frozen=True)
class Assessment:
    """One assessment of the uncertainty of a value: the places of its numbers among the texts of a row.

    Attributes
    ----------
    origin : as in `eosmuster.sources.measured.table.ORIGINS`
    standard, expanded : places; several where it is not symmetric, none where it is not given
    factor, assumed : the coverage factor of the expanded one, and whether it had to be assumed
    """

    origin: int
    standard: tuple[int, ...]
    expanded: tuple[int, ...]
    factor: float
    assumed: bool


@dataclass(frozen=True)
class Place:
    """Where a value stands in the rows of a group.

    Attributes
    ----------
    value, digits : places among the texts of a row; None where there is none, or not exactly one
    fault : why there is no value, "" if there is one
    assessments : of its uncertainty
    """

    value: int | None
    digits: int | None = None
    fault: str = ""
    assessments: tuple[Assessment, ...] = ()


@dataclass(frozen=True)
class Layout:
    """What the rows of a group hold.

    Attributes
    ----------
    variables, properties : by the number that refers to their declaration; one that is not declared is among
        them too
    times : number of a property -> how often a row has a value of it
    fault : what is wrong with the variables of these rows, "" if nothing is
    """

    variables: Mapping[str, Place]
    properties: Mapping[str, Place]
    times: Mapping[str, int]
    fault: str


def referring(row: list[Node]) -> Iterator[int]:
    """Give the places of the numbers by which a row refers to declarations.

    Parameters
    ----------
    row : elements of a row, with the places of their texts
    """
    for name, content in row:
        if name in REFERRING and isinstance(content, int):
            yield content
        yield from referring(within(content))


def layout(
    row: list[Node], texts: Sequence[str], variables: Mapping[str, Factors], properties: Mapping[str, Factors]
) -> Layout:
    """Find out what the rows of a group hold, by one of them.

    Parameters
    ----------
    row : its elements, with the places of their texts
    texts : of that row; only those `referring` are looked at
    variables, properties : coverage factors of what is declared, by number

    Examples
    --------
    >>> row = [("VariableValue", [("nVarNumber", 0), ("nVarValue", 1)]), ("PropertyValue", [("nPropNumber", 3)])]
    >>> found = layout(row, ["1", "310", "", "1"], {"1": {}}, {"1": {}})
    >>> found.variables, found.properties["1"].fault
    ({'1': Place(value=1, digits=None, fault='', assessments=())}, 'there is none')
    >>> layout([], [], {"1": {}}, {}).fault
    'variable 1 has no value'
    """
    found: dict[str, Place] = {}
    given: dict[str, Place] = {}
    times: dict[str, int] = {}
    fault = ""
    for name, content in row:
        inner = within(content)
        if name == "VariableValue":
            key = _key(inner, "nVarNumber", texts)
            fault = fault or _fault_of_variable(key, found, variables)
            found[key] = _place(inner, "nVarValue", "nVarDigits", texts, variables.get(key, {}))
        elif name == VALUE:
            key = _key(inner, "nPropNumber", texts)
            times[key] = times.get(key, 0) + 1
            given[key] = _place(inner, "nPropValue", "nPropDigits", texts, properties.get(key, {}))
    missing = [key for key in variables if key not in found]
    if missing and not fault:
        fault = f"variable {missing[0]} has no value"
    return Layout(found, given, times, fault)


def _fault_of_variable(key: str, found: Mapping[str, Place], declared: Mapping[str, Factors]) -> str:
    if key not in declared:
        return f"variable {shown(key)} is not declared"
    return f"variable {key} is given twice" if key in found else ""


def _key(nodes: list[Node], name: str, texts: Sequence[str]) -> str:
    """Give the number by which a value refers to its declaration; "" if there is not exactly one."""
    places = [content for kind, content in nodes if kind == name]
    return texts[places[0]].strip() if len(places) == 1 and isinstance(places[0], int) else ""


def _place(nodes: list[Node], value: str, digits: str, texts: Sequence[str], factors: Factors) -> Place:
    found = [content for kind, content in nodes if kind == value]
    counts = [content for kind, content in nodes if kind == digits]
    assessments = tuple(
        _assessment(kind, within(content), texts, factors) for kind, content in nodes if kind in _ASSESSMENTS
    )
    place = found[0] if len(found) == 1 else None
    if not isinstance(place, int):
        return Place(None, None, _why_none(nodes, found))
    return Place(place, counts[0] if len(counts) == 1 and isinstance(counts[0], int) else None, "", assessments)


def _why_none(nodes: list[Node], found: Sequence[Content]) -> str:
    if any(kind == "PropLimit" for kind, _ in nodes):
        return "a limit stands for it"
    return TWICE if len(found) > 1 else "it holds elements" if found else "there is none"


def _assessment(kind: str, nodes: list[Node], texts: Sequence[str], factors: Factors) -> Assessment:
    origin, number_name, standard, expanded, standard_sides, expanded_sides = _ASSESSMENTS[kind]
    factor, assumed = factors.get((kind, _key(nodes, number_name, texts))) or coverage_factor(None)
    return Assessment(
        origin, _places(nodes, standard, standard_sides), _places(nodes, expanded, expanded_sides), factor, assumed
    )


def _places(nodes: list[Node], name: str, sides: str) -> tuple[int, ...]:
    """Give the place of a symmetric uncertainty, or those of the sides of one that is not."""
    symmetric = tuple(content for kind, content in nodes if kind == name and isinstance(content, int))
    two = (content for kind, inner in nodes if kind == sides for _, content in within(inner))
    return symmetric or tuple(content for content in two if isinstance(content, int))

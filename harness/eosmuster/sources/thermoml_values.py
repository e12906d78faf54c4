"""One row of a ThermoML block: its variables, and the value of a property with its stated uncertainty."""

from __future__ import annotations

from collections.abc import Mapping
from math import isnan, nan

from eosmuster.quantities import shown
from eosmuster.sources.measured import AUTHOR, COMBINED, NO_UNCERTAINTY
from eosmuster.sources.measured_uncertainty import coverage_factor
from eosmuster.sources.thermoml_header import Factors
from eosmuster.sources.thermoml_nodes import number, within
from eosmuster.sources.thermoml_stream import VALUE, Content, Node

Leaves = dict[str, Content]
"""The elements of a value by name."""

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

_NEVER_TWICE = ("nVarNumber", "nVarValue", "nPropNumber", "nPropValue", "nPropDigits")


def leaves_of(content: Content) -> Leaves:
    """Give the elements of a value by name; a number that is given twice is none.

    >>> leaves_of([("nPropNumber", "1"), ("nPropValue", "5"), ("nPropValue", "6")])
    {'nPropNumber': '1'}
    """
    if isinstance(content, str):
        return {}
    leaves = dict(content)
    if len(leaves) < len(content):
        names = [name for name, _ in content]
        for name in _NEVER_TWICE:
            if names.count(name) > 1:
                del leaves[name]
    return leaves


def key_of(leaves: Leaves, name: str) -> str:
    """Give the number by which a value refers to its declaration; "" if there is not exactly one."""
    key = leaves.get(name)
    return key.strip() if isinstance(key, str) else ""


def read_variables(row: list[Node], declared: Mapping[str, Factors]) -> tuple[dict[str, tuple[float, float]], str]:
    """Read the ``VariableValue`` elements of a row: each declared variable has to have one value.

    Parameters
    ----------
    row : elements of ``NumValues``
    declared : coverage factors of each declared variable, by its number

    Returns
    -------
    found : number -> value and standard uncertainty (NaN if there is none)
    fault : what is wrong with them, "" if nothing is

    Examples
    --------
    >>> row = [("VariableValue", [("nVarNumber", "1"), ("nVarValue", "310")])]
    >>> read_variables(row, {"1": {}})
    ({'1': (310.0, nan)}, '')
    >>> read_variables([], {"1": {}})
    ({}, 'variable 1 has no value')
    """
    found: dict[str, tuple[float, float]] = {}
    fault = ""
    for name, content in row:
        if name == "VariableValue":
            leaves = leaves_of(content)
            key, value = key_of(leaves, "nVarNumber"), number(leaves.get("nVarValue"))
            if key not in declared:
                fault = f"variable {shown(key)} is not declared"
            elif key in found:
                fault = f"variable {key} is given twice"
            elif isnan(value):
                fault = f"variable {key} is not one number: {_printed(content, 'nVarValue')}"
            stated = nan
            if "VarUncertainty" in leaves and not fault:
                stated = read_uncertainty(within(content), declared[key])[0]
            found[key] = (value, stated if 0.0 < stated < abs(value) else nan)
    if len(found) < len(declared) and not fault:
        fault = f"variable {next(key for key in declared if key not in found)} has no value"
    return found, fault


def read_properties(row: list[Node], seen: dict[str, int]) -> tuple[dict[str, tuple[Content, Leaves]], list[str]]:
    """Give the ``PropertyValue`` elements of a row by their numbers, and the numbers that stand there again.

    Parameters
    ----------
    row : elements of ``NumValues``
    seen : number -> how many values it had; counted on
    """
    given: dict[str, tuple[Content, Leaves]] = {}
    twice: list[str] = []
    for name, content in row:
        if name == VALUE:
            leaves = leaves_of(content)
            key = key_of(leaves, "nPropNumber")
            seen[key] = seen.get(key, 0) + 1
            if key in given:
                twice.append(key)
            given[key] = (content, leaves)
    return given, twice


def fault_of_value(content: Content) -> str:
    """Say why a ``PropertyValue`` has no value that can be read."""
    if any(kind == "PropLimit" for kind, _ in within(content)):
        return "a limit stands for the value"
    return f"the value is not one number: {_printed(content, 'nPropValue')}"


def _printed(content: Content, name: str) -> str:
    found = [inner for kind, inner in within(content) if kind == name]
    return ", ".join(shown(text) if isinstance(text, str) else "elements" for text in found[:3]) or "there is none"


def read_uncertainty(nodes: list[Node], factors: Factors) -> tuple[float, int, bool]:
    """Give the standard uncertainty a value states, where it comes from, and whether its level is assumed.

    A combined uncertainty is taken before one of the property alone, and the largest of several; one that is
    0 or negative only where there is no other.

    Examples
    --------
    >>> stated = [("PropUncertainty", [("nUncertAssessNum", "1"), ("nExpandUncertValue", "1.6")])]
    >>> read_uncertainty(stated, {("PropUncertainty", "1"): (2.0, False)})
    (0.8, 1, False)
    """
    best, best_rank = (nan, NO_UNCERTAINTY, False), (False, NO_UNCERTAINTY, 0.0)
    for kind, content in nodes:
        if kind in _ASSESSMENTS:
            origin, u, assumed = _assessed(kind, content, factors)
            rank = (u > 0.0, origin, u)
            if u == u and (best_rank[1] == NO_UNCERTAINTY or rank > best_rank):  # noqa: PLR0124 (not NaN)
                best, best_rank = (u, origin, assumed), rank
    return best


def _assessed(kind: str, content: Content, factors: Factors) -> tuple[int, float, bool]:
    """Give origin, standard uncertainty (NaN for none) and whether its level is assumed, of one assessment."""
    origin, number_name, standard_name, expanded_name, *lopsided = _ASSESSMENTS[kind]
    leaves = dict(within(content))
    standard = _larger(leaves, standard_name, lopsided[0])
    if standard < 0.0 or standard > 0.0:
        return origin, standard, False
    expanded = _larger(leaves, expanded_name, lopsided[1])
    if isnan(expanded):
        return origin, standard, False
    factor, assumed = factors.get((kind, key_of(leaves, number_name))) or coverage_factor(None)
    return origin, expanded / factor, assumed


def _larger(leaves: Leaves, name: str, lopsided: str) -> float:
    """Give a symmetric uncertainty, or the larger side of one that is not; NaN if there is neither."""
    if name in leaves:
        return number(leaves[name])
    if lopsided not in leaves:
        return nan
    sides = [abs(number(content)) for _, content in within(leaves[lopsided])]
    return max((side for side in sides if not isnan(side)), default=nan)

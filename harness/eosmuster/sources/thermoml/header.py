"""What a ThermoML block declares before its values: substances, properties, phases, constraints and variables."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field

from eosmuster.sources.measured.substances import Description
from eosmuster.sources.measured.uncertainty import coverage_factor
from eosmuster.sources.thermoml.nodes import inside, number, only, text, texts, within
from eosmuster.sources.thermoml.shape import Node

TEMPERATURE, PRESSURE, MOLE_FRACTION = "Temperature, K", "Pressure, kPa", "Mole fraction"

Reference = tuple[str, str]
"""How a block points at a compound: the kind of number, and the number."""

Factors = Mapping[tuple[str, str], tuple[float, bool]]
"""Kind and number of an assessment -> coverage factor of its expanded uncertainties, and whether it is assumed."""

_NUMBERS = ("nOrgNum", "nCompIndex", "nCASRNum")
_ASSESSMENTS = {
    "CombinedUncertainty": ("nCombUncertAssessNum", "nCombUncertLevOfConfid", "nCombCoverageFactor"),
    "PropUncertainty": ("nUncertAssessNum", "nUncertLevOfConfid", "nCoverageFactor"),
    "VarUncertainty": ("nUncertAssessNum", "nUncertLevOfConfid", "nCoverageFactor"),
}


@dataclass(frozen=True)
class Declared:
    """One property of a block, as declared.

    Attributes
    ----------
    number : by which its values refer to it
    name : whole, the unit is part of it
    phase : that it belongs to, "" if none is named
    compound : references to the compound it belongs to (a mole fraction)
    presentation : ``Direct value, X``, or something else
    method : in words
    predicted : True for a value that was not measured
    factors : coverage factors
    """

    number: str
    name: str
    phase: str
    compound: tuple[Reference, ...]
    presentation: str
    method: str
    predicted: bool
    factors: Factors


@dataclass(frozen=True)
class Coordinate:
    """A variable (with a number) or a constraint (with a value), as declared.

    Attributes
    ----------
    quantity : whole, the unit is part of it
    phase, compound : that it belongs to, if it says so
    number : by which the values of a variable refer to it; "" for a constraint
    value, uncertainty : of a constraint, in the unit of the quantity; standard uncertainty or NaN
    factors : coverage factors of a variable
    """

    quantity: str
    phase: str
    compound: tuple[Reference, ...]
    number: str = ""
    value: float = math.nan
    uncertainty: float = math.nan
    factors: Factors = field(default_factory=dict)


@dataclass
class Header:
    """What a block has declared so far, in the order of the file."""

    components: list[tuple[Reference, ...]] = field(default_factory=list)
    properties: list[Declared] = field(default_factory=list)
    phases: list[str] = field(default_factory=list)
    coordinates: list[Coordinate] = field(default_factory=list)

    def add(self, kind: str, nodes: list[Node]) -> None:
        """Take one declaration: a ``Component``, ``Property``, ``PhaseID``, ``Constraint`` or ``Variable``."""
        if kind == "Component":
            self.components.append(references(nodes))
        elif kind == "Property":
            self.properties.append(declared(nodes))
        elif kind == "PhaseID":
            self.phases.append(text(nodes, "ePhase"))
        else:
            self.coordinates.append(constraint(nodes) if kind == "Constraint" else variable(nodes))

    @property
    def names(self) -> str:
        """The properties, for people."""
        return (
            " and ".join(dict.fromkeys(p.name or "a property without a name" for p in self.properties)) or "nothing"
        )

    def ambiguous(self) -> bool:
        """Tell whether a number stands for two properties or two variables, or is missing."""
        numbers = [p.number for p in self.properties]
        variables = [c.number for c in self.coordinates if c.number]
        return len(set(numbers)) < len(numbers) or len(set(variables)) < len(variables) or not all(numbers)


def references(nodes: list[Node]) -> tuple[Reference, ...]:
    """Give all numbers that point at a compound, the file's own before CAS numbers."""
    everywhere = [*nodes, *(node for kind, content in nodes if kind == "RegNum" for node in within(content))]
    return tuple((kind, found) for kind in _NUMBERS for found in texts(everywhere, kind))


def description(nodes: list[Node]) -> Description:
    """Give what a ``Compound`` says of itself."""
    return Description(
        names=tuple(
            name for kind in ("sCommonName", "sIUPACName", "sCASName") for name in texts(nodes, kind) if name
        ),
        formula=text(nodes, "sFormulaMolec").replace(" ", ""),
        inchikey=text(nodes, "sStandardInChIKey"),
        cas=text(inside(nodes, "RegNum"), "nCASRNum"),
    )


def declared(nodes: list[Node]) -> Declared:
    """Read a ``Property``."""
    method_id = inside(nodes, "Property-MethodID")
    groups = inside(method_id, "PropertyGroup")
    group = within(groups[0][1]) if len(groups) == 1 else []
    kinds = [kind for kind, _ in group]
    phases = [text(within(content), "ePropPhase") for kind, content in nodes if kind == "PropPhaseID"]
    method = "critical evaluation" if "CriticalEvaluation" in kinds else text(group, "eMethodName", "sMethodName")
    return Declared(
        number=only(nodes, "nPropNumber"),
        name=only(group, "ePropName"),
        phase=" and ".join(dict.fromkeys(phases)),
        compound=references(method_id),
        presentation=only(nodes, "ePresentation"),
        method=method,
        predicted="Prediction" in kinds,
        factors=factors(nodes),
    )


def variable(nodes: list[Node]) -> Coordinate:
    """Read a ``Variable``; one without a number gets one that no value refers to."""
    return Coordinate(
        *_about(nodes, "Variable", "Var"),
        number=only(nodes, "nVarNumber") or "?",
        factors=factors(nodes),
    )


def constraint(nodes: list[Node]) -> Coordinate:
    """Read a ``Constraint``, with its uncertainty."""
    return Coordinate(
        *_about(nodes, "Constraint", "Constraint"),
        value=number(only(nodes, "nConstraintValue")),
        uncertainty=_constraint_uncertainty(inside(nodes, "ConstrUncertainty")),
    )


def _about(nodes: list[Node], kind: str, short: str) -> tuple[str, str, tuple[Reference, ...]]:
    """Give quantity, phase and compound of a variable or constraint, whose elements are named after its kind."""
    what = inside(nodes, f"{kind}ID")
    phase = text(inside(nodes, f"{short}PhaseID"), f"e{short}Phase")
    return _quantity(inside(what, f"{kind}Type")), phase, references(what)


def factors(nodes: list[Node]) -> Factors:
    """Give the coverage factors of every assessment a property or variable declares."""
    found = {}
    for kind, content in nodes:
        if kind in _ASSESSMENTS:
            number_of, level, factor = _ASSESSMENTS[kind]
            said = within(content)
            key = (kind, text(said, number_of))
            found[key] = coverage_factor(_stated(said, level), _stated(said, factor))
    return found


def _stated(nodes: list[Node], name: str) -> float | None:
    value = number(text(nodes, name))
    return None if math.isnan(value) else value


def _quantity(nodes: list[Node]) -> str:
    """Give the only quantity that is named; "" if it is not the only one."""
    return only(nodes, nodes[0][0]) if len(nodes) == 1 else ""


def _constraint_uncertainty(nodes: list[Node]) -> float:
    standard, expanded = number(text(nodes, "nStdUncertValue")), number(text(nodes, "nExpandUncertValue"))
    factor, _ = coverage_factor(_stated(nodes, "nUncertLevOfConfid"), _stated(nodes, "nCoverageFactor"))
    return standard if standard > 0.0 else expanded / factor if expanded > 0.0 else math.nan

"""The shape of a part of a ThermoML file: how its elements lie in one another, apart from their texts.

A shape holds the names of elements where they begin, and None where they end. The rows of a block have but one or
two shapes, so what a shape means has to be found out once, and not in every row.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import TypeAlias

from eosmuster.errors import InputError

NAMESPACE = "http://www.iupac.org/namespaces/ThermoML"
ROOT = "DataReport"
BLOCK = "PureOrMixtureData"
ROW = "NumValues"
VALUE = "PropertyValue"

Shape = tuple[str | None, ...]
Content: TypeAlias = "str | int | list[Node]"
Node: TypeAlias = tuple[str, Content]
"""An element: its name, and its text (or the place of its text), or the elements in it in order."""

DEEPEST = 100
TOO_DEEP = f"its elements are nested more than {DEEPEST} deep"

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
"""Elements that are kept; all others are read over, with everything in them."""


def nodes(shape: Shape, texts: Sequence[str] | Sequence[int]) -> list[Node]:
    """Give the elements in a part; those that are not known are left out, with all in them.

    Parameters
    ----------
    shape : of the part
    texts : one for every element, in the order of their ends; or their places, to learn where texts stand

    Raises
    ------
    InputError : nested deeper than anything means.

    Examples
    --------
    >>> nodes((known("Compound"), known("RegNum"), known("nOrgNum"), None, None, None), ["1", "", ""])
    [('RegNum', [('nOrgNum', '1')])]
    """
    around: list[list[Node]] = []
    here: list[Node] = []
    inner: list[Node] = []
    names: list[str | None] = []
    has_elements: list[bool] = []
    ended = 0
    for name in shape:
        if name is not None:
            if has_elements:
                has_elements[-1] = True
            names.append(_NAMES.get(name))
            has_elements.append(False)
            around.append(here)
            here = []
            if len(around) > DEEPEST:
                raise InputError(TOO_DEEP)
            continue
        inner, here = here, around.pop()
        known, content = names.pop(), inner if has_elements.pop() else texts[ended]
        if known is not None:
            here.append((known, content))
        ended += 1
    return inner


def known(name: str) -> str:
    """Give the name of an element as the parser gives it, with the namespace."""
    return f"{NAMESPACE}}}{name}"

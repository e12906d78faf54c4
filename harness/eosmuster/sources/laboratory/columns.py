"""What the columns of a laboratory file hold: from a Table Schema descriptor, or from units in the header.

A descriptor is JSON after the Frictionless Table Schema (https://specs.frictionlessdata.io/table-schema/),
alone, in a data resource, or in a data package. Its fields carry ``name`` (the header's cell), and of ours
``quantity`` (if the name is not one), ``unit``, ``uncertainty_of``, ``coverage_factor`` and ``level``; beside the
fields may stand ``component``, ``phase`` and ``method`` for the whole file. ``decimalChar``, ``groupChar``,
``missingValues`` and the dialect's ``delimiter`` are the standard's own, and so are the ``sources`` of a resource,
from which the citation is taken.
"""

from __future__ import annotations

import json
import re
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from eosmuster.errors import InputError, suggestion
from eosmuster.quantities import UNITS, shown, split_quantity
from eosmuster.sources.laboratory.coverage import STANDARD, Coverage, coverage
from eosmuster.sources.laboratory.text import PLAIN, Style

DIMENSIONS: Mapping[str, tuple[str, ...]] = {
    "temperature": ("temperature",),
    "pressure": ("pressure",),
    "saturation_pressure": ("pressure",),
    "boiling_temperature": ("temperature",),
    "liquid_density": ("density", "mass_density"),
    "vapor_density": ("density", "mass_density"),
    "density": ("density", "mass_density"),
    "enthalpy_of_vaporization": ("energy", "mass_energy"),
}
"""Quantities of columns of numbers -> dimensions their unit may have."""

STATE = ("temperature", "pressure")
TEXTS = ("component", "phase", "method")
PHASES: tuple[str, ...] = ("liquid", "vapor", "fluid")

_OTHER_NAMES = {"fluid": "component", "substance": "component", "vapor_pressure": "saturation_pressure"}
_UNCERTAINTY = re.compile(
    r"(?P<kind>[uU])\s*\(\s*(?P<of>[^(),;\[\]]+?)\s*(?:[,;]\s*k\s*=\s*(?P<k>[\d.]+)\s*)?\)\s*(?P<rest>.*)\Z"
)
_UNIT = re.compile(r"(?P<name>[^\[\]]*?)\s*\[(?P<unit>[^\[\]]*)\]\Z")
_LARGEST_DESCRIPTOR = 1 << 20


@dataclass(frozen=True)
class Column:
    """One column that is read.

    Attributes
    ----------
    title : the header's cell
    place : counted from 0
    quantity : a key of `DIMENSIONS`, or one of `TEXTS`
    uncertainty : True for the uncertainty of the quantity
    unit, dimension : of the numbers; "" for texts. An uncertainty may be a ``fraction`` of its value
    coverage : how far an uncertainty is expanded
    style : how its numbers are written
    """

    title: str
    place: int
    quantity: str
    uncertainty: bool = False
    unit: str = ""
    dimension: str = ""
    coverage: Coverage = STANDARD
    style: Style = PLAIN

    @property
    def factor(self) -> float:
        """SI value of a unit step of the column."""
        return UNITS[self.dimension][self.unit][0] / self.coverage.divisor

    def si(self, value: float) -> float:
        """Give a value in SI (one by mass still by mass: kg/m3, J/kg)."""
        factor, offset = UNITS[self.dimension][self.unit]
        return (value + (0.0 if self.uncertainty else offset)) * factor / self.coverage.divisor


@dataclass(frozen=True)
class Descriptor:
    """What stands beside a file.

    Attributes
    ----------
    fields : name of a field -> its properties
    whole : ``component``, ``phase`` and ``method`` for all rows
    missing : cells that stand for no value
    delimiter : "" if it is not declared
    citation : the first of its sources, "" if it names none
    file : its name; "" if there is none
    """

    fields: Mapping[str, Mapping[str, Any]] = field(default_factory=dict)
    whole: Mapping[str, str] = field(default_factory=dict)
    missing: frozenset[str] = frozenset({""})
    delimiter: str = ""
    citation: str = ""
    file: str = ""


def descriptors_of(path: Path) -> tuple[Path, ...]:
    """Give where the descriptor of a CSV file may be, in the order in which they count."""
    return path.with_suffix(".json"), path.with_suffix(".schema.json"), path.parent / "datapackage.json"


def descriptor_beside(path: Path) -> Descriptor:
    """Read the descriptor of a CSV file: ``name.json``, ``name.schema.json``, or a ``datapackage.json`` with it.

    Raises `InputError` if there is one that cannot be read; gives an empty one if there is none.
    """
    for file in descriptors_of(path):
        if file.is_file():
            found = _load(file)
            if "resources" in found:
                found = _resource(found, path.name)
            if found:
                return _descriptor(found, file.name)
    return Descriptor()


def _load(file: Path) -> Mapping[str, Any]:
    data = file.read_bytes()
    if len(data) > _LARGEST_DESCRIPTOR:
        raise InputError(f"its descriptor {file.name} is larger than 1 MiB")
    try:
        found = json.loads(data.decode("utf-8-sig"))
    except (ValueError, RecursionError) as error:
        raise InputError(f"its descriptor {file.name} is not JSON: {shown(str(error))}") from None
    if not isinstance(found, dict):
        raise InputError(f"its descriptor {file.name} is no table of properties")
    return found


def _resource(package: Mapping[str, Any], name: str) -> Mapping[str, Any]:
    resources = package["resources"] if isinstance(package["resources"], list) else []
    named = (r for r in resources if isinstance(r, dict) and str(r.get("path")).rpartition("/")[2] == name)
    found: Mapping[str, Any] = next(named, {})
    return {"sources": package.get("sources"), **found} if found else {}  # they are inherited, as the standard has it


def _descriptor(found: Mapping[str, Any], file: str) -> Descriptor:
    schema = found.get("schema", found)
    listed = schema.get("fields") if isinstance(schema, dict) else None
    if not isinstance(listed, list) or not all(
        isinstance(f, dict) and isinstance(f.get("name"), str) for f in listed
    ):
        raise InputError(f"its descriptor {file} has no list of fields with names")
    dialect = found.get("dialect")
    missing = schema.get("missingValues", [""])
    return Descriptor(
        fields={f["name"].strip(): f for f in listed},
        whole={key: str(place[key]) for key in TEXTS for place in (found, schema) if isinstance(place.get(key), str)},
        missing=frozenset(map(str, missing)) | {""} if isinstance(missing, list) else frozenset({""}),
        delimiter=str(dialect.get("delimiter", "")) if isinstance(dialect, dict) else "",
        citation=_citation(found.get("sources")),
        file=file,
    )


def _citation(sources: object) -> str:
    """Give title and path of the first source.

    >>> _citation([{"title": "Nobody: campaign 7 (invented)", "path": "https://example.org/7"}])
    'Nobody: campaign 7 (invented) https://example.org/7'
    """
    first = next((s for s in sources if isinstance(s, dict)), {}) if isinstance(sources, list) else {}
    said = (first.get(key) for key in ("title", "path"))
    return " ".join(" ".join(filter(None, (one for one in said if isinstance(one, str)))).split())[:600]


def column(title: str, place: int, described: Mapping[str, Any]) -> Column:
    """Find what a column holds, by its title and what a descriptor says of it.

    Raises
    ------
    InputError : no quantity, no unit, or one that is not known.

    Examples
    --------
    >>> found = column("u(density, k=2) [kg/m3]", 3, {})
    >>> found.quantity, found.uncertainty, found.unit, found.coverage.divisor
    ('density', True, 'kg/m3', 2.0)
    >>> column("temperature [degC]", 0, {}).si(25.0)
    298.15
    """
    uncertain = _UNCERTAINTY.match(title)
    named = _UNIT.match(uncertain["rest"] if uncertain else title)
    said = str(described.get("uncertainty_of") or described.get("quantity") or "")
    name = said or (uncertain["of"] if uncertain else named["name"] if named else title)
    quantity = _quantity(name, title)
    if quantity in TEXTS:
        return Column(title, place, quantity)
    is_uncertainty = "uncertainty_of" in described or (uncertain is not None and not said)
    unit = str(described.get("unit") or (named["unit"] if named else ""))
    dimensions = _dimensions(quantity, is_uncertainty)
    if not unit.strip():
        raise InputError(f"column {shown(title)} has no unit; write e.g. '{title} [{_example(quantity)}]'")
    _, known = split_quantity(f"1 {unit}", dimensions, f"column {shown(title)}")
    dimension = next(d for d in dimensions if known in UNITS[d])
    expanded = _coverage(uncertain, described) if is_uncertainty else STANDARD
    style = Style(str(described.get("decimalChar") or "."), str(described.get("groupChar") or ""))
    return Column(title, place, quantity, is_uncertainty, known, dimension, expanded, style)


def holds_values(title: str, described: Mapping[str, Any]) -> bool:
    """Tell whether a column holds measured values, also one that cannot be read: it is no remark, state or text.

    What is not called as a property that is known is one if it has a unit.

    >>> [holds_values(title, {}) for title in ("density [barg]", "viscosity [Pa s]", "u(density) [%]", "operator")]
    [True, True, False, False]
    """
    if "uncertainty_of" in described or (_UNCERTAINTY.match(title) and not described.get("quantity")):
        return False
    named = _UNIT.match(title)
    name = _folded(str(described.get("quantity") or (named["name"] if named else title)))
    if name in DIMENSIONS or name in TEXTS:
        return name not in STATE and name not in TEXTS
    return bool(described.get("unit") or (named and named["unit"]))


def _folded(name: str) -> str:
    folded = re.sub(r"[\s-]+", "_", name.strip().casefold()).replace("vapour", "vapor")
    return _OTHER_NAMES.get(folded, folded)


def _quantity(name: str, title: str) -> str:
    folded = _folded(name)
    valid = (*DIMENSIONS, *TEXTS)
    if folded not in valid:
        raise InputError(f"column {shown(title)} is not read; {suggestion(folded, valid, most=len(valid))}")
    return folded


def _dimensions(quantity: str, is_uncertainty: bool) -> Sequence[str]:
    own = DIMENSIONS[quantity]
    if not is_uncertainty:
        return own
    return ("temperature_difference" if own == ("temperature",) else own[0], *own[1:], "fraction")


def _example(quantity: str) -> str:
    return {"temperature": "K", "pressure": "kPa", "density": "kg/m3"}.get(DIMENSIONS[quantity][0], "kJ/mol")


def _coverage(uncertain: re.Match[str] | None, described: Mapping[str, Any]) -> Coverage:
    kind, factor = (uncertain["kind"], uncertain["k"]) if uncertain else ("u", None)
    return coverage(kind == "U", [described.get("coverage_factor"), factor], described.get("level"))

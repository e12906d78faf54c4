"""The frozen contracts of a plan. Everything in here is SI; units were read away in `reading`."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component
from eosmuster.plan.grids import Grid, SinglePhaseGrid

if TYPE_CHECKING:
    from eosmuster.models.records import ModelRecord
from eosmuster.quantities import CONTESTED_ABOVE

Floats = NDArray[np.float64]

LEVELS = (
    "default",
    "property",
    "property_range",
    "class",
    "class_range",
    "component",
    "component_range",
)
"""How specific a tolerance rule is, least specific first: the most specific rule that covers a state governs.

A range of reduced temperatures makes a rule more specific than the same rule without one, never more
specific than one that names a class or a component.
"""

LIMIT_KINDS = {
    "percent": "%",
    "logarithm": "% of ln",
    "kelvin": "K",
    "pascal": "Pa",
    "mol/m3": "mol/m3",
    "kg/m3": "kg/m3",
    "J/mol": "J/mol",
    "J/(mol K)": "J/(mol K)",
    "m/s": "m/s",
    "K/Pa": "K/Pa",
    "one": "",
}
"""Kind of a limit -> the unit of its value."""

DECISION_RULES = ("guarded", "simple")
UNCERTAINTIES = ("read", "remembered", "assumed")
"""Which uncertainties of references decide: those that were read in a source; those noted down from memory as well;
or a default of ours by chemical class too, wherever nothing is stated."""
REFERENCES = ("coolprop", "handbook")
MEASURED = "measured"
"""What a plan's own files are called among its references."""
GATE_REASONS = ("outside", "unsolved", "undecided", "unfit_reference", "no_reference", "unavailable")
"""What a gate can fail on: every verdict but ``inside``, and what a model cannot do for a component."""
FIRST_REFERENCE = "first"
"""In a gate: the first of the plan's references with a value for the fluid, by which a report gives its answer."""


@dataclass(frozen=True)
class Limit:
    """The largest deviation that is still inside: "2 %" means from -2 % to +2 %.

    Attributes
    ----------
    value : positive, in the unit of its kind
    kind : a key of `LIMIT_KINDS`; ``logarithm`` limits 100 abs(ln(predicted/reference)), for a saturation pressure
    written : as the plan has it, e.g. ``0.5 mbar``, for people; "" if it is ours
    """

    value: float
    kind: str
    written: str = field(default="", compare=False, repr=False)

    def __str__(self) -> str:
        if self.kind == "K/Pa":  # nobody thinks in kelvin per pascal
            return f"{self.value * 1e5:g} K/bar"
        return f"{self.value:g} {LIMIT_KINDS[self.kind]}".rstrip()

    def percent_of(self, reference: Floats) -> Floats:
        """Express the limit in percent of the reference value at each point.

        Parameters
        ----------
        reference : shape (n,), in the SI unit of the limit; NaN where there is none

        Returns
        -------
        shape (n,): a relative limit as it is, an absolute one as 100 value / abs(reference), a logarithmic one
        as its narrower side 100 (1 - exp(-value/100)), so that what is inside is inside on both sides

        Examples
        --------
        >>> Limit(0.5, "kelvin").percent_of(np.array([250.0])).tolist()
        [0.2]
        """
        reference = np.asarray(reference, dtype=np.float64)
        if self.kind == "percent":
            return np.full_like(reference, self.value)
        if self.kind == "logarithm":
            return np.full_like(reference, -100.0 * math.expm1(-self.value / 100.0))
        with np.errstate(divide="ignore"):
            return 100.0 * self.value / np.abs(reference)

    def molar(self, component: Component) -> Limit:
        """Return a mass density limit as a molar one; every other limit as it is.

        Raises
        ------
        ValueError : mass density, and the component has no molar mass (plans refuse that when they are read)
        """
        if self.kind != "kg/m3":
            return self
        if component.molar_mass is None:
            raise ValueError(f"{component.name} has no molar mass, so {self} means nothing for it")
        return Limit(self.value / component.molar_mass, "mol/m3")


@dataclass(frozen=True)
class ToleranceRule:
    """One limit and where it applies.

    Attributes
    ----------
    property : a key of `eosmuster.quantities.PROPERTIES`
    limit : the limit
    level : one of `LEVELS`
    family : chemical class it is restricted to, or ""
    component : name of the component it is restricted to, or ""
    above_reduced_temperature, below_reduced_temperature : it covers above <= Tr < below, so a border
        belongs to the band above it
    rationale : why this limit, for the reader of the report
    """

    property: str
    limit: Limit
    level: str
    family: str = ""
    component: str = ""
    above_reduced_temperature: float = 0.0
    below_reduced_temperature: float = math.inf
    rationale: str = ""


@dataclass(frozen=True)
class Decision:
    """How the uncertainty of a reference enters a verdict.

    Attributes
    ----------
    rule : ``guarded`` (the limit less the expanded uncertainty decides) or ``simple`` (shared risk)
    coverage_factor : expanded = coverage_factor x standard uncertainty
    uncertainty : one of `UNCERTAINTIES`
    unfit_ratio : a reference whose expanded uncertainty exceeds this share of the limit cannot decide
    """

    rule: str = "guarded"
    coverage_factor: float = 2.0
    unfit_ratio: float = 1.0 / 3.0
    uncertainty: str = "read"


@dataclass(frozen=True)
class Gate:
    """Which verdicts fail a build, and which rows of the summary are asked.

    Attributes
    ----------
    fail_on : subset of `GATE_REASONS`
    components, candidates, properties : names out of the plan's; empty for all of them
    references : out of the plan's references, ``measured`` and `FIRST_REFERENCE`; empty for all of them
    """

    fail_on: tuple[str, ...] = ("outside", "unsolved")
    components: tuple[str, ...] = ()
    candidates: tuple[str, ...] = ()
    properties: tuple[str, ...] = ()
    references: tuple[str, ...] = ()


@dataclass(frozen=True)
class Display:
    """Units of what people read; files stay SI."""

    temperature: str = "degC"
    pressure: str = "bar"
    density: str = "kg/m3"


@dataclass(frozen=True)
class Plan:
    """One sweep, completely said.

    Attributes
    ----------
    name : file stem, or the name of a built-in plan
    title : one line for the report
    service : the duty the equation of state is chosen for, free text
    path : file it was read from, "" for a built-in plan
    text : the TOML as it was read
    components : resolved, the plan's own included, in the order of the plan
    models : names, the plan's own included, in the order of the plan
    own_models : records of the models that the plan itself defines
    properties : keys of `eosmuster.quantities.PROPERTIES`
    grid : the saturated states
    single_phase : the single-phase states, None if the plan has none
    tolerances : the default rules, then the plan's: everything `tolerances.limit_pct` needs
    references_use : subset of `REFERENCES`
    reference_files : patterns of measured files, relative to the plan's folder
    gate : what fails a build
    constants : where catalogued components have Tc, pc and omega from: ``library``, or a cited critical table
    left_out : (what, why) of everything the plan names or selects that is not swept
    contested_above : property -> median disagreement of references, in %, above which they are contested
    part : (number, of how many) where only a part of the components is swept, see `eosmuster.plan.parts`
    """

    name: str
    title: str
    service: str
    path: str
    text: str
    components: tuple[Component, ...]
    models: tuple[str, ...]
    own_models: tuple[ModelRecord, ...]
    properties: tuple[str, ...]
    grid: Grid
    tolerances: tuple[ToleranceRule, ...]
    decision: Decision = field(default_factory=Decision)
    references_use: tuple[str, ...] = REFERENCES
    reference_files: tuple[str, ...] = ()
    gate: Gate = field(default_factory=Gate)
    display: Display = field(default_factory=Display)
    left_out: tuple[tuple[str, str], ...] = ()
    constants: str = "library"
    single_phase: SinglePhaseGrid | None = None
    contested_above: Mapping[str, float] = field(default_factory=lambda: dict(CONTESTED_ABOVE))
    part: tuple[int, int] | None = None

    @property
    def rows(self) -> range:
        """Numbers of the components that are swept: all of them, or those of the part."""
        number, of = self.part or (1, 1)
        return range(number - 1, len(self.components), of)

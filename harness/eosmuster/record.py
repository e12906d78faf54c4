"""The run record: everything a sweep measured, held once and rendered many times."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Any

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

RECORD_VERSION = 2

POINT_VERDICTS = ("inside", "outside", "undecided", "unfit_reference", "unsolved", "no_reference")
"""Verdict codes of a point: `Block.verdict` holds the index into this tuple."""

SUMMARY_VERDICTS = ("unavailable", "inside", "undecided", "outside", "partly")

WINDOW_ENDS = (
    "limit",
    "limit_step",
    "undecided",
    "critical_point",
    "reference_limit",
    "no_reference",
    "plan_limit",
    "unsolved",
)


REGION_EDGES = (
    "limit",
    "limit_step",
    "undecided",
    "phase_boundary",
    "reference_limit",
    "no_reference",
    "plan_limit",
    "unsolved",
    "critical_point",
)


CAUSE_FOUND = "cause found: "
"""What begins the sentence of a conflict of which it is known what is wrong."""


@dataclass(frozen=True)
class Block:
    """All candidates for one component, property and reference source, on the same n states.

    Arrays over states have shape (n,), arrays over candidates and states (m, n). Unknown numbers are NaN
    (an empty cell in the files).

    Attributes
    ----------
    temperature : K; where the state was given by pressure, the reference's temperature at that pressure
    pressure : Pa where the state was given by pressure, else NaN
    reference : SI value in the property's unit
    reference_uncertainty_pct : expanded uncertainty (plan's coverage factor), percent of the reference
    limit_pct : tolerance limit, percent of the reference
    predicted, deviation_pct, probability_inside : SI, %, 0..1
    verdict : index into `POINT_VERDICTS`
    note : index into `notes`; 0 is the empty note
    independence : one of independent / constants / fitted for each candidate
    contested : ``yes`` or ``no``: whether the references of this component and property disagree; "" where nothing
        can be said, since there is only one, or since no two share enough states without sharing an equation
    """

    component: str
    cas: str
    property: str
    unit: str
    phase: str
    reference_source: str
    candidates: tuple[str, ...]
    independence: tuple[str, ...]
    temperature: Floats
    pressure: Floats
    reduced_temperature: Floats
    reference: Floats
    reference_uncertainty_pct: Floats
    limit_pct: Floats
    predicted: Floats
    deviation_pct: Floats
    probability_inside: Floats
    verdict: NDArray[np.int8]
    note: NDArray[np.int16]
    notes: tuple[str, ...]
    contested: str = ""


@dataclass(frozen=True)
class SummaryRow:
    """One component x candidate x property x reference source; field order is the file's column order.

    Attributes
    ----------
    surely_passing_limit_pct : the smallest limit at which every point would be inside by more than the reference's
        uncertainty; NaN where that is not known at every point
    max_at_Pa : pressure of the largest deviation, where states have one of their own
    mean_predicted, mean_reference : over the states with both, SI: tells which of the two has moved between two runs
    mean_limit_pct, mean_uncertainty_pct : over the states with a reference
    """

    component: str
    candidate: str
    property: str
    reference_source: str
    points: int
    from_K: float
    to_K: float
    aad_pct: float
    bias_pct: float
    rms_pct: float
    median_pct: float
    p95_pct: float
    max_pct: float
    max_at_K: float
    inside: int
    undecided: int
    outside: int
    unsolved: int
    share_inside: float
    passing_limit_pct: float
    false_acceptance_pct: float
    contested: str
    independence: str
    verdict: str
    no_reference: int = 0
    note: str = ""
    surely_passing_limit_pct: float = math.nan
    max_at_Pa: float = math.nan
    mean_predicted: float = math.nan
    mean_reference: float = math.nan
    mean_limit_pct: float = math.nan
    mean_uncertainty_pct: float = math.nan


@dataclass(frozen=True)
class WindowRow:
    """One maximal interval of temperature over which a candidate stays inside."""

    component: str
    candidate: str
    property: str
    reference_source: str
    from_K: float
    to_K: float
    from_end: str
    to_end: str


@dataclass(frozen=True)
class Ring:
    """A closed line in the T-p plane; the first vertex is not repeated.

    Attributes
    ----------
    temperature, pressure : (k,), K and Pa
    reasons : (k,), one of `REGION_EDGES`: why the region ends at the edge from vertex i to vertex i + 1
    """

    temperature: Floats
    pressure: Floats
    reasons: tuple[str, ...]


@dataclass(frozen=True)
class Region:
    """The largest connected T-p region over which a candidate stays inside, for a single-phase property.

    Attributes
    ----------
    outline : counter-clockwise in (T, p)
    holes : clockwise
    share : of the plan's rectangle of temperatures and pressures, by area as the plan's grid is spaced
    connected : number of separate regions, of which this is the largest
    """

    component: str
    candidate: str
    property: str
    reference_source: str
    phase: str
    outline: Ring
    holes: tuple[Ring, ...] = ()
    share: float = math.nan
    connected: int = 1


@dataclass(frozen=True)
class Record:
    """One run: its plan, its points in blocks, and the views drawn from them.

    Attributes
    ----------
    plan_name, plan_title, plan_text : the plan as it was given
    blocks : the points
    summary, windows : rows in the order of the files
    regions : of single-phase properties
    left_out : (what, why) of components or references that were not used
    decision : the decision rule in words and numbers
    constants : component -> constant -> {"value", "unit", "source"}; besides "cas", "class" and "notes", a list
        of what a reader must know (a replaced constant, a spin isomer)
    citations : source key -> full reference
    files : (name, SHA-256) of the measured files of the plan
    conflicts : (component, property, sentence) of references that disagree, and who stands alone; the sentence begins
        with `CAUSE_FOUND` where it says what is wrong with one of them
    notes : (file, what) a reader of a measured file must know, though nothing was left out by it
    references : the plan's references in its order: the first that knows a fluid is the one the answer is given by
    display : temperature / pressure / density -> unit of what people read
    part : (number, of how many) where this is a part of a run: with the components of the whole plan in all that they
        share, and the points of the part's
    regions_asked : whether regions were to be looked for at all
    plan_folder : folder beside which the plan's measured files lie; "" if it names none. It changes from one machine
        to the next and is no part of the results
    """

    plan_name: str
    plan_title: str
    plan_text: str
    blocks: tuple[Block, ...]
    summary: tuple[SummaryRow, ...]
    windows: tuple[WindowRow, ...]
    left_out: tuple[tuple[str, str], ...] = ()
    decision: Mapping[str, Any] = field(default_factory=dict)
    constants: Mapping[str, Mapping[str, Any]] = field(default_factory=dict)
    models: Mapping[str, Mapping[str, Any]] = field(default_factory=dict)
    citations: Mapping[str, str] = field(default_factory=dict)
    display: Mapping[str, str] = field(default_factory=dict)
    references: tuple[str, ...] = ()
    conflicts: tuple[tuple[str, str, str], ...] = ()
    files: tuple[tuple[str, str], ...] = ()
    regions: tuple[Region, ...] = ()
    part: tuple[int, int] | None = None
    plan_folder: str = ""
    regions_asked: bool = True
    notes: tuple[tuple[str, str], ...] = ()
    version: int = RECORD_VERSION

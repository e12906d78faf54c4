"""Why a row drifted: what moved in it, held against what differs between the manifests."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from functools import cached_property
from typing import Any

from eosmuster.drifting.agreement import Agreement
from eosmuster.drifting.changes import Key
from eosmuster.drifting.evidence import Evidence
from eosmuster.drifting.matching import Moved, coordinates
from eosmuster.drifting.sides import Side, spelled
from eosmuster.quantities import PROPERTIES
from eosmuster.record import SummaryRow

COUNTS = ("points", "inside", "undecided", "outside", "unsolved", "no_reference")

VIEWS = ("windows", "regions")
"""What a row has beside its columns of summary.csv: found from models and references, not from its points."""

_WORDS = ("contested", "independence", "note")
_JUDGED = ("verdict", "inside", "undecided", "outside", "passing_limit_pct", "surely_passing_limit_pct")
_BOILING, _PRESSURE = "boiling_temperature", "saturation_pressure"
_OF_SOURCE = {"coolprop": "reference:library", "handbook": "reference:data", "measured": "reference:measured"}


@dataclass(frozen=True)
class Setting:
    """Two runs and what differs between their manifests."""

    old: Side
    new: Side
    evidence: Evidence
    agreement: Agreement

    @cached_property
    def plans(self) -> tuple[Mapping[str, Any], Mapping[str, Any]]:
        """The plans' tables."""
        return self.old.plan, self.new.plan

    @cached_property
    def same_states(self) -> bool:
        """Whether both plans ask for the same states."""
        return not self.evidence.of_plan("states")

    @cached_property
    def names(self) -> tuple[tuple[set[str], ...], tuple[set[str], ...]]:
        """Components, candidates and properties of both runs."""
        return self._names(self.old), self._names(self.new)

    @staticmethod
    def _names(side: Side) -> tuple[set[str], ...]:
        constants, models = ({spelled(str(n)) for n in side.manifest[key]} for key in ("constants", "models"))
        return constants, models, {key.property for key in side.rows}

    def coordinates(self, name: str) -> tuple[str, ...]:
        """Tell by which coordinates the new plan states the points of a property."""
        return coordinates(self.plans[1], name)


@dataclass(frozen=True)
class Flags:
    """What moved in a row that both runs have.

    Attributes
    ----------
    known : "points" if each point was compared, "means" if only the means of the row were, "" if neither could be
    """

    predicted: bool = False
    reference: bool = False
    limit: bool = False
    uncertainty: bool = False
    coverage: bool = False
    known: str = ""


def of_kept_row(setting: Setting, key: Key, columns: Iterable[str], moved: Moved | None) -> tuple[str, ...]:
    """Give the causes of a row that both runs have.

    Parameters
    ----------
    columns : those of summary.csv that do not agree; names in `VIEWS` for windows and region
    moved : what its points say, None if a side has none
    """
    columns = tuple(columns)
    flags = _by_points(setting, key, moved) if moved else _by_means(setting, key)
    found: dict[str, None] = {}
    if flags.predicted:
        found |= dict.fromkeys(_of_prediction(setting, key))
    if flags.reference:
        found[_of_reference(setting, key)] = None
    found |= dict.fromkeys(_of_judging(setting, key, flags, columns))
    if flags.coverage:
        found["coverage"] = None
        if not setting.same_states:
            found["plan"] = None
        elif setting.evidence.of(own := _own_kind(key)):
            found[own] = None  # measured and tabulated values bring their own states
    if not found:
        found = dict.fromkeys(_otherwise(setting, key, flags, columns))
    return tuple(found)


def _of_judging(setting: Setting, key: Key, flags: Flags, columns: Iterable[str]) -> Iterable[str]:
    """Yield limits, uncertainties and the decision rule."""
    listed = setting.evidence.of_tolerance(key)
    if flags.limit and (listed or not (flags.reference or flags.coverage)):
        yield "tolerance"  # a limit in the property's unit is another percentage of a reference that moved
    decided = setting.evidence.of_plan("uncertainty")
    stated = decided or setting.evidence.of("uncertainty")
    if flags.uncertainty and (stated or flags.known == "points" or not (flags.reference or flags.coverage)):
        yield "uncertainty"
        if decided:
            yield "plan"
    if setting.evidence.of_plan("decision") and set(columns) & set(_JUDGED):
        yield "plan"


def _by_points(setting: Setting, key: Key, moved: Moved) -> Flags:
    # the pressure of a boiling point, and the temperature of a given pressure, are the reference's
    own = ("temperature", "pressure") if setting.coordinates(key.property) == ("pressure",) else ("pressure",)
    by_reference = [name for name in moved.shifted_in if name in own]
    return Flags(
        predicted=bool(moved.predicted),
        reference=bool(moved.reference or by_reference),
        limit=bool(moved.limit),
        uncertainty=bool(moved.uncertainty),
        coverage=bool(moved.came or moved.gone or len(moved.shifted_in) > len(by_reference)),
        known="points",
    )


def _by_means(setting: Setting, key: Key) -> Flags:
    old, new = setting.old.rows[key], setting.new.rows[key]
    agree = setting.agreement
    same_range = agree.numbers(old.from_K, new.from_K) and agree.numbers(old.to_K, new.to_K)
    by_pressure = setting.coordinates(key.property) == ("pressure",)
    if old.points != new.points or not setting.same_states or not (same_range or by_pressure):
        return Flags(coverage=True)
    if not same_range:
        return Flags(reference=True)  # the states are the reference's temperatures at the plan's pressures
    if (old.unsolved, old.no_reference) != (new.unsolved, new.no_reference):
        # means are over the states with both values, so they are of other states now
        return Flags(predicted=old.unsolved != new.unsolved, reference=old.no_reference != new.no_reference)
    predicted, reference = (_mean_moved(agree, old, new, name) for name in ("mean_predicted", "mean_reference"))
    if predicted and not reference and _follows_reference(setting, key):
        predicted, reference = False, True
    return Flags(
        predicted,
        reference,
        not agree.numbers(old.mean_limit_pct, new.mean_limit_pct),
        not agree.numbers(old.mean_uncertainty_pct, new.mean_uncertainty_pct),
        known="means",
    )


def _mean_moved(agree: Agreement, old: SummaryRow, new: SummaryRow, name: str) -> bool:
    return not Agreement(agree.of_cause).numbers(getattr(old, name), getattr(new, name))


def _follows_reference(setting: Setting, key: Key) -> bool:
    """Tell whether a boiling temperature was predicted at another pressure because the reference gives another one.

    The saturation pressure of the same candidate and reference tells which of the two moved; without it, the
    pressure of the largest deviation does.
    """
    if key.property != _BOILING or any(
        setting.evidence.about(cause, subject)
        for cause, subject in (("prediction:constants", key.component), ("prediction:model", key.candidate))
    ):
        return False
    pressure = key._replace(property=_PRESSURE)
    if pressure in setting.old.rows and pressure in setting.new.rows:
        flags = _by_means(setting, pressure)
        return flags.reference and not flags.predicted
    old, new = setting.old.rows[key], setting.new.rows[key]
    same_place = setting.agreement.numbers(old.max_at_K, new.max_at_K)
    return same_place and not setting.agreement.numbers(old.max_at_Pa, new.max_at_Pa)


def _of_prediction(setting: Setting, key: Key) -> list[str]:
    about = setting.evidence.about
    found = []
    if about("prediction:constants", key.component):
        found.append("prediction:constants")
    if about("prediction:model", key.candidate) or (not found and about("prediction:model", "")):
        found.append("prediction:model")
    return found or ["prediction:code"]


def _own_kind(key: Key) -> str:
    return _OF_SOURCE.get(key.reference_source.partition(":")[0], "reference:unexplained")


def _of_reference(setting: Setting, key: Key) -> str:
    own = _own_kind(key)
    return own if setting.evidence.of(own) else "reference:unexplained"


def _otherwise(setting: Setting, key: Key, flags: Flags, columns: tuple[str, ...]) -> list[str]:
    """Give the causes of a row in which no prediction, reference, limit or uncertainty is known to have moved."""
    words_alone = set(columns) <= set(_WORDS)
    if flags.known == "points" and not words_alone and not set(columns) & set(VIEWS):
        return ["code"]
    found = [] if words_alone else _by_manifest(setting, key)
    found += ["plan"] if "regions" in columns and setting.evidence.of_plan("regions") else []
    if words_alone:
        found += _of_words(setting, key)
    return list(dict.fromkeys(found)) or ["code" if flags.known == "points" or words_alone else "unexplained"]


def _of_words(setting: Setting, key: Key) -> list[str]:
    """Give the causes of words that moved without a number: any reference of the fluid may be behind `contested`."""
    about, of = setting.evidence.about, setting.evidence.of
    candidates = {
        "prediction:constants": about("prediction:constants", key.component),
        "prediction:model": about("prediction:model", key.candidate),
        **{cause: of(cause) for cause in (*_OF_SOURCE.values(), "uncertainty")},
        "plan": setting.evidence.of_plan("references", "constants", "uncertainty"),
    }
    return [cause for cause, changes in candidates.items() if changes]


def _by_manifest(setting: Setting, key: Key) -> list[str]:
    """Give every cause for which the manifests hold something that concerns the row."""
    about, of = setting.evidence.about, setting.evidence.of
    candidates = {
        "prediction:constants": about("prediction:constants", key.component),
        "prediction:model": about("prediction:model", key.candidate) + about("prediction:model", ""),
        _own_kind(key): of(_own_kind(key)),
        "tolerance": setting.evidence.of_tolerance(key),
        "uncertainty": of("uncertainty"),
        "plan": setting.evidence.of_plan("decision", "uncertainty", "states"),
        "prediction:code": of("prediction:code"),
    }
    return [cause for cause, changes in candidates.items() if changes]


def of_lone_row(setting: Setting, key: Key) -> tuple[tuple[str, ...], str]:
    """Give the causes of a row that only one of the runs has, and a note on what the other says instead."""
    there, missing = (0, 1) if key in setting.old.rows else (1, 0)
    without = (setting.old, setting.new)[missing]
    parts = (key.component, key.candidate, key.property)
    kinds = ("components", "models", "properties")
    for kind, name, known in zip(kinds, parts, setting.names[missing], strict=True):
        if name not in known:
            label = PROPERTIES[name].label if name in PROPERTIES else name
            note = f"{label} is not in the {'old' if there else 'new'} run"
            return (("plan",) if setting.evidence.of_plan(kind) else ("coverage",)), note
    unavailable = without.rows.get(key._replace(reference_source=""))
    if unavailable is not None and key.reference_source:
        when = "before" if there else "now"
        return (*_of_prediction(setting, key), "coverage"), f"unavailable {when}: {unavailable.note}"
    causes = ["plan"] if setting.evidence.of_plan("references", "states", "constants", "part") else ["coverage"]
    own = _own_kind(key)
    if key.reference_source and setting.evidence.of(own):
        causes.append(own)
    if not key.reference_source:
        causes += _of_prediction(setting, key)
    return tuple(causes), ""

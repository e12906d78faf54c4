"""The tables about the record as a whole: the rule, what was not done, and where everything is from."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from eosmuster.record import POINT_VERDICTS, Block, Record
from eosmuster.report import words
from eosmuster.report.coverage import silences
from eosmuster.report.dossier.svg import name
from eosmuster.report.dossier.tables import Table, cut
from eosmuster.report.rows import causes_first, unavailable_reasons, unsolved_reasons
from eosmuster.report.text import list_within, number

STATEMENTS = ("pass", "conditional pass", "conditional fail", "fail", "U not known", "no deviation")
"""The statements of ILAC-G8:09/2019, section 4.2.3, for a guard band of U; then what they say nothing about."""

_LIST = 400  # characters of a list of names
_NOTE = 600
_CONSTANTS = (
    ("critical_temperature", "Tc, K", 1.0),
    ("critical_pressure", "pc, bar", 1e-5),
    ("acentric_factor", "ω", 1.0),
    ("molar_mass", "M, g/mol", 1e3),
    ("triple_temperature", "Tt, K", 1.0),
    ("critical_density", "ρc, mol/L", 1e-3),
)


def statements(record: Record) -> Table:
    """Count the four statements of ILAC-G8:09/2019 with a guard band of U beside the verdicts of the record."""
    counted: dict[str, np.ndarray[tuple[int, ...], np.dtype[np.int64]]] = {}
    for block in record.blocks:
        at = _statement(block) + len(STATEMENTS) * block.verdict.astype(np.int64)
        found = np.bincount(at.ravel(), minlength=len(STATEMENTS) * len(POINT_VERDICTS))
        counted[block.property] = counted.get(block.property, 0) + found
    rows = []
    for prop, found in counted.items():
        for verdict, counts in zip(POINT_VERDICTS, found.reshape(len(POINT_VERDICTS), -1).tolist(), strict=True):
            if any(counts):
                rows.append([words.property_label(prop), verdict.replace("_", " "), *(str(n) for n in counts)])
    caption = "Points by verdict of this record and by statement of ILAC-G8:09/2019, against all references"
    return Table("ilac-table", caption, ("property", "verdict here", *STATEMENTS), "wwnnnnnn", rows)


def _statement(block: Block) -> np.ndarray[tuple[int, ...], np.dtype[np.int64]]:
    """Index `STATEMENTS` for every point; borders as the guarded rule has them."""
    size, limit, doubt = np.abs(block.deviation_pct), block.limit_pct, block.reference_uncertainty_pct
    found = np.where(size <= limit + doubt, 2, 3)
    found = np.where(size <= limit, 1, found)
    found = np.where(size <= limit - doubt, 0, found)
    found = np.where(np.isnan(limit + doubt), 4, found)
    return np.where(np.isnan(size), 5, found).astype(np.int64)


def tolerances(record: Record) -> Table:
    """Give the limits of the plan."""
    rows = [[name(text, _NOTE) if text else "" for text in row] for row in words.tolerances(record.decision)]
    caption = "Limits: the most specific that applies decides, of equals the later one"
    return cut("limits", caption, ["property", "limit", "where", "why"], "ttwt", rows, 300, "manifest.json")


def conflicts(record: Record) -> Table:
    """Give the references that disagree among themselves."""
    rows = [[name(c), name(words.property_label(p)), name(s, _NOTE)] for c, p, s in causes_first(record)]
    headers = ["fluid", "property", "who stands alone"]
    return cut("contested-table", "References that disagree", headers, "ttt", rows, 300, "manifest.json")


def unsolved(record: Record) -> Table:
    """Give the unsolved points by their reason."""
    rows = [
        [
            name(words.property_label(p)),
            name(c),
            name(why, _NOTE) if why else "no reason given",
            str(n),
            list_within(f, _LIST),
        ]
        for p, c, why, n, f in unsolved_reasons(record)
    ]
    headers = ["property", "candidate", "why", "points", "fluids"]
    return cut("unsolved-table", "Unsolved points, most first", headers, "tttnl", rows, 300, "points.csv")


def no_reference(record: Record) -> Table:
    """Give the states at which a reference has no value, by fluid and reason."""
    rows = [
        [
            name(group.component),
            name(group.source),
            name(group.why, _NOTE) if group.why else "no reason given",
            f"{group.states} of {group.of}",
            list_within([words.property_label(prop) for prop in group.properties], _LIST),
        ]
        for group in silences(record)
    ]
    headers = ["fluid", "reference", "why", "states", "properties"]
    caption = "States without a reference value, most first"
    return cut("silent-table", caption, headers, "tttwl", rows, 300, "points.csv", printed=60)


def unavailable(record: Record) -> Table:
    """Give what candidates cannot do at all."""
    rows = [
        [name(candidate), name(why, _NOTE) if why else "no reason given", str(len(f)), list_within(f, _LIST)]
        for candidate, why, f in unavailable_reasons(record.summary)
    ]
    headers = ["candidate", "why", "fluids", "which"]
    return cut("unavailable-table", "Unavailable, most fluids first", headers, "ttnl", rows, 300, "summary.csv")


def left_out(record: Record) -> Table:
    """Give what was not used at all."""
    rows = [[name(what), name(why, _NOTE)] for what, why in record.left_out]
    return cut("left-table", "Left out", ["what", "why"], "tt", rows, 500, "manifest.json")


def notes(record: Record) -> Table:
    """Give what was found out or marked in reading measured files."""
    rows = [[name(what), name(note, _NOTE)] for what, note in record.notes]
    return cut("notes-table", "Notes on measured files", ["file", "note"], "tt", rows, 500, "manifest.json")


def constants(record: Record) -> Table:
    """Give the constants of every component, where they are from, and what a reader must know of them."""
    rows = []
    for component, found in record.constants.items():
        sources = dict.fromkeys(str(value["source"]) for value in _valued(found).values() if value.get("source"))
        numbers = [_constant(found, key, factor) for key, _, factor in _CONSTANTS]
        notes = "; ".join(str(note) for note in found.get("notes", ()))
        rows.append(
            [
                name(component),
                name(found.get("cas", "-") or "-", 20),
                name(found.get("class", "-") or "-"),
                *numbers,
                name("; ".join(sources), _NOTE) if sources else "-",
                name(notes, _NOTE) if notes else "",
            ]
        )
    headers = ["component", "CAS", "class", *(header for _, header, _ in _CONSTANTS), "source", "note"]
    return cut("constants-table", "Constants", headers, "txtnnnnnntt", rows, 500, "manifest.json")


def _valued(found: Mapping[str, Any]) -> dict[str, Mapping[str, Any]]:
    return {key: value for key, value in found.items() if isinstance(value, Mapping) and "value" in value}


def _constant(found: Mapping[str, Any], key: str, factor: float) -> str:
    value = found.get(key, {}).get("value") if isinstance(found.get(key), Mapping) else None
    return number(float(value) * factor, 6) if isinstance(value, (int, float)) else "-"


def models(record: Record) -> Table:
    """Give the candidates: their equation and where it was published."""
    keys = ("form", "alpha", "constants", "source", "status", "note")
    rows = [
        [name(model), *(name(found[key], _NOTE) if found.get(key) else "-" for key in keys)]
        for model, found in record.models.items()
    ]
    headers = ["candidate", "form", "alpha function", "constants", "source", "how it was read", "note"]
    return cut("models-table", "Candidates", headers, "ttttttt", rows, 300, "manifest.json")


def citations(record: Record) -> Table:
    """Give the sources in full."""
    rows = [[name(key), name(full, 1000)] for key, full in record.citations.items()]
    return cut("citations-table", "Sources", ["key", "reference"], "tt", rows, 500, "manifest.json")

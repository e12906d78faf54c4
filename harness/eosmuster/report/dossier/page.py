"""dossier.html: the record as one page that needs nothing else."""

from __future__ import annotations

import base64
import hashlib
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, BinaryIO

from eosmuster.record import Record
from eosmuster.report import words
from eosmuster.report.cautions import cautions
from eosmuster.report.cells import encoded
from eosmuster.report.dossier import colours, data, maps, regions, remarks, svg, tables
from eosmuster.report.dossier.data import Subject
from eosmuster.report.dossier.sections import section
from eosmuster.report.text import some

if TYPE_CHECKING:
    import jinja2

_TEMPLATES = Path(__file__).with_name("templates")
_LONGEST_PLAN = 40_000  # characters


def write_dossier(record: Record, file: BinaryIO) -> None:
    """Write the record as one self-contained HTML page, the answer first.

    Nothing in it depends on when or where it was made: two runs of one plan give the same bytes.
    """
    file.write(encoded(page(record)))


def page(record: Record) -> str:
    """Give the page as text."""
    environment = _environment()
    shown = data.subjects(record)
    places = data.ranked(shown)
    script = (_TEMPLATES / "sort.js").read_text(encoding="utf-8").strip()
    digest = base64.b64encode(hashlib.sha256(script.encode()).digest()).decode()
    return environment.get_template("page.html").render(
        title=svg.name(record.plan_title or record.plan_name or "Results", 300),
        service=_service(record),
        counts=words.counts(record),
        part=record.part,
        decision=[svg.name(line, 1000) for line in words.decision(record.decision)],
        legend=svg.name(words.legend(record), 1000),
        risk=words.RISK,
        passing=words.PASSING,
        sections=[section(record, subject, places, len(shown)) for subject in shown],
        left_properties=_left_properties(record, shown),
        mark_legend=maps.legend(),
        edge_legend=list(regions.EDGES.items()),
        regions_asked=record.regions_asked,
        tables=_tables(record, shown),
        cautions=[svg.name(line, 1000) for line in cautions(record)],
        identification=_identification(record),
        plan_text=_plan_text(record),
        style=svg.Markup(_style(environment, len(places))),
        script=svg.Markup(script),
        policy=f"default-src 'none'; style-src 'unsafe-inline'; script-src 'sha256-{digest}'; img-src data:; "
        "base-uri 'none'; form-action 'none'",
    )


def _service(record: Record) -> str:
    """Give the plan's service as it is shown; nothing if it states none."""
    stated = data.service(record.plan_text)
    return svg.name(stated, 300) if stated.strip() else ""


def _environment() -> jinja2.Environment:
    import jinja2

    return jinja2.Environment(
        loader=jinja2.FileSystemLoader(_TEMPLATES),
        autoescape=True,
        undefined=jinja2.StrictUndefined,
        trim_blocks=True,
        lstrip_blocks=True,
        keep_trailing_newline=False,
    )


def _style(environment: jinja2.Environment, candidates: int) -> str:
    """Fill in the style sheet; a picture's lines are coloured by the boxes above it that are ticked."""
    strokes = [colours.stroke(i) for i in range(candidates)]
    ramp = [(colour, colours.on(colour)) for colour in colours.RAMP]
    return environment.get_template("style.css").render(
        ramp=ramp, strokes=strokes, colours={n: getattr(colours, n) for n in dir(colours) if n.isupper()}
    )


def _left_properties(record: Record, shown: Sequence[Subject]) -> int:
    return len({row.property for row in record.summary} | {b.property for b in record.blocks}) - len(shown)


def _tables(record: Record, shown: Sequence[Subject]) -> dict[str, tables.Table]:
    return {
        "limits": remarks.tolerances(record),
        "worst": tables.worst(shown, record),
        "statements": remarks.statements(record),
        "conflicts": remarks.conflicts(record),
        "unsolved": remarks.unsolved(record),
        "no_reference": remarks.no_reference(record),
        "unavailable": remarks.unavailable(record),
        "left_out": remarks.left_out(record),
        "notes": remarks.notes(record),
        "constants": remarks.constants(record),
        "models": remarks.models(record),
        "citations": remarks.citations(record),
    }


@dataclass(frozen=True)
class Identified:
    """One line of what identifies the run."""

    what: str
    value: str


def _identification(record: Record) -> list[Identified]:
    points = sum(block.predicted.size for block in record.blocks)
    return [
        Identified("plan", svg.name(record.plan_name or "-", 200)),
        Identified("SHA-256 of the plan's text", data.fingerprint(record.plan_text)),
        *(Identified(f"SHA-256 of {svg.name(file)}", digest) for file, digest in record.files[:200]),
        Identified("version of the record", str(record.version)),
        Identified(
            "size of the record",
            f"{some(points, 'point')}, {some(len(record.summary), 'row')} of the summary, "
            f"{some(len(record.windows), 'window')}, {some(len(record.regions), 'region')}",
        ),
    ]


def _plan_text(record: Record) -> tuple[str, int]:
    """Give the plan as it was given, line by line made safe; and how many characters were left out."""
    lines = record.plan_text[:_LONGEST_PLAN].split("\n")
    kept = ("".join(c for c in line if c.isprintable() or c == "\t") for line in lines)
    return "\n".join(kept), max(len(record.plan_text) - _LONGEST_PLAN, 0)

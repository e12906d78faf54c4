"""Invented records: no number here is a property of a real fluid, and no model is as good or bad as shown."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from pathlib import Path

import numpy as np
import pytest

from eosmuster.record import POINT_VERDICTS, Block, Record, SummaryRow, WindowRow

NASTY_NAMES = (
    "cut, no. 7",
    'the "heavy" end',
    "two\nlines\r\nof name",
    "=cmd|' /C calc'!A0",
    "+1",
    "-2+3",
    "@SUM(A1)",
    "\ttab",
    "a|b*c_d`e`[x](y)<script>alert(1)</script>&amp;",
    "\x1b[31mred\x07",
    "\u202eright to left\u202c",
    "水とアンモニア",
    "x" * 5000,
    "",
    " ",
)

NOTES = ("", "simple rule: the uncertainty of the reference is not known", 'no phase split, "above" its own Tc')


def invented_block(
    component: str = "alphane",
    candidates: Sequence[str] = ("PR", "SRK"),
    states: int = 5,
    name: str = "saturation_pressure",
    unit: str = "Pa",
    source: str = "coolprop",
    seed: int = 0,
) -> Block:
    """Every verdict, every note and NaN wherever the contract allows an empty cell."""
    rng = np.random.default_rng(seed)
    shape = (len(candidates), states)
    temperature = np.linspace(200.0, 371.3, states) + rng.uniform(0.0, 0.1)
    reference = np.exp(20.0 - 2000.0 / temperature)
    reference[rng.uniform(size=states) < 0.1] = np.nan
    deviation = rng.normal(0.0, 2.0, shape)
    verdict = rng.integers(0, len(POINT_VERDICTS), shape).astype(np.int8)
    unsolved = verdict == POINT_VERDICTS.index("unsolved")
    deviation[unsolved] = np.nan
    predicted = reference * (1.0 + deviation / 100.0)
    deviation[np.isnan(predicted)] = np.nan
    probability = rng.uniform(0.0, 1.0, shape)
    probability[rng.uniform(size=shape) < 0.5] = np.nan
    probability[rng.uniform(size=shape) < 0.1] = 1e-300
    uncertainty = np.where(rng.uniform(size=states) < 0.5, np.nan, 0.1)
    return Block(
        component=component,
        cas="000-00-0",
        property=name,
        unit=unit,
        phase="two-phase",
        reference_source=source,
        candidates=tuple(candidates),
        independence=tuple(("independent", "constants", "fitted")[i % 3] for i in range(len(candidates))),
        temperature=temperature,
        pressure=np.where(rng.uniform(size=states) < 0.5, np.nan, 101325.0),
        reduced_temperature=temperature / 375.0,
        reference=reference,
        reference_uncertainty_pct=uncertainty,
        limit_pct=np.where(temperature > 300.0, 1.0, 3.0),
        predicted=predicted,
        deviation_pct=deviation,
        probability_inside=probability,
        verdict=verdict,
        note=rng.integers(0, len(NOTES), shape).astype(np.int16),
        notes=NOTES,
    )


def summary_of(block: Block, candidate: int) -> SummaryRow:
    """Count a block as the comparison would, statistics included."""
    n = dict(
        zip(
            POINT_VERDICTS, np.bincount(block.verdict[candidate], minlength=len(POINT_VERDICTS)).tolist(), strict=True
        )
    )
    size = np.abs(block.deviation_pct[candidate])
    known = size[~np.isnan(size)]
    points = len(block.temperature)
    undecided = n["undecided"] + n["unfit_reference"]
    if n["inside"] == points:
        verdict = "inside"
    elif n["outside"] + n["unsolved"] == 0:
        verdict = "undecided"
    else:
        verdict = "partly" if n["inside"] else "outside"
    some = bool(known.size)
    return SummaryRow(
        component=block.component,
        candidate=block.candidates[candidate],
        property=block.property,
        reference_source=block.reference_source,
        points=points,
        from_K=float(block.temperature[0]),
        to_K=float(block.temperature[-1]),
        aad_pct=float(known.mean()) if some else np.nan,
        bias_pct=float(np.nanmean(block.deviation_pct[candidate])) if some else np.nan,
        rms_pct=float(np.sqrt((known**2).mean())) if some else np.nan,
        median_pct=float(np.median(known)) if some else np.nan,
        p95_pct=float(np.quantile(known, 0.95)) if some else np.nan,
        max_pct=float(known.max()) if some else np.nan,
        max_at_K=float(block.temperature[np.nanargmax(size)]) if some else np.nan,
        inside=n["inside"],
        undecided=undecided,
        outside=n["outside"],
        unsolved=n["unsolved"],
        no_reference=n["no_reference"],
        share_inside=n["inside"] / points,
        passing_limit_pct=float(known.max()) if some and not n["unsolved"] else np.nan,
        false_acceptance_pct=np.nan,
        contested="",
        independence=block.independence[candidate],
        verdict=verdict,
    )


def unavailable_row(component: str, candidate: str, name: str, why: str) -> SummaryRow:
    """What a candidate cannot do at all."""
    nan = float("nan")
    numbers = (0, nan, nan, nan, nan, nan, nan, nan, nan, nan, 0, 0, 0, 0, nan, nan, nan)
    return SummaryRow(component, candidate, name, "coolprop", *numbers, "", "independent", "unavailable", 0, why)


def constants_of(family: str, *notes: str) -> dict[str, object]:
    """Give invented constants of one component, laid out as a sweep does."""
    return {
        "critical_temperature": {"value": 375.0, "unit": "K", "source": "invented"},
        "molar_mass": {"value": 0.1, "unit": "kg/mol", "source": "invented"},
        "class": family,
        "notes": list(notes),
    }


def invented_record(blocks: Sequence[Block], title: str = "An invented run") -> Record:
    """Bundle blocks with everything else a record holds."""
    summary = [summary_of(block, i) for block in blocks for i in range(len(block.candidates))]
    first = blocks[0].component if blocks else "nothing"
    name = blocks[0].property if blocks else "saturation_pressure"
    windows = [
        WindowRow(b.component, c, b.property, b.reference_source, 210.5, 340.25, "plan_limit", "limit")
        for b in blocks
        for c in b.candidates[:1]
    ]
    return Record(
        plan_name="invented",
        plan_title=title,
        plan_text='title = "An invented run"\n',
        blocks=tuple(blocks),
        summary=(*summary, unavailable_row(first, "PR-Twu91", name, "no Twu parameters for this component")),
        windows=tuple(windows),
        left_out=(("Air", "a blend: two saturation pressures at one temperature"),),
        decision={"rule": "guarded", "coverage_factor": 2.0, "unfit_ratio": 1.0 / 3.0},
        constants={first: constants_of("quantum gas", "acentric factor replaced: invented")},
        models={"PR": {"source": "invented"}},
        citations={"invented": "nobody, nowhere"},
        display={"temperature": "degC", "pressure": "bar"},
    )


@pytest.fixture(autouse=True)
def references(tmp_path_factory: pytest.TempPathFactory, monkeypatch: pytest.MonkeyPatch) -> Path:
    """Give the reference data a small folder of their own."""
    folder = tmp_path_factory.mktemp("references")
    (folder / "handbook").mkdir()
    (folder / "handbook" / "points.csv").write_bytes(b"invented\n")
    (folder / ".hidden").write_bytes(b"not data\n")
    monkeypatch.setattr("eosmuster.paths.references_folder", lambda: folder)
    return folder


@pytest.fixture
def block() -> Callable[..., Block]:
    return invented_block


@pytest.fixture
def constants() -> Callable[..., dict[str, object]]:
    return constants_of


@pytest.fixture
def record_of() -> Callable[..., Record]:
    return invented_record


@pytest.fixture
def nasty_names() -> tuple[str, ...]:
    return NASTY_NAMES


@pytest.fixture
def record() -> Record:
    """Three fluids, two properties, four candidates, every verdict."""
    models = ("vdW", "SRK", "PR", "PR78")
    blocks = [
        invented_block(fluid, models, 9, name, unit, seed=10 * i + j)
        for i, fluid in enumerate(("alphane", "betane", "gammol"))
        for j, (name, unit) in enumerate((("saturation_pressure", "Pa"), ("boiling_temperature", "K")))
    ]
    return invented_record(blocks)

"""summary.md of the largest catalogue and the worst of names: what a CI step summary takes, to the byte."""

from __future__ import annotations

import re
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from eosmuster.record import Record, WindowRow
from eosmuster.report.folder import save
from eosmuster.report.markdown import LIMIT, summary_markdown

COMPONENTS, MODELS = 130, 21
PROPERTIES = {
    "saturation_pressure": "Pa",
    "boiling_temperature": "K",
    "liquid_density": "mol/m3",
    "vapor_density": "mol/m3",
    "enthalpy_of_vaporization": "J/mol",
}
SECTIONS = (
    r"^\*\*Decision rule\*\*$",
    r"^## .*: candidates, worst first$",
    r"^### .*: fluids x candidates$",
    r"^## Largest deviations$",
    r"^## Rows that do not hold, worst first$",
    r"^## Windows of the 3 best candidates$",
    r"^## Unsolved points$",
    r"^## Unavailable$",
    r"^## Left out$",
    r"^## Contested references$",
    r"^## Notes on constants$",
    r"^## Cautions$",
)


def hostile(
    fill: str, fluids_of_it: int, block: Callable[..., Any], record_of: Callable[..., Record], constants: Any
) -> Record:
    """An invented run whose every name and note is as long as a plan allows, or longer, and grows when escaped."""
    fluids = [(f"{i:03d}" + fill * 60)[:60] for i in range(fluids_of_it)]
    models = [(f"{i:02d}" + fill * 60)[:60] for i in range(MODELS)]
    blocks, rows, windows = [], [], []
    for seed, (name, unit) in enumerate(PROPERTIES.items()):
        one = replace(
            block(fluids[0], models, 3, name, unit, f"measured:{fill * 60}", seed), notes=("", fill * 600, "x")
        )
        pattern = record_of([one]).summary[:MODELS]
        for fluid in fluids:
            blocks.append(replace(one, component=fluid))
            rows += [replace(row, component=fluid, note=fill * 300) for row in pattern]
            windows += [
                WindowRow(fluid, model, name, one.reference_source, 210.5, 340.25, "plan_limit", "limit")
                for model in models[:3]
            ]
    unavailable = replace(record_of(blocks[:1]).summary[-1], candidate="none")
    return replace(
        record_of([], title=fill * 5000),
        blocks=tuple(blocks),
        summary=(*rows, *(replace(unavailable, component=f, note=f"{i} {fill * 300}") for i, f in enumerate(fluids))),
        windows=tuple(windows),
        left_out=tuple((fluid * 20, fill * 1000) for fluid in fluids),
        conflicts=tuple((fluid, "saturation_pressure", fill * 1000) for fluid in fluids),
        constants={fluid: constants("associating", *[fill * 1000] * 3) for fluid in fluids},
        decision={
            "rule": "guarded",
            "tolerances": [{"property": fill, "limit": fill, "rationale": fill * 500}] * 500,
        },
    )


@pytest.mark.parametrize(
    ("fill", "components"),
    [("&", COMPONENTS), ("\U00020000", 10)],
    ids=["five bytes when escaped", "four bytes and two columns wide"],
)
def test_the_worst_of_names_leave_the_largest_run_below_the_limit(
    fill: str, components: int, block: Callable[..., Any], record_of: Callable[..., Record], constants: Any
) -> None:
    record = hostile(fill, components, block, record_of, constants)
    assert len(record.summary) == components * MODELS * len(PROPERTIES) + components
    text = summary_markdown(record)
    data = text.encode()
    assert len(data) < LIMIT == 1024 * 1024
    for section in SECTIONS:
        assert re.search(section, text, re.MULTILINE), section
    if components == COMPONENTS:
        assert len(data) > LIMIT // 16  # a table of every kind, not the bare headings
    left_out = re.findall(r"^(\d+) more rows? (?:is|are) left out here; all are in (\S+)\.$", text, re.MULTILINE)
    assert {file for _, file in left_out} >= {"manifest.json"}


def test_the_bytes_on_the_disk_are_those(record: Record, tmp_path: Path) -> None:
    folder = save(record, tmp_path / "results", points=False, overwrite=False)
    assert (folder / "summary.md").read_bytes() == summary_markdown(record).encode()


def test_the_worst_rows_are_those_that_are_shown(block: Callable[..., Any], record_of: Callable[..., Record]) -> None:
    """Of 500 rows that do not hold those with the smallest share inside are kept, and come first."""
    one = block("alphane", [f"m{i:04d}" for i in range(500)], 4)
    rng = np.random.default_rng(7)
    record = record_of([replace(one, verdict=rng.integers(0, 2, one.verdict.shape).astype(np.int8))])
    text = summary_markdown(record)
    table = text[text.index("## Rows that do not hold, worst first") : text.index("## Windows of")]
    inside = [int(line.split("|")[15]) for line in table.splitlines() if line.startswith("| saturation")]
    failing = sorted(row.inside for row in record.summary if row.verdict in ("outside", "partly"))
    assert 0 < len(inside) < len(failing)
    assert inside == failing[: len(inside)]

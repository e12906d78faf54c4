"""Small runs to compare, swept once each. The plant cut, its laboratory data and all limits are invented."""

from __future__ import annotations

import csv
import math
import shutil
from collections.abc import Callable, Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from eosmuster.api import sweep
from eosmuster.drifting.changes import (
    APPEARED,
    CAUSES,
    FLIPPED,
    MOVED,
    STATES,
    VANISHED,
    Change,
    Key,
    PointChange,
    RowChange,
    Run,
    worst_first,
)
from eosmuster.drifting.comparing import Drift
from eosmuster.record import SummaryRow

PLAN = """
title = "two fluids"
components = ["propane", "ethane"]
models = ["PR", "SRK"]
properties = ["saturation_pressure", "boiling_temperature", "liquid_density"]
[states]
reduced_temperature = [0.6, 0.7, 0.8, 0.9]
[references]
use = ["coolprop"]
"""

OWN = """
title = "a cut of the plant, invented"
components = ["plant cut 7"]
models = ["SRK", "my PR"]
properties = ["saturation_pressure"]
[states]
temperature = { from = "300 K", to = "480 K", points = 7 }
[tolerance]
saturation_pressure = "12 %"
[references]
use = ["coolprop"]
files = ["lab/*.csv"]
"""


@pytest.fixture(scope="session")
def plan() -> str:
    """Two fluids, two models, three properties: twelve rows."""
    return PLAN


@pytest.fixture(scope="session")
def own_plan(plant_cut: str) -> str:
    """A component and a model of the plan's own, against measured points: two rows."""
    return OWN + plant_cut


@pytest.fixture(scope="session")
def swept_folder(tmp_path_factory: pytest.TempPathFactory, lab: str) -> Iterator[Callable[..., Path]]:
    """Sweep a plan's text into a results folder; the same text is swept once. Take the folder as it is."""
    known: dict[tuple[Any, ...], Path] = {}

    usual = lab

    def folder(text: str = PLAN, points: bool = True, lab: str = usual, again: int = 0) -> Path:
        key = (text, points, lab, again)
        if key not in known:
            place = tmp_path_factory.mktemp("swept")
            (place / "lab").mkdir()
            (place / "lab" / "psat.csv").write_text(lab, encoding="utf-8")
            (place / "plan.toml").write_text(text, encoding="utf-8")
            known[key] = sweep(place / "plan.toml").save(place / "results", points=points, dossier=False)
        return known[key]

    yield folder
    known.clear()


@pytest.fixture
def base(swept_folder: Callable[..., Path]) -> Path:
    """The results of `PLAN`."""
    return swept_folder()


@pytest.fixture
def copy_of(tmp_path: Path) -> Callable[[Path], Path]:
    """Copy a results folder, so that it may be changed."""

    def copied(folder: Path, name: str = "copy") -> Path:
        return Path(shutil.copytree(folder, tmp_path / name))

    return copied


@pytest.fixture
def edit() -> Callable[..., None]:
    """Change cells of a CSV file: `change` takes a row as a dictionary and changes it in place."""

    def edited(path: Path, change: Callable[[dict[str, str]], None]) -> None:
        with path.open(encoding="utf-8", newline="") as file:
            reader = csv.DictReader(file)
            rows = list(reader)
        for row in rows:
            change(row)
        with path.open("w", encoding="utf-8", newline="") as file:
            writer = csv.DictWriter(file, reader.fieldnames or [], lineterminator="\n")
            writer.writeheader()
            writer.writerows(rows)

    return edited


def scaled(row: dict[str, str], names: tuple[str, ...], factor: float) -> None:
    """Scale some cells that are not empty."""
    for name in names:
        if row[name]:
            row[name] = repr(float(row[name]) * factor)


@pytest.fixture
def scale() -> Callable[..., None]:
    return scaled


@pytest.fixture
def patched_library(monkeypatch: pytest.MonkeyPatch) -> Callable[[float], None]:
    """Let the reference library give other saturation pressures, as a new version of it might."""
    from eosmuster.sources import library

    def patch(factor: float) -> None:
        original = library.saturation

        def other(*arguments: Any, **named: Any) -> Any:
            found = original(*arguments, **named)
            values = {n: v * factor if n == "saturation_pressure" else v for n, v in found.values.items()}
            return replace(found, values=values)

        monkeypatch.setattr(library, "saturation", other)

    return patch


@pytest.fixture
def patched_predictions(monkeypatch: pytest.MonkeyPatch) -> Callable[[float], None]:
    """Let every candidate predict a little more at one state and a little less at the next."""
    import numpy as np

    from eosmuster.sweeping.predictions import Predictions

    def patch(relative: float) -> None:
        original = Predictions.of

        def other(self: Predictions, number: int, name: str) -> Any:
            values, *rest = original(self, number, name)
            signs = np.where(np.arange(values.shape[1]) % 2, -1.0, 1.0)
            return (values * (1.0 + relative * signs * math.pi / 4.0), *rest)

        monkeypatch.setattr(Predictions, "of", other)

    return patch


NASTY_NAMES = (
    "cut, no. 7",
    'the "heavy" end',
    "two\nlines\r\nof name",
    "'=cmd|' /C calc'!A0",
    "a|b*c_d`e`[x](y)<script>alert(1)</script>&amp;",
    "\x1b[31mred\x07",
    "\u202eright to left\u202c",
    "水とアンモニア",
    "x" * 5000,
    "",
    " ",
)


@pytest.fixture(scope="session")
def nasty_names() -> tuple[str, ...]:
    return NASTY_NAMES


@pytest.fixture(scope="session")
def invented() -> Callable[..., Drift]:
    """Give a drift of `rows` rows with such names, in every state and of every cause."""

    def row(i: int) -> RowChange:
        names = [NASTY_NAMES[(i + j) % len(NASTY_NAMES)] + (str(i) if j == 0 else "") for j in range(4)]
        key = Key(*names)
        state = STATES[i % len(STATES)]
        verdicts = ("inside", "outside") if i % 8 else ("outside", "inside")
        old, new = (_summary(key, verdict, 0.5 + j * (i + 1)) for j, verdict in enumerate(verdicts))
        if state == MOVED:
            new = replace(new, verdict=old.verdict)
        point = PointChange(300.0, math.nan, (1.0, 2.0), (1.0, 1.0), (0.0, 100.0), (1.0, 1.0), ("inside", "outside"))
        return RowChange(
            key,
            state,
            (list(CAUSES)[i % len(CAUSES)], "coverage"),
            None if state == APPEARED else old,
            None if state == VANISHED else new,
            f"a note on {names[1]}",
            *((1, point) if state in (FLIPPED, MOVED) else (None, None)),
        )

    def drift(rows: int) -> Drift:
        runs = [Run(f"folder {name}", name, {"CoolProp": "8.0.0"}) for name in NASTY_NAMES[2:4]]
        changes = [
            Change(c, n, f"constants of {n}", n, "new") for c, n in zip(["", *CAUSES], NASTY_NAMES, strict=False)
        ]
        found = worst_first(row(i) for i in range(rows))
        return Drift(*runs, 1e-6, tuple(found), 3, tuple(changes), (f"a remark on {NASTY_NAMES[5]}",))

    return drift


def _summary(key: Key, verdict: str, aad: float) -> SummaryRow:
    nan = math.nan
    numbers = (5, 200.0, 300.0, aad, -aad, aad, aad, aad, 2.0 * aad, 300.0, 1, 1, 3, 0, 0.2, nan, nan)
    return SummaryRow(*key, *numbers, "", "independent", verdict)

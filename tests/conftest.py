"""What many tests share: the broad plan swept once, and small plans swept where they are needed."""

from __future__ import annotations

import os
import sys
from collections.abc import Callable, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

import pytest
from hypothesis import settings

if TYPE_CHECKING:
    import pandas as pd

    from eosmuster.api import Results

ROOT = Path(__file__).resolve().parents[1]

PLANT_CUT = """
[[component]]
name = "plant cut 7"
critical_temperature = "540.2 K"
critical_pressure = "27.4 bar"
acentric_factor = 0.35
molar_mass = "100.2 g/mol"
source = "crude assay, invented"
[[model]]
name = "my PR"
form = "Peng-Robinson"
alpha = "Soave"
parameters = { m = [0.37464, 1.54226, -0.26992] }
source = "invented for this test"
"""

# saturation pressures of the cut in kPa: those that its constants give in SRK, rounded to about 1 %
LAB = """substance,temperature [K],saturation pressure [kPa],u(saturation pressure) [kPa]
plant cut 7,320,14.3,0.1
plant cut 7,360,62.2,0.4
plant cut 7,400,186,1.2
plant cut 7,440,440,3
plant cut 7,470,755,5
"""

# the same examples in every run: a new one is looked for by the fuzzing scripts, not by a build
settings.register_profile("repeatable", derandomize=True)
settings.load_profile("repeatable")


def pytest_configure(config: pytest.Config) -> None:
    config.addinivalue_line("markers", "slow: takes several seconds (leave out with -m 'not slow')")


@pytest.fixture(scope="session")
def root() -> Path:
    """The checkout."""
    return ROOT


@pytest.fixture(scope="session")
def environment() -> Mapping[str, str]:
    """What a new interpreter needs to find the checkout's package, and nothing else of this one's settings."""
    kept = {name: value for name, value in os.environ.items() if not name.startswith(("PYTHON", "COLUMNS", "LINES"))}
    return kept | {"PYTHONPATH": str(ROOT / "harness"), "PYTHONUTF8": "1"}


@pytest.fixture(scope="session")
def python() -> str:
    return sys.executable


@pytest.fixture(scope="session")
def plant_cut() -> str:
    """An invented component and a model of a plan's own, as tables for its end."""
    return PLANT_CUT


@pytest.fixture(scope="session")
def lab() -> str:
    """Measured points of `plant_cut`, invented."""
    return LAB


@pytest.fixture(scope="session")
def broad() -> Results:
    """The broad plan, swept once for all tests; take it as it is and change nothing."""
    from eosmuster.api import sweep

    return sweep("broad")


@pytest.fixture(scope="session")
def broad_folder(broad: Results, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The results folder of the broad plan, points included."""
    return broad.save(tmp_path_factory.mktemp("swept") / "broad")


@pytest.fixture(scope="session")
def broad_points(broad_folder: Path) -> pd.DataFrame:
    """points.csv as anybody's script would read it."""
    return read_table(broad_folder / "points.csv")


@pytest.fixture(scope="session")
def broad_summary(broad_folder: Path) -> pd.DataFrame:
    return read_table(broad_folder / "summary.csv")


@pytest.fixture(scope="session")
def broad_windows(broad_folder: Path) -> pd.DataFrame:
    return read_table(broad_folder / "windows.csv")


TEXT_COLUMNS = {
    *("component", "cas", "candidate", "property", "phase", "unit", "reference_source", "verdict", "contested"),
    *("independence", "note", "from_end", "to_end"),
}


def read_table(path: Path) -> pd.DataFrame:
    """Read text as text ("" where a cell is empty) and every number to its last bit (NaN where it is empty)."""
    import pandas as pd

    table = pd.read_csv(path, dtype=str, keep_default_na=False)
    for name in table.columns.difference(sorted(TEXT_COLUMNS)):
        table[name] = [float(cell) if cell else float("nan") for cell in table[name].to_list()]
    return table


@pytest.fixture(scope="session")
def read() -> Callable[[Path], pd.DataFrame]:
    """Read a CSV file of a results folder."""
    return read_table


@pytest.fixture(scope="session")
def swept() -> Callable[[str], Results]:
    """Sweep a plan given as TOML."""
    from eosmuster.api import sweep
    from eosmuster.plan.reading import parse_plan

    def run(text: str) -> Results:
        return sweep(parse_plan(text, "small", "small.toml"))

    return run


@pytest.fixture
def plan_file(tmp_path: Path) -> Callable[..., Path]:
    """Write a plan of one component, one model and one property, or whatever is named instead."""

    def write(name: str = "small", **replaced: Any) -> Path:
        keys = {
            "components": '["propane"]',
            "models": '["PR"]',
            "properties": '["saturation_pressure"]',
            "tail": "[states]\nreduced_temperature = [0.6, 0.7, 0.8, 0.9]\n[references]\nuse = ['coolprop']\n",
        }
        keys |= replaced
        tail = keys.pop("tail")
        path = tmp_path / f"{name}.toml"
        path.write_text(
            "".join(f"{key} = {value}\n" for key, value in keys.items() if value) + tail, encoding="utf-8"
        )
        return path

    return write

"""What is installed is what is checked out: the wheel alone sweeps, in an empty folder, to the same bytes."""

from __future__ import annotations

import json
import subprocess
import zipfile
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import pytest

pytestmark = pytest.mark.slow


@pytest.fixture(scope="module")
def wheel(root: Path, python: str, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The wheel, built from the checkout by the build backend that the test extra brings along."""
    folder = tmp_path_factory.mktemp("wheel")
    command = [python, "-m", "hatchling", "build", "--target", "wheel", "--directory", str(folder)]
    done = subprocess.run(command, cwd=root, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stdout + done.stderr
    [built] = folder.glob("*.whl")
    return built


@pytest.fixture(scope="module")
def unpacked(wheel: Path, tmp_path_factory: pytest.TempPathFactory) -> Path:
    folder = tmp_path_factory.mktemp("unpacked")
    with zipfile.ZipFile(wheel) as archive:
        archive.extractall(folder)
    return folder


@pytest.fixture(scope="module")
def installed(unpacked: Path, environment: Mapping[str, str]) -> Mapping[str, str]:
    """An environment that finds the wheel's package, and the dependencies of the one the tests run in."""
    return {**environment, "PYTHONPATH": str(unpacked)}


@pytest.fixture(scope="module")
def swept_by_wheel(
    python: str, installed: Mapping[str, str], tmp_path_factory: pytest.TempPathFactory
) -> tuple[Path, str]:
    """The results folder of `eosmuster sweep` in an empty folder, and what it printed."""
    here = tmp_path_factory.mktemp("empty")
    done = subprocess.run(
        [python, "-m", "eosmuster", "sweep"],
        cwd=here,
        env=dict(installed),
        capture_output=True,
        text=True,
        check=False,
    )
    assert (done.returncode, done.stderr) == (0, "")
    assert [path.name for path in here.iterdir()] == ["eosmuster-results"]
    return here / "eosmuster-results" / "broad", done.stdout


def test_the_package_and_its_references_come_from_the_wheel(
    python: str, installed: Mapping[str, str], unpacked: Path, tmp_path: Path
) -> None:
    text = "import eosmuster.paths as p; print(p.__file__); print(p.references_folder())"
    done = subprocess.run(
        [python, "-c", text], cwd=tmp_path, env=dict(installed), capture_output=True, text=True, check=True
    )
    package, references = map(Path, done.stdout.splitlines())
    assert package.is_relative_to(unpacked.resolve())
    assert references == (unpacked / "eosmuster" / "_references").resolve()


def test_the_wheel_carries_every_reference_and_nothing_of_the_workshop(wheel: Path, root: Path) -> None:
    with zipfile.ZipFile(wheel) as archive:
        carried = {name: archive.read(name) for name in archive.namelist()}
    prefix = "eosmuster/_references/"
    references = {
        path.relative_to(root / "references").as_posix(): path.read_bytes()
        for path in (root / "references").rglob("*")
        if path.is_file() and "__pycache__" not in path.parts
    }
    assert {n.removeprefix(prefix): d for n, d in carried.items() if n.startswith(prefix)} == references
    assert {"eosmuster/py.typed", "eosmuster/plan/builtin/broad.toml"} <= set(carried)
    others = {name.split("/")[0] for name in carried} - {"eosmuster"}
    assert len(others) == 1
    assert next(iter(others)).endswith(".dist-info")
    workshop = [name for name in carried if name.startswith("eosmuster/") and "/test" in name]
    assert workshop == []


def test_the_command_is_installed(unpacked: Path) -> None:
    [entry_points] = unpacked.glob("*.dist-info/entry_points.txt")
    assert "eosmuster = eosmuster.cli:main" in entry_points.read_text(encoding="utf-8")


@pytest.mark.parametrize("name", ["points.csv", "summary.csv", "windows.csv", "summary.md"])
def test_a_sweep_from_the_wheel_gives_the_same_bytes(
    swept_by_wheel: tuple[Path, str], broad_folder: Path, name: str
) -> None:
    folder, _ = swept_by_wheel
    assert (folder / name).read_bytes() == (broad_folder / name).read_bytes()


def test_a_sweep_from_the_wheel_says_the_same(swept_by_wheel: tuple[Path, str], broad_folder: Path) -> None:
    folder, printed = swept_by_wheel
    contents: list[dict[str, Any]] = [
        json.loads((f / "manifest.json").read_text(encoding="utf-8")) for f in (folder, broad_folder)
    ]
    volatile = [content.pop("volatile") for content in contents]
    assert contents[0] == contents[1]
    assert volatile[0]["git_revision"] is None  # a wheel is no checkout
    assert printed.rstrip().endswith("results: eosmuster-results/broad")
    assert max(map(len, printed.splitlines())) <= 100


def test_the_folder_holds_the_files_of_the_contract(swept_by_wheel: tuple[Path, str]) -> None:
    folder, _ = swept_by_wheel
    contract = {"points.csv", "summary.csv", "windows.csv", "summary.md", "dossier.html", "manifest.json"}
    assert {path.name for path in folder.iterdir()} == contract
    assert (folder / "summary.md").stat().st_size < 2**20

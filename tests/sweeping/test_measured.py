"""Measured files of a plan: judged against like a table, and held against the library. All data here are invented."""

from pathlib import Path

import numpy as np
import pytest

from eosmuster.components import find
from eosmuster.errors import InputError
from eosmuster.plan.reading import load_plan
from eosmuster.sources import library
from eosmuster.sweeping.run import run

PLAN = """
title = "measured"
components = ["propane", "isobutane"]
models = ["PR"]
properties = ["saturation_pressure", "liquid_density", "boiling_temperature"]
[states]
reduced_temperature = { points = 11 }
[references]
use = ["coolprop"]
files = ["lab/*.csv"]
"""

T = np.array([250.0, 270.0, 290.0, 310.0, 330.0])


def pressures(name: str) -> np.ndarray:
    return library.saturation(find(name), T, ["saturation_pressure"]).values["saturation_pressure"]


def swept(folder: Path, text: str):
    (folder / "lab").mkdir()
    (folder / "lab" / "psat.csv").write_text(text, encoding="utf-8")
    (folder / "plan.toml").write_text(PLAN, encoding="utf-8")
    return run(load_plan(folder / "plan.toml"))


def csv(rows: list[tuple[str, float, float, float]]) -> str:
    head = "substance,temperature [degC],saturation pressure [kPa],u(saturation pressure) [kPa]"
    return "\n".join([head, *(f"{s},{t - 273.15:.2f},{p / 1e3:.6g},{u / 1e3:.4g}" for s, t, p, u in rows)]) + "\n"


def test_measured_points_are_judged_with_their_own_uncertainty(tmp_path: Path) -> None:
    p = pressures("propane")
    record = swept(tmp_path, csv([("propane", t, x * 1.0005, x * 1e-3) for t, x in zip(T, p, strict=True)]))
    [block] = [b for b in record.blocks if b.reference_source.startswith("measured:")]
    assert (block.component, block.property) == ("n-Propane", "saturation_pressure")
    np.testing.assert_allclose(block.temperature, T, atol=1e-9)
    np.testing.assert_allclose(block.reference, p * 1.0005, rtol=1e-5)  # six digits are printed
    np.testing.assert_allclose(block.reference_uncertainty_pct, 0.2, rtol=1e-3)  # k = 2
    assert set(block.independence) == {"independent"}
    assert block.contested == "no"
    assert not [c for c in record.conflicts if "psat.csv" in c[2]]


def test_files_are_hashed_in_the_manifest(tmp_path: Path) -> None:
    p = pressures("propane")
    record = swept(tmp_path, csv([("propane", t, x, x * 1e-3) for t, x in zip(T, p, strict=True)]))
    [(name, digest)] = record.files
    assert name == "lab/psat.csv"
    assert len(digest) == 64


def test_a_swap_is_named(tmp_path: Path) -> None:
    one, other = pressures("propane"), pressures("isobutane")
    rows = [("propane", t, x, x * 1e-3) for t, x in zip(T, other, strict=True)]
    rows += [("isobutane", t, x, x * 1e-3) for t, x in zip(T, one, strict=True)]
    record = swept(tmp_path, csv(rows))
    told = [c[2] for c in record.conflicts]
    assert any("exchanged" in sentence for sentence in told)
    assert {b.contested for b in record.blocks if b.property == "saturation_pressure"} == {"yes"}


def test_a_unit_slip_is_named(tmp_path: Path) -> None:
    p = pressures("propane") / 1.01325  # atm read as bar
    record = swept(tmp_path, csv([("propane", t, x, x * 1e-3) for t, x in zip(T, p, strict=True)]))
    assert any("1.01325" in c[2] or "atm" in c[2] for c in record.conflicts), record.conflicts


def test_what_cannot_be_read_is_said(tmp_path: Path) -> None:
    p = pressures("propane")
    rows = [("propane", t, x, x * 1e-3) for t, x in zip(T, p, strict=True)]
    record = swept(tmp_path, csv([*rows, ("unobtainium", 300.0, 1e5, 100.0)]))
    assert any("unobtainium" in why for _, why in record.left_out)
    assert any(b.reference_source.startswith("measured:") for b in record.blocks)


def test_a_pattern_without_files_is_one_sentence(tmp_path: Path) -> None:
    (tmp_path / "plan.toml").write_text(PLAN, encoding="utf-8")
    with pytest.raises(InputError, match=r"references.files: 'lab/\*.csv' names no file"):
        run(load_plan(tmp_path / "plan.toml"))

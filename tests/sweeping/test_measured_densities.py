"""Measured single-phase densities: judged inside the plan's rectangle and phase. All data here are invented."""

from __future__ import annotations

import os
from collections.abc import Iterator
from pathlib import Path

import numpy as np
import pytest

from eosmuster.api import read_plan
from eosmuster.combining import combine
from eosmuster.components import find
from eosmuster.drifting.comparing import drift
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind
from eosmuster.plan.parts import plan_part
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.record import Block, Record
from eosmuster.report.folder import save
from eosmuster.singlephase import solver
from eosmuster.sources import library
from eosmuster.sweeping.run import run

PLAN = """
title = "invented"
components = {components}
models = ["PR", "SRK"]
properties = {properties}
[states.single_phase]
temperature = {{ from = "20 degC", to = "60 degC", points = 3 }}
pressure = {{ from = "10 bar", to = "100 bar", points = 3 }}
phase = "{phase}"
[references]
use = ["coolprop"]
files = ["lab.csv"]
"""

CUT = """
[[component]]
name = "cut"
critical_temperature = 420.0
critical_pressure = "37 bar"
acentric_factor = 0.2
molar_mass = "60 g/mol"
source = "invented"
"""

HEAD = "component,phase,temperature [degC],pressure [bar],density [mol/L],u(density) [mol/L]"

# propane boils at 8.4 bar at 20 degC, 13.7 bar at 40 degC and 21.2 bar at 60 degC (Lemmon et al., J. Chem. Eng. Data
# 54 (2009) 3141, as the library has it); the densities are invented
LINES = (
    "propane,liquid,60,100,10.600,0.01",  # a corner of the plan
    "propane,liquid,20,10,11.300,0.01",  # and another
    "propane,liquid,20,10,11.300,0.01",  # the same point again
    "propane,vapor,60,15,0.67,0.002",
    "propane,,40,50,11.100,",  # liquid, by the saturation line
    "propane,,40,12,0.58,0.001",  # vapor
    "propane,liquid,61,50,10.1,0.01",  # warmer than the plan
    "propane,liquid,40,101,11.2,0.01",  # above its pressures
)


def swept(folder: Path, lines: tuple[str, ...] = LINES, tail: str = "", **replaced: str) -> Record:
    keys = {"components": '["propane"]', "properties": '["density"]', "phase": "stable"} | replaced
    (folder / "lab.csv").write_text("\n".join([HEAD, *lines]) + "\n", encoding="utf-8")
    (folder / "plan.toml").write_text(PLAN.format(**keys) + tail, encoding="utf-8")
    return run(read_plan(folder / "plan.toml"))


def measured(record: Record) -> list[Block]:
    return [block for block in record.blocks if block.reference_source == "measured:lab.csv"]


def states(block: Block) -> list[tuple[float, float]]:
    celsius, bar = block.temperature - 273.15, block.pressure / 1e5
    return [(round(t, 6), round(p, 6)) for t, p in zip(celsius.tolist(), bar.tolist(), strict=True)]


@pytest.mark.parametrize(
    ("phase", "expected"),
    [
        ("stable", [(20, 10), (40, 12), (60, 15), (40, 50), (60, 100)]),
        ("liquid", [(20, 10), (40, 50), (60, 100)]),
        ("vapor", [(40, 12), (60, 15)]),
        ("supercritical", []),
    ],
)
def test_points_in_the_rectangle_and_the_phase_are_judged(
    phase: str, expected: list[tuple[float, float]], tmp_path: Path
) -> None:
    record = swept(tmp_path, phase=phase)
    assert [at for block in measured(record) for at in states(block)] == expected
    assert [block.phase for block in measured(record)] == [phase] * bool(expected)


def test_they_are_judged_like_the_library_with_their_own_uncertainty(tmp_path: Path) -> None:
    record = swept(tmp_path, phase="liquid")
    [block] = measured(record)
    assert block.reference == pytest.approx([11300.0, 11100.0, 10600.0], rel=1e-12)
    assert block.reference_uncertainty_pct == pytest.approx([2 / 11.3, np.nan, 2 / 10.6], rel=1e-9, nan_ok=True)
    assert (set(block.independence), block.unit, block.candidates) == ({"independent"}, "mol/m3", ("PR", "SRK"))
    parameters = bind(CATALOGUE["SRK"], [find("propane")]).parameters.take(0)
    own = solver.at_pressure(parameters, block.temperature, block.pressure, "liquid").density
    assert block.predicted[1] == pytest.approx(own, rel=1e-12)
    assert block.deviation_pct[1] == pytest.approx(100.0 * (own / block.reference - 1.0), rel=1e-9)
    rows = [r for r in record.summary if r.reference_source == "measured:lab.csv"]
    assert [(r.candidate, r.points, r.unsolved) for r in rows] == [("PR", 3, 0), ("SRK", 3, 0)]
    assert record.citations["measured:lab.csv"] == "lab.csv, which names no publication"


def test_no_region_is_looked_for_in_them(tmp_path: Path) -> None:
    record = swept(tmp_path)
    assert {region.reference_source for region in record.regions} == {"coolprop"}
    assert [block.reference_source for block in record.blocks] == ["coolprop", "measured:lab.csv"]
    (tmp_path / "alone").mkdir()
    without = run(read_plan(_without_files(tmp_path / "alone")))
    assert [(r.candidate, r.share) for r in without.regions] == [(r.candidate, r.share) for r in record.regions]


def _without_files(folder: Path) -> Path:
    text = PLAN.format(components='["propane"]', properties='["density"]', phase="stable")
    (folder / "plan.toml").write_text(text.replace('files = ["lab.csv"]', ""), encoding="utf-8")
    return folder / "plan.toml"


def test_a_compressibility_factor_follows_with_the_packages_gas_constant(tmp_path: Path) -> None:
    record = swept(tmp_path, properties='["density", "compressibility_factor", "speed_of_sound"]')
    density, factor = measured(record)
    assert (density.property, factor.property) == ("density", "compressibility_factor")
    expected = density.pressure / (density.reference * GAS_CONSTANT * density.temperature)
    assert factor.reference == pytest.approx(expected, rel=1e-14)
    assert np.array_equal(factor.reference_uncertainty_pct, density.reference_uncertainty_pct, equal_nan=True)
    # a density too low by x % is a factor too high by as much, both being of one T and p
    assert (1.0 + factor.deviation_pct / 100.0) * (1.0 + density.deviation_pct / 100.0) == pytest.approx(1.0)


def test_what_is_not_judged_is_counted_in_one_line_a_set(tmp_path: Path) -> None:
    # in a laboratory file all points of one substance and phase are one set
    liquids = (
        "n-Propane",
        "lab.csv, block 1: 2 of 4 densities are not judged: 2 outside the plan's temperatures and pressures",
    )
    vapors = ("n-Propane", "lab.csv, block 1: 1 of 1 densities are not judged: 1 not liquid")
    others = ("n-Propane", "lab.csv, block 1: 1 of 2 densities are not judged: 1 not liquid")
    record = swept(tmp_path, phase="liquid")
    assert [line for line in record.left_out if "judged" in line[1]] == [liquids, vapors, others]
    assert [line for line in swept(tmp_path).left_out if "judged" in line[1]] == [liquids]


def test_above_the_critical_temperature_every_point_is_supercritical(tmp_path: Path) -> None:
    """Ethane's Tc is 305.32 K, 32.2 degC, and methane's far below."""
    lines = ("methane,vapor,25,50,2.2,0.01", "ethane,,60,100,7.6,0.01", "ethane,liquid,25,80,11.9,0.01")
    keys = {"components": '["methane", "ethane"]'}
    hot = {b.component: states(b) for b in measured(swept(tmp_path, lines, phase="supercritical", **keys))}
    assert hot == {"Methane": [(25.0, 50.0)], "Ethane": [(60.0, 100.0)]}
    cold = {b.component: states(b) for b in measured(swept(tmp_path, lines, phase="liquid", **keys))}
    assert cold == {"Ethane": [(25.0, 80.0)]}


def test_a_component_of_the_plans_own_is_judged(tmp_path: Path) -> None:
    lines = ("cut,liquid,40,50,9.100,0.02", "cut,,60,50,8.800,0.02")
    keys = {"components": '["cut"]', "tail": CUT}
    record = swept(tmp_path, lines, phase="liquid", **keys)
    [block] = record.blocks
    assert (block.component, states(block)) == ("cut", [(40.0, 50.0)])
    assert record.regions == ()
    unknown = "1 of a phase that neither the file nor the library's saturation line tells"
    assert record.left_out == (("cut", f"lab.csv, block 1: 1 of 1 densities are not judged: {unknown}"),)
    both = '["density", "speed_of_sound", "residual_enthalpy"]'
    record = swept(tmp_path, lines, properties=both, **keys)
    assert [states(block) for block in record.blocks] == [[(40.0, 50.0), (60.0, 50.0)]]
    why = "no reference for its speed of sound, residual enthalpy: only its density was measured"
    assert record.left_out == (("cut", why),)


def test_parts_folders_and_drift_keep_them(tmp_path: Path) -> None:
    lines = (*LINES, "cut,liquid,40,50,9.100,0.02", "cut,liquid,70,50,9.100,0.02")
    whole = swept(tmp_path, lines, components='["propane", "cut"]', tail=CUT)
    folder = save(whole, tmp_path / "whole", overwrite=False)
    assert b"measured:lab.csv" in (folder / "points.csv").read_bytes()
    parts = []
    for number in (1, 2):
        plan = plan_part(read_plan(tmp_path / "plan.toml"), number, 2)
        parts.append(save(run(plan), tmp_path / f"part-{number}", overwrite=False, points=False, dossier=False))
    _, record = combine(parts)
    together = save(record, tmp_path / "together", overwrite=False)
    names = {path.name for path in folder.iterdir()}
    assert names == {path.name for path in together.iterdir()}
    differ = {name for name in names if (folder / name).read_bytes() != (together / name).read_bytes()}
    assert differ <= {"manifest.json"}  # holds the time of the run
    assert not drift(folder, together)
    (tmp_path / "lab.csv").write_text("\n".join([HEAD, *lines]).replace("9.100,", "9.200,") + "\n", encoding="utf-8")
    changed = drift(
        folder, save(run(read_plan(tmp_path / "plan.toml")), tmp_path / "changed", overwrite=False, dossier=False)
    )
    assert {(row.key.component, row.key.reference_source) for row in changed.rows} == {("cut", "measured:lab.csv")}
    assert {row.causes for row in changed.rows} == {("reference:measured",)}


FOLDER = os.environ.get("EOSMUSTER_THERMOML", "")


def _real(folder: Path, component: str, phase: str) -> Iterator[Block]:
    text = f"""
    title = "real"
    components = ["{component}"]
    models = ["PR"]
    properties = ["density"]
    [states.single_phase]
    temperature = {{ from = 100.0, to = 600.0, points = 2 }}
    pressure = {{ from = "0.1 bar", to = "2000 bar", points = 2 }}
    phase = "{phase}"
    [references]
    use = ["coolprop"]
    files = [{", ".join(f"'{FOLDER}/{name}.xml'" for name in ("je0497496", "j.jct.2015.09.034"))}]
    """
    (folder / "plan.toml").write_text(text, encoding="utf-8")
    yield from (b for b in run(read_plan(folder / "plan.toml")).blocks if b.reference_source.startswith("measured:"))


@pytest.mark.skipif(not FOLDER, reason="EOSMUSTER_THERMOML names no folder of ThermoML files; they are not ours")
@pytest.mark.parametrize(
    ("component", "phase", "points"),
    [("methane", "stable", 16), ("R134a", "stable", 78), ("nitrogen", "supercritical", 58)],
)
def test_real_densities_lie_on_the_reference_equation(
    component: str, phase: str, points: int, tmp_path: Path
) -> None:
    """All points of the papers' tables, within 0.5 %: more than either states for its densities, and less than any
    unit or phase mistaken.
    """
    [block] = _real(tmp_path, component, phase)
    assert block.temperature.size == points
    expected = library.density(find(component), block.temperature, block.pressure)
    assert block.reference == pytest.approx(expected, rel=5e-3)
    assert not np.isnan(block.deviation_pct).any()

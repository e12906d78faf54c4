"""The watchdog on single-phase densities: who stands alone, where, and in which phase. All data here are invented."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from eosmuster.api import read_plan
from eosmuster.components import find
from eosmuster.record import Record
from eosmuster.report.folder import save
from eosmuster.sources import library_states
from eosmuster.sweeping.run import run

PLAN = """
title = "invented"
components = ["propane"]
models = ["PR", "SRK"]
properties = {properties}
[states.single_phase]
temperature = {{ from = 300.0, to = 340.0, points = 3 }}
pressure = {{ from = "5 bar", to = "100 bar", points = 3 }}
phase = "{phase}"
[references]
use = {use}
files = ["lab/*.csv"]
"""

LIQUID = ((300.0, 40e5), (310.0, 60e5), (320.0, 50e5), (330.0, 80e5))
VAPOR = ((300.0, 6e5), (310.0, 7e5), (320.0, 8e5), (330.0, 9e5))
BETWEEN = ((301.0, 40e5), (312.0, 81e5), (325.0, 55e5), (330.0, 45e5))


def lab(
    folder: Path, name: str, factor: float, states: tuple[tuple[float, float], ...], u: float = 1e-3, u_T: float = 0.0
) -> None:
    """Write densities that are the library's times a factor, with a relative uncertainty."""
    T, p = np.array(states).T
    rho = factor * library_states.density(find("propane"), T, p)
    head = "component,temperature [K],pressure [Pa],density [mol/m3],u(density) [mol/m3],u(temperature) [K]"
    lines = [f"propane,{t},{x},{r:.6g},{u * r:.4g},{u_T or ''}" for t, x, r in zip(T, p, rho, strict=True)]
    (folder / "lab").mkdir(exist_ok=True)
    (folder / "lab" / f"{name}.csv").write_text("\n".join([head, *lines]) + "\n", encoding="utf-8")


def swept(
    folder: Path, properties: str = '["density"]', phase: str = "stable", use: str = '["coolprop"]', tail: str = ""
) -> Record:
    text = PLAN.format(properties=properties, phase=phase, use=use) + tail
    (folder / "plan.toml").write_text(text, encoding="utf-8")
    return run(read_plan(folder / "plan.toml"))


def contested(record: Record) -> dict[tuple[str, str], str]:
    return {(b.property, b.reference_source.rpartition("/")[2]): b.contested for b in record.blocks}


def told(record: Record) -> list[str]:
    return [sentence for _, _, sentence in record.conflicts if "disagree" in sentence or "stand" in sentence]


def test_a_shifted_set_stands_alone_with_size_and_range(tmp_path: Path) -> None:
    for name, factor in (("good", 1.0), ("fair", 1.001), ("shifted", 1.03)):
        lab(tmp_path, name, factor, LIQUID)
    record = swept(tmp_path)
    assert set(contested(record).values()) == {"yes"}
    [sentence] = told(record)
    size = "+3.00 % (median; 3.00 % at most)"  # of the medians against three: 3.00, 3.00 and 2.90 %
    others = "coolprop, measured:lab/fair.csv, measured:lab/good.csv"
    where = "300.0-330.0 K, 40-80 bar, liquid"
    assert sentence == f"measured:lab/shifted.csv stands alone against {others} by {size}, {where}"
    assert {(r.reference_source, r.contested) for r in record.summary} >= {("coolprop", "yes")}
    verdicts = {(r.candidate, r.reference_source) for r in record.summary if r.verdict}
    assert len(verdicts) == 2 * 4  # against each reference
    folder = save(record, tmp_path / "out", overwrite=False)
    for name in ("summary.md", "dossier.html", "manifest.json"):
        assert "shifted.csv stands alone" in (folder / name).read_text(encoding="utf-8"), name
    assert ",yes," in (folder / "points.csv").read_text(encoding="utf-8").splitlines()[1]


def test_sets_that_agree_are_not_contested_and_a_lone_library_is_not_asked(tmp_path: Path) -> None:
    lab(tmp_path, "good", 1.0, LIQUID)
    record = swept(tmp_path, '["density", "speed_of_sound"]')
    found = contested(record)
    assert (found["density", "coolprop"], found["density", "good.csv"]) == ("no", "no")
    assert found["speed_of_sound", "coolprop"] == ""
    assert record.conflicts == ()


def test_two_sources_have_no_majority_and_a_stated_uncertainty_excuses(tmp_path: Path) -> None:
    lab(tmp_path, "shifted", 1.03, LIQUID)
    [sentence] = told(swept(tmp_path))
    assert sentence.startswith("coolprop and measured:lab/shifted.csv disagree by -2.91 %")
    assert sentence.endswith("no majority tells which is right")
    lab(tmp_path, "shifted", 1.03, LIQUID, u=0.02)  # U of 4 %
    assert told(swept(tmp_path)) == []


def test_the_uncertainty_of_temperatures_excuses_as_well(tmp_path: Path) -> None:
    """Liquid propane loses some 0.4 % a K here: 1.5 % is more than U(rho), and less than 2 u(T) of 4 K makes it."""
    lab(tmp_path, "shifted", 1.015, LIQUID)
    assert len(told(swept(tmp_path))) == 1
    lab(tmp_path, "shifted", 1.015, LIQUID, u_T=4.0)
    assert told(swept(tmp_path)) == []


def test_sets_without_common_states_are_compared_through_the_library(tmp_path: Path) -> None:
    """Two sets agree, 3 % off the library: it stands alone, and the bigger one has no more votes than the other."""
    lab(tmp_path, "one", 1.03, LIQUID)
    lab(tmp_path, "other", 1.031, BETWEEN)
    [sentence] = told(swept(tmp_path, phase="liquid"))
    assert sentence.startswith("coolprop stands alone against measured:lab/one.csv, measured:lab/other.csv by -2.9")
    assert sentence.endswith("300.0-330.0 K, 40-81 bar, liquid")


def test_phases_are_compared_by_themselves(tmp_path: Path) -> None:
    """A source of both phases is 5 % off in the vapor alone; a few points of the liquid do not drown in it."""
    lab(tmp_path, "liquid", 1.0, LIQUID)
    lab(tmp_path, "vapor", 1.05, VAPOR)
    [sentence] = told(swept(tmp_path))
    assert sentence.startswith("coolprop and measured:lab/vapor.csv disagree by -4.76 %")
    assert "300.0-330.0 K, 6-9 bar, vapor" in sentence


def test_without_the_library_only_common_states_are_compared(tmp_path: Path) -> None:
    lab(tmp_path, "one", 1.0, LIQUID)
    lab(tmp_path, "other", 1.03, LIQUID)
    record = swept(tmp_path, use='["handbook"]', phase="liquid")
    assert set(contested(record).values()) == {"yes"}
    lab(tmp_path, "other", 1.03, BETWEEN)
    record = swept(tmp_path, use='["handbook"]', phase="liquid")
    assert told(record) == []


@pytest.mark.parametrize("properties", ['["compressibility_factor"]', '["compressibility_factor", "density"]'])
def test_a_compressibility_factor_is_contested_where_the_density_is(properties: str, tmp_path: Path) -> None:
    for name, factor in (("good", 1.0), ("fair", 1.001), ("shifted", 1.03)):
        lab(tmp_path, name, factor, LIQUID)
    record = swept(tmp_path, properties)
    assert set(contested(record).values()) == {"yes"}
    assert len(told(record)) == 1


def test_the_uncertainty_of_a_temperature_makes_a_verdict_undecided(tmp_path: Path) -> None:
    """A density just inside the limit: 0.05 % from it, with U(rho) of 0.02 %, and u(T) = 0.2 K worth 0.08 %."""
    lab(tmp_path, "a", 1.0, LIQUID[1:2], u=1e-4)
    tail = '[tolerance]\ndensity = "{:.6f} %"\n'
    [first] = [b for b in swept(tmp_path).blocks if b.reference_source != "coolprop"]
    limit = abs(float(first.deviation_pct[0, 0])) + 0.05
    verdicts, notes, uncertainties = [], [], []
    for u_T in (0.0, 0.2):
        lab(tmp_path, "a", 1.0, LIQUID[1:2], u=1e-4, u_T=u_T)
        record = swept(tmp_path, tail=tail.format(limit))
        [block] = [b for b in record.blocks if b.reference_source != "coolprop"]
        [row] = [r for r in record.summary if r.reference_source != "coolprop" and r.candidate == "PR"]
        verdicts.append(row.verdict)
        notes.append((block.notes[block.note[0, 0]], row.note))
        uncertainties.append(float(block.reference_uncertainty_pct[0]))
    assert verdicts == ["inside", "undecided"]
    by_temperature, _ = library_states.density_slopes(find("propane"), *np.array(LIQUID[1:2]).T)
    of_T = 200.0 * 0.2 * float(by_temperature[0]) / float(block.reference[0])
    assert uncertainties == pytest.approx([0.02, np.hypot(0.02, of_T)], rel=1e-3)  # u is printed with four digits
    said = "the reference's uncertainty includes that of its temperature"
    assert notes == [("", ""), (said, f"1 point: {said}")]


def test_saturated_points_combine_theirs_likewise(tmp_path: Path) -> None:
    text = """
    title = "invented"
    components = ["propane"]
    models = ["PR"]
    properties = ["saturation_pressure"]
    [states]
    temperature = ["290 K", "310 K"]
    [references]
    use = ["coolprop"]
    files = ["psat.csv"]
    """
    (tmp_path / "plan.toml").write_text(text, encoding="utf-8")
    head = "component,temperature [K],u(temperature) [K],saturation pressure [Pa],u(saturation pressure) [Pa]"
    (tmp_path / "psat.csv").write_text(f"{head}\npropane,300,0.1,997683,500\npropane,305,,1130000,500\n")
    [block] = [b for b in run(read_plan(tmp_path / "plan.toml")).blocks if b.reference_source != "coolprop"]
    with_state = 200.0 * np.hypot(500.0, 0.1 * 25077.0) / 997683.0  # dp/dT of propane there is 25.08 kPa/K
    assert block.reference_uncertainty_pct == pytest.approx([with_state, 1e5 / 1130000.0], rel=1e-4)
    said = "the reference's uncertainty includes that of its temperature"
    assert [block.notes[i] for i in block.note[0]] == [said, ""]

"""Measured files of a plan: judged against like a table, and held against the library. All data here are invented."""

import hashlib
import json
from pathlib import Path

import numpy as np
import pytest

from eosmuster.components import find
from eosmuster.errors import InputError
from eosmuster.plan.reading import load_plan
from eosmuster.record import CAUSE_FOUND
from eosmuster.sources import library
from eosmuster.sources.measured.table import MeasuredSet, Source
from eosmuster.sweeping.measured import citations, measure
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


def swept(folder: Path, text: str, plan: str = PLAN):
    (folder / "lab").mkdir()
    (folder / "lab" / "psat.csv").write_text(text, encoding="utf-8")
    (folder / "plan.toml").write_text(plan, encoding="utf-8")
    return run(load_plan(folder / "plan.toml"))


def measured(component, name: str, values: np.ndarray, source: Source) -> MeasuredSet:
    n, nothing = values.size, np.full(values.size, np.nan)
    zero = np.zeros(n, np.int64)
    rows = {"rows": zero, "temperature": nothing, "pressure": nothing, "values": values}
    uncertainties = {"standard_uncertainty": nothing, "rounding": nothing}
    of_state = {"temperature_uncertainty": nothing, "pressure_uncertainty": nothing}
    flags = {"origin": zero.astype(np.int8), "level_assumed": zero.astype(bool), "repeats": zero.astype(bool)}
    where = (source, 1, 1, component, component.name, name, "two-phase", "saturated", "")
    return MeasuredSet(*where, **rows, **uncertainties, **of_state, digits=zero, **flags)


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


@pytest.mark.parametrize(
    ("properties", "why"),
    [
        (["saturation_pressure"], []),
        (
            ["saturation_pressure", "liquid_density"],
            ["no reference for its saturated liquid density: the reference library has no equation for it"],
        ),
        (["liquid_density"], ["the reference library has no equation for it"]),
    ],
    ids=["judged", "in part", "not judged"],
)
def test_an_own_component_is_left_out_of_what_nothing_judges(
    tmp_path: Path, plant_cut: str, lab: str, properties: list[str], why: list[str]
) -> None:
    asked = PLAN.replace('"saturation_pressure", "liquid_density", "boiling_temperature"', str(properties)[1:-1])
    asked = asked.replace('"isobutane"', '"plant cut 7"') + plant_cut
    record = swept(tmp_path, lab, asked)
    assert [reason for what, reason in record.left_out if what == "plant cut 7"] == why
    judged = {row.property for row in record.summary if row.component == "plant cut 7"}
    assert judged == {"saturation_pressure"} & set(properties)


def test_files_are_hashed_in_the_manifest(tmp_path: Path) -> None:
    p = pressures("propane")
    record = swept(tmp_path, csv([("propane", t, x, x * 1e-3) for t, x in zip(T, p, strict=True)]))
    [(name, digest)] = record.files
    assert name == "lab/psat.csv"
    assert len(digest) == 64


def test_files_that_yield_nothing_are_hashed_too(tmp_path: Path) -> None:
    """What is wrong with them is said in the results, so they are as much of the evidence."""
    lab = tmp_path / "lab"
    lab.mkdir()
    (lab / "empty.csv").write_bytes(b"")
    (lab / "spoilt.csv").write_text("x,y\n1,2\n", encoding="utf-8")
    (lab / "spoilt.json").write_text("no JSON", encoding="utf-8")
    (lab / "gone.csv").symlink_to("nowhere")
    (tmp_path / "plan.toml").write_text(PLAN, encoding="utf-8")
    found = measure(load_plan(tmp_path / "plan.toml"), lambda *_: None)
    assert not found.series
    assert [name for name, _ in found.files] == ["lab/empty.csv", "lab/spoilt.csv", "lab/spoilt.json"]
    assert found.files[0][1] == hashlib.sha256(b"").hexdigest()


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


def test_a_known_cause_comes_first_and_settles_who_is_right(tmp_path: Path) -> None:
    gauge = pressures("propane") - 101325.0
    record = swept(tmp_path, csv([("propane", t, x, x * 1e-3) for t, x in zip(T, gauge, strict=True)]))
    first, second = (c[2] for c in record.conflicts)
    assert first.startswith(
        f"{CAUSE_FOUND}lab/psat.csv, block 1: n-Propane, saturation_pressure: the values are 101325"
    )
    assert second.endswith("; it is known what is wrong with measured:lab/psat.csv")


def test_columns_that_are_exchanged_are_named_and_nothing_else(tmp_path: Path) -> None:
    """Not the density of the vapor, which a pressure in bar may lie near as a number."""
    p, component = pressures("propane"), find("propane")
    density = library.saturation(component, T, ["liquid_density"]).values["liquid_density"] * component.molar_mass
    head = "component,temperature [K],saturation_pressure [bar],liquid_density [kg/m3]"
    rows = [f"propane,{t},{rho:.5g},{x / 1e5:.5g}" for t, rho, x in zip(T, density, p, strict=True)]
    record = swept(tmp_path, "\n".join([head, *rows]) + "\n")
    known = [c[2] for c in record.conflicts if c[2].startswith(CAUSE_FOUND)]
    assert len(known) == 2
    assert all("the two columns are exchanged" in sentence for sentence in known)
    assert not [c for c in record.conflicts if "root" in c[2] or "no majority" in c[2]]


def test_vapor_in_place_of_liquid_is_named(tmp_path: Path) -> None:
    component = find("propane")
    density = library.saturation(component, T, ["vapor_density"]).values["vapor_density"]
    rows = [f"propane,{t},{rho:.6g}" for t, rho in zip(T, density, strict=True)]
    record = swept(tmp_path, "\n".join(["component,temperature [K],liquid_density [mol/m3]", *rows]) + "\n")
    assert "the vapor root is reported as liquid" in record.conflicts[0][2]


def test_temperatures_of_another_scale_are_named(tmp_path: Path) -> None:
    head, p = "component,temperature [degC],saturation_pressure [kPa]", pressures("propane")
    rows = [f"propane,{t * 1.8 - 459.67:.2f},{x / 1e3:.6g}" for t, x in zip(T, p, strict=True)]
    record = swept(tmp_path, "\n".join([head, *rows]) + "\n")
    assert "the temperatures are in degF, stored as degC" in record.conflicts[0][2]


def test_what_is_only_said_is_not_called_left_out(tmp_path: Path) -> None:
    text = csv([("propane", t, x, x * 1e-3) for t, x in zip(T, pressures("propane"), strict=True)])
    record = swept(tmp_path, text.replace(",", ";") + "unobtainium;20;1000;1\n")
    assert [note for _, note in record.notes] == ["its cells are delimited by semicolons, it seems"]
    assert [("unobtainium" in why, "semicolons" in why) for _, why in record.left_out] == [(True, False)]


def test_what_cannot_be_read_is_said(tmp_path: Path) -> None:
    p = pressures("propane")
    rows = [("propane", t, x, x * 1e-3) for t, x in zip(T, p, strict=True)]
    record = swept(tmp_path, csv([*rows, ("unobtainium", 300.0, 1e5, 100.0)]))
    assert any("unobtainium" in why for _, why in record.left_out)
    assert any(b.reference_source.startswith("measured:") for b in record.blocks)


def test_sources_are_cited_with_the_files_they_were_read_from(tmp_path: Path) -> None:
    """What a manifest and a dossier cite: the DOI, else what the descriptor says, else that there is nothing."""
    p, lab = pressures("propane"), tmp_path / "lab"
    lab.mkdir()
    for name in ("named.csv", "bare.csv"):
        text = csv([("propane", t, x, x * 1e-3) for t, x in zip(T, p, strict=True)])
        (lab / name).write_text(text, encoding="utf-8")
    descriptor = {"fields": [{"name": "substance"}], "sources": [{"title": "Nobody: campaign 7 (invented)"}]}
    (lab / "named.json").write_text(json.dumps(descriptor), encoding="utf-8")
    (tmp_path / "plan.toml").write_text(PLAN, encoding="utf-8")
    found = measure(load_plan(tmp_path / "plan.toml"), lambda *_: None)
    assert found.citations == {"measured:lab/bare.csv": "lab/bare.csv, which names no publication"}
    assert {one.source for one in found.series} == {"measured:lab/bare.csv"}  # the other repeats its points
    (lab / "bare.csv").unlink()
    found = measure(load_plan(tmp_path / "plan.toml"), lambda *_: None)
    assert found.citations == {"measured:lab/named.csv": "Nobody: campaign 7 (invented) (read from lab/named.csv)"}


def test_one_paper_in_two_files_is_cited_once() -> None:
    paper = [Source(f"lab/{name}.xml", "10.1234/x", "Nobody, N.: On propane (2031)") for name in "ab"]
    sets = [measured(find("propane"), "saturation_pressure", np.ones(1), source=source) for source in paper]
    text = "Nobody, N.: On propane (2031). doi:10.1234/x (read from lab/a.xml, lab/b.xml)"
    assert citations(sets) == {"measured:10.1234/x": text}


def test_a_pattern_without_files_is_one_sentence(tmp_path: Path) -> None:
    (tmp_path / "plan.toml").write_text(PLAN, encoding="utf-8")
    with pytest.raises(InputError, match=r"references.files: 'lab/\*.csv' names no file"):
        run(load_plan(tmp_path / "plan.toml"))

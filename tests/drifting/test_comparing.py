"""What changed, and why: each cause is made on purpose, and must be the one that is found."""

from __future__ import annotations

import json
from collections.abc import Callable
from itertools import permutations
from pathlib import Path
from typing import Any

import pytest

from eosmuster.api import sweep
from eosmuster.drifting.changes import APPEARED, FLIPPED, MOVED, UNCHANGED, VANISHED, Key
from eosmuster.drifting.comparing import Drift, drift
from eosmuster.errors import InputError
from eosmuster.plan.reading import load_plan

Folder = Callable[..., Path]
ROWS = 12  # two fluids, two models, three properties


def causes(found: Drift) -> set[str]:
    return set(found.causes)


def again(folder: Path, place: Path, points: bool = True) -> Path:
    """Sweep the plan of a folder again, as the code and the library are now."""
    return sweep(load_plan(folder.parent / "plan.toml")).save(place, points=points)


def remade(folder: Path, change: Callable[[dict[str, Any]], None]) -> None:
    path = folder / "manifest.json"
    content = json.loads(path.read_text(encoding="utf-8"))
    change(content)
    path.write_text(json.dumps(content), encoding="utf-8")


def test_two_runs_of_one_plan_are_byte_for_byte_the_same_but_for_what_is_volatile(
    swept_folder: Folder, base: Path
) -> None:
    other = swept_folder(again=1)
    manifests = [json.loads((folder / "manifest.json").read_text(encoding="utf-8")) for folder in (base, other)]
    for name in manifests[0]["outputs"]:
        assert (base / name).read_bytes() == (other / name).read_bytes(), name
    for content in manifests:
        assert content.pop("volatile")
    assert manifests[0] == manifests[1]
    found = drift(base, other)
    assert not found
    assert found.states[UNCHANGED] == ROWS
    assert found.changes == ()
    assert found.remarks == ()


@pytest.mark.parametrize("points", [True, False])
def test_noise_of_a_billionth_is_no_drift(
    base: Path, swept_folder: Folder, patched_predictions: Callable[[float], None], tmp_path: Path, points: bool
) -> None:
    old = swept_folder(points=points)
    patched_predictions(1e-9)
    new = again(base, tmp_path / "noisy", points)
    assert (old / "summary.csv").read_bytes() != (new / "summary.csv").read_bytes()
    assert not drift(old, new)
    assert drift(old, new, tolerance=1e-12).causes == {"prediction:code": ROWS}


@pytest.mark.parametrize("points", [True, False])
def test_predictions_that_move_alone_are_a_change_of_code(
    swept_folder: Folder, base: Path, patched_predictions: Callable[[float], None], tmp_path: Path, points: bool
) -> None:
    old = swept_folder(points=points)
    patched_predictions(1e-4)
    found = drift(old, again(base, tmp_path / "new", points))
    assert found.states[MOVED] + found.states[FLIPPED] == ROWS
    assert causes(found) == {"prediction:code"}
    assert all((row.worst is not None) == points for row in found.rows)


@pytest.mark.parametrize("points", [True, False])
def test_a_changed_acentric_factor_is_a_change_of_constants(
    own_plan: str, swept_folder: Folder, points: bool
) -> None:
    old = swept_folder(own_plan, points)
    new = swept_folder(own_plan.replace("acentric_factor = 0.35", "acentric_factor = 0.36"), points)
    found = drift(old, new)
    assert len(found.rows) == 2
    assert causes(found) == {"prediction:constants"}
    [change] = [c for c in found.changes if c.cause == "prediction:constants"]
    assert str(change) == "constants of plant cut 7, acentric_factor: 0.35 -> 0.36"
    assert all(str(change) in row.note for row in found.rows)
    # a larger acentric factor makes a steeper curve: everything below Tc falls
    if points:
        assert all(row.worst.predicted[1] < row.worst.predicted[0] for row in found.rows if row.worst)
        assert all(row.points_moved == 5 for row in found.rows)


@pytest.mark.parametrize("points", [True, False])
def test_a_changed_model_of_the_plan_s_own_moves_its_rows_alone(
    own_plan: str, swept_folder: Folder, points: bool
) -> None:
    found = drift(swept_folder(own_plan, points), swept_folder(own_plan.replace("1.54226", "1.55"), points))
    assert [row.key.candidate for row in found.rows] == ["my PR"]
    assert causes(found) == {"prediction:model"}
    assert "1.54226" in found.rows[0].note


@pytest.mark.parametrize("points", [True, False])
@pytest.mark.parametrize("version", ["8.0.0", "99.0"])
def test_other_values_of_the_library_are_reference_drift(
    swept_folder: Folder,
    base: Path,
    patched_library: Callable[[float], None],
    monkeypatch: pytest.MonkeyPatch,
    tmp_path: Path,
    points: bool,
    version: str,
) -> None:
    """The boiling temperature is predicted at the reference's pressure: it moves with that, no prediction did."""
    import CoolProp

    old = swept_folder(points=points)
    patched_library(1.0 + 1e-4)
    monkeypatch.setattr(CoolProp, "__version__", version)
    remade(copy := _copied(old, tmp_path / "old"), lambda m: m["volatile"]["versions"].update(CoolProp="8.0.0"))
    found = drift(copy, again(base, tmp_path / "new", points))
    assert {row.key.property for row in found.rows} == {"saturation_pressure", "boiling_temperature"}
    assert len(found.rows) == 8
    assert causes(found) == {"reference:unexplained" if version == "8.0.0" else "reference:library"}


def _copied(folder: Path, place: Path) -> Path:
    import shutil

    return Path(shutil.copytree(folder, place))


def test_another_version_of_the_library_without_effect_is_said_and_is_no_drift(
    base: Path, copy_of: Callable[[Path], Path]
) -> None:
    new = copy_of(base)
    remade(new, lambda manifest: manifest["volatile"]["versions"].update(CoolProp="99.0"))
    found = drift(base, new)
    assert not found
    assert [(c.cause, c.what, c.new) for c in found.changes] == [("reference:library", "CoolProp", "99.0")]
    assert "without effect on any row" in str(found)


@pytest.mark.parametrize("points", [True, False])
def test_a_boiling_temperature_alone_follows_its_reference_s_pressure(
    plan: str, swept_folder: Folder, patched_library: Callable[[float], None], tmp_path: Path, points: bool
) -> None:
    """No saturation pressure stands beside it: the pressure of the largest deviation tells."""
    old = swept_folder(plan.replace('"saturation_pressure", ', ""), points)
    patched_library(1.0 + 1e-4)
    found = drift(old, again(old, tmp_path / "new", points))
    assert {row.key.property for row in found.rows} == {"boiling_temperature"}
    assert causes(found) == {"reference:unexplained"}


@pytest.mark.parametrize("points", [True, False])
def test_states_given_by_pressure_lie_where_the_reference_boils(
    plan: str, swept_folder: Folder, monkeypatch: pytest.MonkeyPatch, tmp_path: Path, points: bool
) -> None:
    """Another boiling temperature of the reference moves the states, and the vapor pressures predicted there."""
    from dataclasses import replace

    from eosmuster.sources import library

    states = 'pressure = ["2 bar", "5 bar", "10 bar"]'
    old = swept_folder(plan.replace("reduced_temperature = [0.6, 0.7, 0.8, 0.9]", states), points)
    original = library.at_pressure

    def other(*arguments: Any, **named: Any) -> Any:
        found = original(*arguments, **named)
        return replace(found, values={name: value * (1.0 + 1e-5) for name, value in found.values.items()})

    monkeypatch.setattr(library, "at_pressure", other)
    found = drift(old, again(old, tmp_path / "new", points))
    assert len(found.rows) == ROWS
    assert causes(found) == {"reference:unexplained"}


def test_another_measured_file_is_reference_drift(own_plan: str, lab: str, swept_folder: Folder) -> None:
    found = drift(swept_folder(own_plan), swept_folder(own_plan, lab=lab.replace("186,1.2", "196,1.2")))
    assert causes(found) == {"reference:measured"}
    assert all(row.points_moved == 1 for row in found.rows)
    assert all(row.worst and row.worst.temperature == 400.0 for row in found.rows)
    assert {row.worst.reference for row in found.rows if row.worst} == {(186e3, 196e3)}


def test_another_descriptor_beside_a_measured_file_is_reference_drift(
    own_plan: str, lab: str, swept_folder: Folder, tmp_path: Path
) -> None:
    (tmp_path / "lab").mkdir()
    (tmp_path / "lab" / "psat.csv").write_text(lab, encoding="utf-8")
    described = {"fields": [{"name": "saturation pressure [kPa]", "unit": "bar"}]}
    (tmp_path / "lab" / "psat.json").write_text(json.dumps(described), encoding="utf-8")
    (tmp_path / "plan.toml").write_text(own_plan, encoding="utf-8")
    found = drift(swept_folder(own_plan), sweep(tmp_path / "plan.toml").save(tmp_path / "results"))
    assert causes(found) == {"reference:measured", "uncertainty"}  # that of a value 100 times as large is smaller
    assert [str(c) for c in found.changes if "lab/psat.json: SHA-256 " in str(c) and str(c).endswith(" is new")]


@pytest.mark.parametrize("points", [True, False])
def test_another_uncertainty_of_measured_points_is_an_uncertainty(
    own_plan: str, lab: str, swept_folder: Folder, points: bool
) -> None:
    found = drift(swept_folder(own_plan, points), swept_folder(own_plan, points, lab=lab.replace("186,1.2", "186,9")))
    assert "uncertainty" in causes(found)
    assert not causes(found) & {"reference:measured", "tolerance", "prediction:code"}


@pytest.mark.parametrize("points", [True, False])
def test_a_narrowed_tolerance_flips_verdicts_and_is_the_cause(plan: str, swept_folder: Folder, points: bool) -> None:
    wide = plan + "[tolerance]\nsaturation_pressure = '5 %'\n"
    found = drift(swept_folder(wide, points), swept_folder(wide.replace("5 %", "0.1 %"), points))
    assert {row.key.property for row in found.rows} == {"saturation_pressure"}
    assert causes(found) == {"tolerance"}
    assert found.states[FLIPPED] == len(found.flips) == 4
    assert {row.verdicts for row in found.flips} <= {("inside", "outside"), ("inside", "partly")}
    [change] = [c for c in found.changes if c.cause == "tolerance"]
    assert str(change) == "limit of saturation_pressure: 5 % -> 0.1 %"
    assert all(row.worsening > 0 for row in found.flips)
    assert "verdicts flipped" in str(found)


def test_the_way_back_is_a_verdict_that_got_better(plan: str, swept_folder: Folder) -> None:
    wide = plan + "[tolerance]\nsaturation_pressure = '5 %'\n"
    found = drift(swept_folder(wide.replace("5 %", "0.1 %")), swept_folder(wide))
    assert all(row.worsening < 0 for row in found.flips)


@pytest.mark.parametrize("points", [True, False])
def test_another_decision_rule_is_the_plan_s(plan: str, swept_folder: Folder, points: bool) -> None:
    """Under the guarded rule some of these points are undecided, under the simple rule none is."""
    text = plan + "[tolerance]\nsaturation_pressure = '1 %'\n[decision]\nrule = 'guarded'\n"
    found = drift(swept_folder(text, points), swept_folder(text.replace("guarded", "simple"), points))
    assert found
    assert causes(found) == {"plan"}
    assert any(c.what == "decision rule, rule" and (c.old, c.new) == ("guarded", "simple") for c in found.changes)
    said = {row.key: row.note for row in found.rows}
    assert all(said.values())  # what moved is said, also where no point did
    density = said["n-Propane", "SRK", "liquid_density", "coolprop"]  # outside by far more than U, by either rule
    assert density.startswith("limit at which it would pass ")
    assert "AAD" not in density


def test_another_threshold_of_contested_references_is_the_plan_s(plan: str, swept_folder: Folder) -> None:
    told = plan.replace('["coolprop"]', '["coolprop"]\ncontested_above = "5 %"')
    found = drift(swept_folder(plan), swept_folder(told))
    [change] = [c for c in found.changes if "contested" in c.what]
    assert (change.cause, change.what, change.old, change.new) == (
        "plan",
        "plan, references.contested_above",
        "",
        "5 %",
    )
    assert not found


def test_another_reference_that_agrees_moves_no_row(plan: str, swept_folder: Folder) -> None:
    more = plan.replace('["coolprop"]', '["coolprop", "handbook"]')
    there, back = (drift(*pair) for pair in permutations([swept_folder(plan), swept_folder(more)]))
    assert (there.states[UNCHANGED], there.states[APPEARED], there.states[MOVED]) == (ROWS, len(there.rows), 0)
    assert there.remarks == (
        f"{ROWS} rows are compared with another reference now, which agrees, and were not before",
    )
    assert (back.states[UNCHANGED], back.states[VANISHED]) == (ROWS, len(back.rows))
    said = " ".join(str(back).split())
    assert f"note: {ROWS} rows were compared with another reference before, which agreed, and are not now" in said


@pytest.mark.parametrize(("was", "now"), [("no", "yes"), ("yes", "no"), ("", "yes")])
def test_what_has_become_contested_is_told(
    base: Path, copy_of: Callable[..., Path], edit: Any, was: str, now: str
) -> None:
    old, new = copy_of(base), copy_of(base, "new")
    for folder, contested in ((old, was), (new, now)):
        edit(folder / "summary.csv", lambda row, contested=contested: row.update(contested=contested))
    found = drift(old, new)
    assert found.states[MOVED] == ROWS
    assert {row.note for row in found.rows} == {f"contested: {was or 'nothing'} -> {now}"}


@pytest.mark.parametrize("points", [True, False])
def test_another_coverage_factor_is_uncertainty_and_plan(plan: str, swept_folder: Folder, points: bool) -> None:
    text = plan + "[decision]\ncoverage_factor = 2\n"
    found = drift(swept_folder(text, points), swept_folder(text.replace("= 2\n", "= 3\n"), points))
    assert causes(found) == {"uncertainty", "plan"}


def test_a_removed_fluid_vanished_and_a_new_one_appeared(plan: str, swept_folder: Folder, base: Path) -> None:
    less = swept_folder(plan.replace('["propane", "ethane"]', '["propane"]'))
    gone, came = drift(base, less), drift(less, base)
    assert (gone.states[VANISHED], gone.states[UNCHANGED]) == (6, 6)
    assert (came.states[APPEARED], came.states[UNCHANGED]) == (6, 6)
    for found, which in ((gone, "new"), (came, "old")):
        assert causes(found) == {"plan"}
        assert {row.note for row in found.rows} == {f"Ethane is not in the {which} run"}
    assert "Ethane is not in the new run" in str(gone)


def test_a_removed_model_and_a_removed_property(plan: str, swept_folder: Folder, base: Path) -> None:
    less = swept_folder(plan.replace('"PR", "SRK"', '"PR"').replace('"boiling_temperature", ', ""))
    found = drift(base, less)
    assert found.states[VANISHED] == ROWS - 4
    assert causes(found) == {"plan"}
    assert {row.note for row in found.rows} == {
        "SRK is not in the new run",
        "boiling temperature is not in the new run",
    }


def test_a_candidate_that_became_unavailable(plan: str, swept_folder: Folder) -> None:
    own = """[[model]]
name = "mine"
form = "Peng-Robinson"
alpha = "Soave"
parameters = { m = { propane = 0.6, ethane = 0.5 } }
source = "invented for this test"
"""
    text = plan.replace('"SRK"]', '"SRK", "mine"]') + own
    old, new = swept_folder(text), swept_folder(text.replace(", ethane = 0.5", ""))
    gone, came = drift(old, new), drift(new, old)
    assert gone.states[VANISHED] == gone.states[APPEARED] == 3  # the row of the reference, and the one that says why
    assert causes(gone) == causes(came) == {"prediction:model", "coverage"}
    assert all(row.note.startswith("unavailable now: ") for row in gone.rows if row.state == VANISHED)
    assert all(row.note.startswith("unavailable before: ") for row in came.rows if row.state == APPEARED)


@pytest.mark.parametrize("points", [True, False])
def test_other_states_are_plan_and_coverage_and_shared_points_are_compared(
    plan: str, swept_folder: Folder, points: bool
) -> None:
    new = swept_folder(plan.replace("0.6, 0.7, 0.8, 0.9", "0.6, 0.7, 0.8, 0.85, 0.9"), points)
    found = drift(swept_folder(points=points), new)
    assert len(found.rows) == ROWS
    assert causes(found) == {"plan", "coverage"}
    for row in found.rows:
        if points:
            assert "states: 4 kept, 1 new, 0 gone" in row.note
            assert row.points_moved == 0
        else:
            assert "cannot be compared" in row.note


def test_verdicts_are_counted_and_sorted_worst_first(base: Path, copy_of: Callable[..., Path], edit: Any) -> None:
    new = copy_of(base)
    flips = {("n-Propane", "PR"): "outside", ("Ethane", "SRK"): "undecided"}
    old = {}

    def change(row: dict[str, str]) -> None:
        if row["property"] == "saturation_pressure":
            name = (row["component"], row["candidate"])
            old[name] = row["verdict"]
            row["verdict"] = flips.get(name, row["verdict"])

    edit(new / "summary.csv", lambda row: row.update(verdict="inside") if row["verdict"] == "partly" else None)
    remade(new, lambda manifest: None)
    start = copy_of(new, "start")
    edit(new / "summary.csv", change)
    found = drift(start, new)
    assert [row.key[:2] for row in found.rows] == list(flips)
    assert [row.verdicts for row in found.rows] == [("inside", "outside"), ("inside", "undecided")]
    assert causes(found) == {"code"}  # no point moved: judging did
    assert len(found.remarks) == 2
    assert all("summary.csv is not as its run wrote it" in remark for remark in found.remarks)


def test_a_window_alone_is_a_moved_row(base: Path, copy_of: Callable[..., Path], edit: Any) -> None:
    new = copy_of(base)
    first: list[Key] = []

    def change(row: dict[str, str], kelvin: float) -> None:
        if not first or first[0] == Key(*list(row.values())[:4]):
            first[:] = [Key(*list(row.values())[:4])]
            row["to_K"] = repr(float(row["to_K"]) - kelvin)

    edit(new / "windows.csv", lambda row: change(row, 5e-4))
    assert not drift(base, new)  # a thousand times the tolerance, in kelvin
    edit(new / "windows.csv", lambda row: change(row, 1e-3))
    [row] = drift(base, new).rows
    assert (row.key, row.state, row.causes) == (first[0], MOVED, ("code",))
    assert row.note.startswith("window 1: ")


def test_a_jumping_place_of_the_largest_deviation_is_no_drift(
    base: Path, copy_of: Callable[..., Path], edit: Any
) -> None:
    new = copy_of(base)
    edit(new / "summary.csv", lambda row: row.update(max_at_K="300.0"))
    assert not drift(base, new)


def test_a_statistic_near_zero_has_an_absolute_floor(base: Path, copy_of: Callable[..., Path], edit: Any) -> None:
    old, new = copy_of(base, "old"), copy_of(base, "new")
    edit(old / "summary.csv", lambda row: row.update(bias_pct="1e-9"))
    edit(new / "summary.csv", lambda row: row.update(bias_pct="-2e-7"))
    assert not drift(old, new)
    assert drift(old, new, tolerance=1e-7)


def test_without_points_the_means_tell_and_it_is_said(plan: str, swept_folder: Folder) -> None:
    wide = plan + "[tolerance]\nsaturation_pressure = '5 %'\n"
    found = drift(swept_folder(wide, False), swept_folder(wide.replace("5 %", "3 %"), True))
    assert any("no points.csv in" in remark for remark in found.remarks)
    assert all("mean limit 5 -> 3 %" in row.note for row in found.rows)


@pytest.mark.parametrize("value", [0.0, -1.0, float("nan"), 1.0, float("inf")])
def test_a_tolerance_that_is_none(base: Path, value: float) -> None:
    with pytest.raises(InputError, match=r"tolerance = .* is not valid"):
        drift(base, base, tolerance=value)

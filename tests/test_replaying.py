"""A folder is run again from its own manifest: what was touched is named, and what comes out is compared.

The plan cut and its laboratory data are invented.
"""

from __future__ import annotations

import argparse
import json
import shutil
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from eosmuster.api import sweep
from eosmuster.commands import replay as command
from eosmuster.errors import InputError
from eosmuster.plan.parts import plan_part
from eosmuster.plan.reading import load_plan, parse_plan
from eosmuster.plan.schema import Plan
from eosmuster.record import Record
from eosmuster.replaying import Replay, replay, replay_text
from eosmuster.report.folder import save
from eosmuster.report.text import cells_of
from eosmuster.sweeping.run import run

PLAN = """
components = ["propane", "plant cut 7"]
models = ["PR", "my PR"]
properties = ["saturation_pressure", "liquid_density"]
[states]
temperature = ["280 K", "320 K", "360 K"]
[references]
use = ["coolprop"]
files = ["lab/*.csv"]
"""
BUILT_IN = "ammonia-refrigeration"


@pytest.fixture(scope="module")
def original(tmp_path_factory: pytest.TempPathFactory, plant_cut: str, lab: str) -> Path:
    """A plan with measured files, and its results beside it."""
    place = tmp_path_factory.mktemp("original")
    (place / "lab").mkdir()
    (place / "lab" / "psat.csv").write_text(lab, encoding="utf-8")
    (place / "plan.toml").write_text(PLAN + plant_cut, encoding="utf-8")
    sweep(place / "plan.toml").save(place / "results")
    return place


@pytest.fixture
def place(original: Path, tmp_path: Path) -> Path:
    """A copy of both that may be changed."""
    return Path(shutil.copytree(original, tmp_path / "work"))


def content(folder: Path) -> dict[str, bytes]:
    return {p.relative_to(folder).as_posix(): p.read_bytes() for p in sorted(folder.rglob("*")) if p.is_file()}


def again(place: Path, **options: Any) -> Replay:
    """Replay, and see to it that nothing was written."""
    before = content(place)
    found = replay(place / "results", plan_folder=options.pop("plan_folder", place), **options)
    assert content(place) == before
    assert all(cells_of(line) <= 100 for line in replay_text(found).split("\n"))
    return found


def remade(place: Path, change: Callable[[dict[str, Any]], Any]) -> None:
    path = place / "results" / "manifest.json"
    manifest = json.loads(path.read_text(encoding="utf-8"))
    change(manifest)
    path.write_text(json.dumps(manifest, ensure_ascii=False), encoding="utf-8")


def test_the_same_comes_out_byte_for_byte(place: Path) -> None:
    found = again(place)
    assert found.same
    assert found.findings == found.different == ()
    assert set(found.identical) >= {"points.csv", "summary.csv", "windows.csv", "summary.md"}
    assert str(found).startswith("replay: the same; no drift: ")


def test_a_built_in_plan_needs_no_folder_and_no_points(tmp_path: Path) -> None:
    folder = sweep(BUILT_IN).save(tmp_path / "results", points=False)
    found = replay(folder)
    assert found.same
    assert "points.csv" not in found.identical


@pytest.mark.parametrize("name", ["summary.md", "points.csv", "windows.csv", "summary.csv"])
def test_an_output_that_was_tampered_with_is_named(place: Path, name: str) -> None:
    file = place / "results" / name
    text = file.read_text(encoding="utf-8")
    file.write_text(text.replace("0", "1"), encoding="utf-8")
    found = again(place)
    assert not found.same
    assert [sentence for sentence in found.findings if sentence.startswith(f"{name} is not as its run wrote it")]
    assert found.different == ()  # the run itself gives what the manifest says
    assert f"differs: {name} is not as its run wrote it" in str(found)


def test_a_verdict_that_was_made_better_is_named_with_its_row(place: Path) -> None:
    file = place / "results" / "summary.csv"
    lines = file.read_text(encoding="utf-8").splitlines(keepends=True)
    number = next(i for i, line in enumerate(lines) if i and ",outside," in line)
    lines[number] = lines[number].replace(",outside,", ",inside,")
    file.write_text("".join(lines), encoding="utf-8")
    found = again(place)
    assert found.drift is not None
    [row] = found.drift.rows
    assert row.verdicts == ("inside", "outside")
    assert lines[number].startswith(f"{row.key.component},{row.key.candidate},")


@pytest.mark.parametrize("name", ["summary.csv", "windows.csv", "points.csv", "summary.md"])
def test_an_output_that_was_cut_or_removed_is_named_and_the_plan_still_run(place: Path, name: str) -> None:
    file = place / "results" / name
    file.write_bytes(file.read_bytes()[:-50])
    cut = again(place)
    file.unlink()
    gone = again(place)
    assert not cut.same
    assert not gone.same
    assert f"{name} is missing" in gone.findings
    assert cut.findings[0].startswith(f"{name} is not as its run wrote it")


def test_a_measured_file_that_changed_is_named_and_moves_its_rows(place: Path, lab: str) -> None:
    file = place / "lab" / "psat.csv"
    file.write_text(lab.replace("62.2", "72.2"), encoding="utf-8")
    found = again(place)
    assert [s for s in found.findings if s.startswith("measured file lab/psat.csv has changed: SHA-256 ")]
    assert found.drift is not None
    assert set(found.drift.causes) == {"reference:measured"}
    assert {row.key.component for row in found.drift.rows} == {"plant cut 7"}


def test_a_measured_file_that_is_new_is_named(place: Path, lab: str) -> None:
    (place / "lab" / "more.csv").write_text(lab.replace("320,14.3", "330,20.5"), encoding="utf-8")
    found = again(place)
    assert any("measured file lab/more.csv" in sentence and "is new" in sentence for sentence in found.findings)


def test_a_descriptor_that_changed_came_or_went_is_named(place: Path) -> None:
    """It says how its file is read, so it is as much of the evidence as the file itself."""
    file = place / "lab" / "psat.json"
    file.write_text('{"fields": []}', encoding="utf-8")
    [new] = again(place).findings
    assert "measured file lab/psat.json: SHA-256 " in new
    assert new.endswith(" is new")
    sweep(place / "plan.toml").save(place / "results", overwrite=True)
    assert again(place).same
    file.write_text('{"fields": [], "method": "static"}', encoding="utf-8")
    [changed] = again(place).findings
    assert changed.startswith("measured file lab/psat.json has changed: SHA-256 ")
    file.unlink()
    assert again(place).findings == (f"measured file lab/psat.json is missing in {place}",)


def test_measured_files_that_are_not_there_cannot_be_replayed(place: Path) -> None:
    (place / "lab" / "psat.csv").unlink()
    with pytest.raises(InputError, match=r"'lab/\*.csv' names no file"):
        replay(place / "results", plan_folder=place)


def test_the_plan_s_folder_is_where_the_manifest_says(place: Path, tmp_path: Path) -> None:
    remade(place, lambda m: m["volatile"].update(plan_folder=str(place)))
    assert replay(place / "results").same
    remade(place, lambda m: m["volatile"].update(plan_folder=str(tmp_path / "gone")))
    with pytest.raises(InputError, match=r"is no folder; give --plan-folder DIR"):
        replay(place / "results")
    remade(place, lambda m: m["volatile"].pop("plan_folder"))
    with pytest.raises(InputError, match="its manifest does not say where from; give --plan-folder DIR"):
        replay(place / "results")
    with pytest.raises(InputError, match=r"--plan-folder .* is no folder"):
        replay(place / "results", plan_folder=tmp_path / "gone")


def test_a_reference_file_that_changed_is_named_with_what_it_can_move(
    place: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    from eosmuster.report import manifest

    original = manifest.reference_hashes()
    other = original | {"handbook/vapor_pressure.csv": "0" * 64, "README.md": "1" * 64, "new.csv": "2" * 64}
    other.pop("formulas.csv")
    for module in ("eosmuster.replaying", "eosmuster.report.manifest"):
        monkeypatch.setattr(f"{module}.reference_hashes", lambda: other)
    found = again(place)
    assert not found.same
    assert set(found.findings) == {
        "reference file handbook/vapor_pressure.csv has changed (a file of the reference data changed)",
        "reference file README.md has changed",
        "reference file formulas.csv is missing today",
    }
    assert "new since then: 1 reference file, e.g. new.csv" in found.remarks
    assert found.drift is not None
    assert not found.drift


def test_another_version_alone_is_a_remark(place: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    import CoolProp

    monkeypatch.setattr(CoolProp, "__version__", "99.0")
    found = again(place)
    assert found.same
    assert any(remark.endswith("-> 99.0") for remark in found.remarks)


def test_other_values_of_the_library_are_drift(place: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    import CoolProp

    from eosmuster.sources import library

    original = library.saturation

    def other(*arguments: Any, **named: Any) -> Any:
        found = original(*arguments, **named)
        return replace(found, values={name: v * 1.001 for name, v in found.values.items()})

    monkeypatch.setattr(library, "saturation", other)
    monkeypatch.setattr(CoolProp, "__version__", "99.0")
    found = again(place)
    assert not found.same
    assert found.drift is not None
    assert set(found.drift.causes) == {"reference:library"}
    assert set(found.different) >= {"points.csv", "summary.csv"}
    assert "not dossier.html, points.csv, summary.csv" in str(found)


def test_a_manifest_that_says_otherwise_than_its_plan(place: Path) -> None:
    remade(place, lambda m: m["constants"]["plant cut 7"]["acentric_factor"].update(value=0.36))
    found = again(place)
    assert not found.same
    assert found.findings == (
        "the manifest says otherwise than this run: constants, plant cut 7, acentric_factor, value: 0.36 -> 0.35",
    )


@pytest.mark.parametrize(
    ("plan", "words"),
    [
        ({"text": "components = [", "name": "x"}, "is not valid TOML"),
        ({"text": 7, "name": "x"}, "plan has no text and name"),
        ({}, "plan has no text and name"),
        ({"text": 'components = ["unobtainium"]', "name": "x"}, "unobtainium"),
    ],
)
def test_a_plan_that_cannot_be_run(place: Path, plan: dict[str, Any], words: str) -> None:
    remade(place, lambda m: m.update(plan=plan))
    with pytest.raises(InputError) as caught:
        replay(place / "results", plan_folder=place)
    assert words in str(caught.value)
    assert "manifest.json" in str(caught.value)


def test_a_part_of_a_plan_is_run_again_as_that_part(place: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def of_part(plan: Plan, *_: Any) -> Record:
        return replace(run(plan), part=plan.part)

    monkeypatch.setattr("eosmuster.replaying.run", of_part)
    shutil.rmtree(place / "results")
    part = plan_part(load_plan(place / "plan.toml"), 2, 2)
    save(of_part(part), place / "results", overwrite=False)
    assert again(place).same
    remade(place, lambda m: m.update(part={"number": 3, "of": 2}))
    with pytest.raises(InputError, match="'3/2' is no part"):
        replay(place / "results", plan_folder=place)


def test_a_part_without_a_component_is_the_same_again(tmp_path: Path) -> None:
    """It has no rows, which are none that cannot be read."""
    one = 'components = ["propane"]\nmodels = ["PR"]\nproperties = ["saturation_pressure"]\n'
    save(run(plan_part(parse_plan(one, "one", "one.toml"), 2, 2)), tmp_path / "results", overwrite=False)
    found = replay(tmp_path / "results")
    assert found.same
    assert found.findings == found.different == ()
    assert str(found).startswith("replay: the same; no drift: 0 rows unchanged")


TAMPERED: dict[str, tuple[Callable[[dict[str, Any]], Any], str]] = {
    "points": (lambda m: m["points"].update(rows=7), "points, rows: 7 -> "),
    "points written": (lambda m: m["points"].update(written=False), "points, written: false -> true"),
    "summary": (lambda m: m["summary"].pop("rows"), "summary, rows is new"),
    "windows": (lambda m: m.pop("windows"), "windows is new"),
    "a model": (lambda m: m["models"].pop("my PR"), "models, my PR is new"),
    "a component": (lambda m: m["constants"].pop("n-Propane"), "constants, n-Propane is new"),
    "a component too many": (lambda m: m["constants"].update(x={}), "constants, x has gone"),
    "a citation": (lambda m: m["citations"].pop("coolprop"), "citations, coolprop is new"),
    "a source": (
        lambda m: m["constants"]["plant cut 7"]["molar_mass"].update(source="page 7"),
        'constants, plant cut 7, molar_mass, source: "page 7" -> ',
    ),
    "a rationale": (lambda m: m["decision"]["tolerances"][0].update(rationale=""), "decision, tolerances, "),
    "what was left out": (lambda m: m["left_out"].append({"what": "x", "why": "y"}), "left_out, {"),
    "a title": (lambda m: m["plan"].update(title="approved"), 'plan, title: "approved" -> '),
    "something new": (lambda m: m.update(approved="yes"), "approved has gone"),
}


def test_whatever_a_manifest_was_tampered_with_is_named(place: Path) -> None:
    """Not a number of the run moves by it, and the outputs are as they were."""
    for change, _ in TAMPERED.values():
        remade(place, change)
    found = again(place)
    assert not found.same
    assert found.different == ()
    assert len(found.findings) == len(TAMPERED) + 1  # the rationale that was there is missing
    for _, words in TAMPERED.values():
        assert any(f"the manifest says otherwise than this run: {words}" in one for one in found.findings), words


@pytest.mark.parametrize("name", ["points", "a model"])
def test_one_thing_tampered_with_is_enough(place: Path, name: str) -> None:
    change, words = TAMPERED[name]
    remade(place, change)
    [finding] = again(place).findings
    assert words in finding


def test_a_manifest_of_an_earlier_version_may_be_worded_otherwise(place: Path) -> None:
    def earlier(content: dict[str, Any]) -> None:
        content["volatile"]["versions"]["eosmuster"] = "0.0.1"
        content["models"]["PR"].pop("alpha")

    remade(place, earlier)
    found = again(place)
    assert found.same
    assert "the manifest says otherwise than this run: models, PR, alpha is new" in found.remarks
    remade(place, lambda m: m["models"].pop("PR"))
    assert again(place).findings == ("the manifest says otherwise than this run: models, PR is new",)
    remade(place, lambda m: m["constants"]["plant cut 7"]["acentric_factor"].update(value=0.36))
    assert any("constants of plant cut 7, acentric_factor: 0.36 -> 0.35" in one for one in again(place).findings)


def test_no_results_folder(tmp_path: Path) -> None:
    with pytest.raises(InputError, match="is no results folder"):
        replay(tmp_path)


def test_a_damaged_folder_whose_manifest_agrees_with_it_cannot_be_replayed(place: Path) -> None:
    import hashlib

    file = place / "results" / "summary.csv"
    file.write_bytes(b"component\n")
    digest = hashlib.sha256(file.read_bytes()).hexdigest()
    remade(place, lambda m: m["outputs"].update({"summary.csv": digest}))
    with pytest.raises(InputError, match="has no column"):
        replay(place / "results", plan_folder=place)


def test_the_new_results_are_written_where_asked(place: Path, tmp_path: Path) -> None:
    found = replay(place / "results", plan_folder=place, out=tmp_path / "new")
    assert found.same
    for name in found.identical:
        assert (tmp_path / "new" / name).read_bytes() == (place / "results" / name).read_bytes()
    with pytest.raises(InputError, match="is the folder that is replayed"):
        replay(place / "results", plan_folder=place, out=place / "results")


@pytest.fixture
def replayed(capsys: pytest.CaptureFixture[str]) -> Callable[..., tuple[int, str]]:
    parser = argparse.ArgumentParser()
    command.add(parser)

    def done(*arguments: object) -> tuple[int, str]:
        return command.run(parser.parse_args([str(a) for a in arguments])), capsys.readouterr().out

    return done


def test_the_command_s_exit_status(place: Path, replayed: Callable[..., tuple[int, str]]) -> None:
    status, out = replayed(place / "results", "--plan-folder", place)
    assert status == 0
    assert out.startswith("replay: the same; ")
    (place / "results" / "summary.md").write_text("all is well\n", encoding="utf-8")
    status, out = replayed(place / "results", "--plan-folder", place)
    assert status == 1
    assert "summary.md is not as its run wrote it" in out
    remade(place, lambda m: m["volatile"].pop("plan_folder", None))
    with pytest.raises(InputError) as caught:
        replayed(place / "results")
    assert caught.value.exit_status == 2
    with pytest.raises(InputError, match="--tolerance"):
        replayed(place / "results", "--tolerance", "much")

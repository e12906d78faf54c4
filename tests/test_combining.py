"""Parts of a run put together give the very bytes of one run."""

from __future__ import annotations

import argparse
import json
import shutil
from collections.abc import Callable, Sequence
from dataclasses import replace
from pathlib import Path
from typing import Any

import pytest

from eosmuster import combining
from eosmuster.api import read_plan
from eosmuster.combining import combine
from eosmuster.commands import combine as command
from eosmuster.errors import InputError, NothingJudged
from eosmuster.plan.parts import plan_part
from eosmuster.plan.schema import Plan
from eosmuster.record import Record
from eosmuster.report.folder import save
from eosmuster.report.record_file import read_record
from eosmuster.sweeping.run import run

# invented: two fluids of the catalogue and one of the plan's own, their points in one file and in disorder, the
# pressures of propane in kPa under a title that says bar
LABORATORY = """component,temperature [K],saturation pressure [bar],liquid density [kg/m3]
plant cut 7,400,1.71,590
propane,250,218,560
n-butane,290,1.9,582
plant cut 7,420,2.75,571
propane,300,998,490
n-butane,310,3.5,560
nobody knows,300,1,500
n-butane,330,6.1,535
"""

MEASURED = """
title = "invented"
components = ["propane", "ammonia", "n-butane"]
models = ["PR", "PRSV", "PT", "SRK+Peneloux"]
properties = ["liquid_density", "saturation_pressure", "boiling_temperature"]
[states]
temperature = { from = "240 K", to = "440 K", points = 9 }
[constants]
source = "passut-danner-1973"
[references]
files = ["lab.csv"]
[[component]]
name = "plant cut 7"
critical_temperature = "540.2 K"
critical_pressure = "27.4 bar"
acentric_factor = 0.35
molar_mass = "100.2 g/mol"
source = "invented"
"""

SMALL = """
components = ["propane", "n-butane", "ethane"]
models = ["PR"]
properties = ["saturation_pressure"]
[states]
reduced_temperature = [0.6, 0.7, 0.8, 0.9]
[references]
use = ["coolprop"]
"""

PLANES = """
components = ["propane", "methane", "ethane"]
models = ["PT"]
properties = ["density", "liquid_density"]
[states]
temperature = [200.0, 250.0]
[states.single_phase]
temperature = ["20 degC", "60 degC"]
pressure = { from = "1 bar", to = "60 bar", points = 3 }
phase = "stable"
[tolerance]
density = "10 %"
[references]
use = ["coolprop"]
"""


ALONE = {"points": False, "dossier": False}
"""What a part may leave out: its record.npz has it all."""


def files(folder: Path) -> dict[str, bytes]:
    """Every file of a results folder, the manifest without what is volatile."""
    found = {entry.name: entry.read_bytes() for entry in folder.iterdir()}
    manifest = json.loads(found["manifest.json"])
    del manifest["volatile"]
    return found | {"manifest.json": json.dumps(manifest).encode()}


def run_parts(plan: Plan, of: int, place: Path) -> list[Path]:
    return [
        save(run(plan_part(plan, number, of)), place / f"part-{number}-of-{of}", overwrite=False, **ALONE)
        for number in range(1, of + 1)
    ]


def assert_equal(plan: Plan, numbers: Sequence[int], place: Path, *, dossier: bool = False) -> None:
    whole = files(save(run(plan), place / "whole", overwrite=False, dossier=dossier))
    for of in numbers:
        parts = run_parts(plan, of, place)
        found, record = combine(parts[::-1])
        assert (found.title, found.components) == (plan.title, plan.components)
        together = files(save(record, place / f"of-{of}", overwrite=False, dossier=dossier))
        assert set(together) == set(whole)
        assert [name for name in whole if whole[name] != together[name]] == []


@pytest.mark.parametrize(("name", "numbers"), [("ammonia-refrigeration", (1, 4)), ("lpg-storage", (3,))])
def test_parts_of_a_built_in_plan_give_the_bytes_of_one_run(
    name: str, numbers: tuple[int, ...], tmp_path: Path
) -> None:
    assert_equal(read_plan(name), numbers, tmp_path)


def test_measured_files_and_own_components_and_cited_constants(tmp_path: Path) -> None:
    (tmp_path / "plan.toml").write_text(MEASURED, encoding="utf-8")
    (tmp_path / "lab.csv").write_text(LABORATORY, encoding="utf-8")
    plan = read_plan(tmp_path / "plan.toml")
    record = run(plan)
    measured = {b.component for b in record.blocks if b.reference_source.startswith("measured:")}
    assert measured == {"n-Propane", "n-Butane", "plant cut 7"}
    assert [what for what, _ in record.left_out if what.startswith("lab.csv")]
    assert len({component for component, _, _ in record.conflicts}) > 1
    assert len({component for component, _, sentence in record.conflicts if sentence.startswith("lab.csv")}) == 1
    assert {row.component for row in record.summary if "with the library's constants" in row.note} == {
        "n-Propane",
        "n-Butane",
    }
    assert ("Ammonia", "no Tc and pc in passut-danner-1973") in record.left_out
    assert_equal(plan, (2, 3), tmp_path)


def test_single_phase_states_and_regions(tmp_path: Path) -> None:
    (tmp_path / "plan.toml").write_text(PLANES, encoding="utf-8")
    assert_equal(read_plan(tmp_path / "plan.toml"), (2,), tmp_path, dossier=True)
    found = {
        region.component
        for number in (1, 2)
        for region in read_record(tmp_path / f"part-{number}-of-2" / "record.npz").regions
    }
    assert found == {"n-Propane", "Methane", "Ethane"}


@pytest.fixture(scope="module")
def small(tmp_path_factory: pytest.TempPathFactory) -> Plan:
    place = tmp_path_factory.mktemp("plan")
    (place / "small.toml").write_text(SMALL, encoding="utf-8")
    return read_plan(place / "small.toml")


@pytest.fixture(scope="module")
def kept(small: Plan, tmp_path_factory: pytest.TempPathFactory) -> list[Path]:
    return run_parts(small, 4, tmp_path_factory.mktemp("parts"))


@pytest.fixture
def parts(kept: list[Path], tmp_path: Path) -> list[Path]:
    """The results folders of three parts and an empty one, to be spoiled."""
    return [Path(shutil.copytree(part, tmp_path / part.name)) for part in kept]


Change = Callable[[Path, Callable[[Record], Record]], Path]


@pytest.fixture
def changed() -> Change:
    """Save a part again with another record in it."""

    def change(folder: Path, how: Callable[[Record], Record]) -> Path:
        record = how(read_record(folder / "record.npz"))
        return save(record, folder, overwrite=True, **ALONE)

    return change


def refused(folders: Sequence[Path | str]) -> str:
    with pytest.raises(InputError) as caught:
        combine(folders)
    message = str(caught.value)
    assert "\n" not in message
    return message


class TestAPart:
    def test_says_that_it_is_one(self, kept: list[Path]) -> None:
        manifest = json.loads((kept[1] / "manifest.json").read_text(encoding="utf-8"))
        assert manifest["part"] == {"number": 2, "of": 4}
        assert manifest["plan"]["title"] == "small (part 2 of 4)"
        assert (kept[1] / "summary.md").read_text(encoding="utf-8").startswith("# small (part 2 of 4)\n")
        assert "record.npz" in manifest["outputs"]

    def test_without_components_is_a_results_folder_like_any_other(self, kept: list[Path]) -> None:
        record = read_record(kept[3] / "record.npz")
        assert (record.part, record.blocks, record.summary) == ((4, 4), (), ())
        assert sorted(record.constants) == ["Ethane", "n-Butane", "n-Propane"]
        assert (kept[3] / "summary.csv").read_text(encoding="utf-8").count("\n") == 1

    def test_the_whole_is_none(self, small: Plan, kept: list[Path], tmp_path: Path) -> None:
        _, record = combine(kept)
        whole = save(record, tmp_path / "whole", overwrite=False)
        assert not (whole / "record.npz").exists()
        assert "part" not in json.loads((whole / "manifest.json").read_text(encoding="utf-8"))


class TestRefused:
    def test_a_missing_part(self, parts: list[Path]) -> None:
        assert refused(parts[1:]).startswith("part 1 is missing of the 4")
        assert refused(parts[1:2]).startswith("parts 1, 3, 4 are missing of the 4")
        assert "no part to put together" in refused([])

    def test_a_part_twice(self, parts: list[Path], tmp_path: Path) -> None:
        again = shutil.copytree(parts[1], tmp_path / "again")
        message = refused([*parts, again])
        assert "both hold part 2 of 4" in message
        assert str(again) in message
        assert str(parts[1]) in message

    def test_parts_of_different_numbers(self, small: Plan, parts: list[Path], tmp_path: Path) -> None:
        other = save(run(plan_part(small, 1, 3)), tmp_path / "other", overwrite=False)
        assert "is one of 3 parts and" in refused([other, *parts[1:]])

    def test_what_is_no_part(self, small: Plan, parts: list[Path], tmp_path: Path, changed: Change) -> None:
        assert "is no folder" in refused([tmp_path / "missing", *parts])
        assert "is no folder" in refused([parts[0] / "record.npz"])
        assert "is no results folder" in refused([tmp_path, *parts])
        whole = save(run(small), tmp_path / "whole", overwrite=False)
        assert "holds no part of a run (no record.npz)" in refused([whole, *parts])
        for part in ((0, 4), (5, 4), (1, 10**9)):
            folder = shutil.copytree(parts[0], tmp_path / f"{part[0]}-{part[1]}")
            spoiled = changed(folder, lambda record, part=part: replace(record, part=part))  # type: ignore[misc]
            assert "holds a whole run, not a part" in refused([spoiled, *parts[1:]])

    def test_a_file_that_was_changed(self, parts: list[Path]) -> None:
        data = (parts[2] / "record.npz").read_bytes()
        (parts[2] / "record.npz").write_bytes(data[:-1] + b"x")
        assert "is not as its run wrote it" in refused(parts)
        (parts[2] / "record.npz").unlink()
        assert "cannot be read" in refused(parts)

    def test_parts_of_different_plans(self, parts: list[Path], changed: Change) -> None:
        changed(parts[1], lambda record: replace(record, plan_text=record.plan_text + "# another\n"))
        message = refused(parts)
        assert f"{parts[1]} and {parts[0]} differ in the plan;" in message

    @pytest.mark.parametrize(
        ("name", "value", "said"),
        [
            ("plan_name", "another", "differ in the name of the plan"),
            ("files", (("lab.csv", "0" * 64),), "differ in the measured files"),
            ("decision", {"rule": "simple"}, "differ in the decision rule"),
            ("models", {}, "differ in models"),
            ("constants", {}, "differ in constants"),
            ("display", {}, "differ in display"),
            ("left_out", (("lab.csv", "unreadable"),), "differ in left_out"),
            ("conflicts", (("", "", "exchanged"),), "differ in conflicts"),
        ],
    )
    def test_parts_of_different_runs(
        self, parts: list[Path], changed: Change, name: str, value: Any, said: str
    ) -> None:
        changed(parts[1], lambda record: replace(record, **{name: value}))
        assert said in refused(parts)

    def test_a_component_of_another_part(self, parts: list[Path], changed: Change) -> None:
        stray = read_record(parts[1] / "record.npz").summary
        changed(parts[0], lambda record: replace(record, summary=(*record.summary, *stray)))
        assert f"{parts[0]} holds results of 'n-Butane', which is not in part 1 of 4" in refused(parts)

    @pytest.mark.parametrize(
        ("where", "name", "value", "said"),
        [
            (("volatile", "versions"), "eosmuster", "0.0.0", "eosmuster was '0.0.0' when it was run"),
            (("volatile", "versions"), "CoolProp", "1.2.3", "CoolProp was '1.2.3' when it was run"),
            (("references",), "handbook/points.csv", "0" * 64, "points.csv' was SHA-256 000000000000"),
            (("references",), "another.csv", "1" * 64, "and not there here"),
            (("volatile",), "versions", None, "eosmuster was None"),
            ((), "references", [], "was not there when it was run"),
        ],
    )
    def test_another_installation(
        self, parts: list[Path], where: tuple[str, ...], name: str, value: Any, said: str
    ) -> None:
        path = parts[2] / "manifest.json"
        content = json.loads(path.read_text(encoding="utf-8"))
        inner = content
        for key in where:
            inner = inner[key]
        inner[name] = value
        path.write_text(json.dumps(content), encoding="utf-8")
        message = refused(parts)
        assert message.startswith(f"{parts[2]}: ")
        assert said in message
        assert message.endswith("here; use the same")

    def test_a_plan_that_is_none(self, parts: list[Path], changed: Change) -> None:
        for part in parts:
            changed(part, lambda record: replace(record, plan_text="components = 3"))
        assert "manifest.json, plan" in refused(parts)

    def test_a_run_that_judges_nothing(self, tmp_path: Path) -> None:
        (tmp_path / "empty.toml").write_text(
            SMALL.replace('["coolprop"]', '["handbook"]').replace("0.6, 0.7, 0.8, 0.9", "0.01"), encoding="utf-8"
        )
        plan = read_plan(tmp_path / "empty.toml")
        with pytest.raises(NothingJudged) as one_run:
            run(plan)
        with pytest.raises(NothingJudged) as together:
            combine(run_parts(plan, 2, tmp_path))
        assert str(together.value) == str(one_run.value)


class TestCommand:
    def call(self, *arguments: Path | str) -> int:
        parser = argparse.ArgumentParser()
        command.add(parser)
        return command.run(parser.parse_args([str(a) for a in arguments]))

    def test_writes_the_whole_and_shows_it(
        self, small: Plan, parts: list[Path], tmp_path: Path, capsys: pytest.CaptureFixture[str]
    ) -> None:
        assert self.call(*parts, "--out", tmp_path / "whole") == 0
        assert capsys.readouterr().out.startswith("small\n3 fluids, 1 candidate, ")
        assert files(tmp_path / "whole") == files(save(run(small), tmp_path / "one run", overwrite=False))

    def test_has_a_usual_place_and_can_leave_the_points_out(
        self, parts: list[Path], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
    ) -> None:
        monkeypatch.chdir(tmp_path)
        assert self.call(*(part.name for part in parts), "--points", "none") == 0
        assert not (tmp_path / "eosmuster-results" / "small" / "points.csv").exists()
        assert (tmp_path / "eosmuster-results" / "small" / "summary.csv").exists()

    def test_asks_the_gate_of_the_whole(
        self, parts: list[Path], tmp_path: Path, capsys: pytest.CaptureFixture[str]
    ) -> None:
        status = self.call(*parts, "--out", tmp_path / "whole", "--gate")
        assert (status, "the gate is not met" in capsys.readouterr().err) in ((1, True), (0, False))
        assert status == int(any(row.outside or row.unsolved for row in combine(parts)[1].summary))

    def test_does_not_write_over_a_part(self, parts: list[Path]) -> None:
        before = files(parts[0])
        with pytest.raises(InputError, match="is one of the parts, which stay as they are"):
            self.call(*parts, "--out", parts[0])
        assert files(parts[0]) == before

    def test_refuses_a_bad_place_before_the_work(
        self, parts: list[Path], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
    ) -> None:
        monkeypatch.setattr(combining, "combine", lambda folders: pytest.fail("it began"))
        (tmp_path / "file").write_text("mine")
        with pytest.raises(InputError, match="is a file"):
            self.call(*parts, "--out", tmp_path / "file")

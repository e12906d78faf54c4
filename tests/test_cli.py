"""The command line: every exit status, bad input in one sentence, and nothing lost by an interruption."""

from __future__ import annotations

import csv
import io
import json
import os
import re
import subprocess
import sys
import time
from collections.abc import Callable, Iterator, Mapping
from pathlib import Path
from typing import NamedTuple

import pytest

from eosmuster import cli
from eosmuster.report import folder as results_folder
from eosmuster.report.text import cells_of

WIDTH = 100
CONTRACT_FILES = {"points.csv", "summary.csv", "windows.csv", "summary.md", "dossier.html", "manifest.json"}

NO_STATES = "[references]\nuse = ['coolprop']\n"
ALL_ABOVE = '[states]\ntemperature = ["400 K", "500 K"]\n'
HUGE_LIMIT = "[tolerance]\nsaturation_pressure = '90 %'\n[references]\nuse = ['coolprop']\n"
OWN_COMPONENT = """
[[component]]
name = "plant cut 7"
critical_temperature = "540.2 K"
critical_pressure = "27.4 bar"
acentric_factor = 0.35
molar_mass = "100.2 g/mol"
source = "crude assay 2031-04, table 3"
"""


class Done(NamedTuple):
    status: int
    out: str
    err: str


Command = Callable[..., Done]
PlanFile = Callable[..., Path]


@pytest.fixture
def command(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> Command:
    """Run one command in an empty folder, in this process."""
    here = tmp_path / "here"
    here.mkdir()
    monkeypatch.chdir(here)

    def run(*arguments: object) -> Done:
        status = cli.main([str(a) for a in arguments])
        captured = capsys.readouterr()
        return Done(status, captured.out, captured.err)

    return run


def sentence(done: Done, status: int, *fragments: str) -> str:
    """Check that a command failed with one sentence, and nothing on stdout."""
    assert done.status == status, done
    assert done.err.startswith("eosmuster: ")
    assert done.err.endswith("\n")
    assert done.err.count("\n") == 1
    assert "Traceback" not in done.err
    for fragment in fragments:
        assert fragment in done.err
    return done.err


def content(folder: Path) -> dict[str, bytes]:
    """Every file below a folder, hidden ones too."""
    return {path.relative_to(folder).as_posix(): path.read_bytes() for path in folder.rglob("*") if path.is_file()}


# ---------------------------------------------------------------- what goes well


def test_sweep_writes_the_files_of_the_contract_in_the_default_place(command: Command, plan_file: PlanFile) -> None:
    done = command("sweep", plan_file("my-plan"))
    assert (done.status, done.err) == (0, "")
    folder = Path("eosmuster-results/my-plan")
    assert {path.name for path in folder.iterdir()} == CONTRACT_FILES
    assert done.out.rstrip().endswith(f"results: {folder}")
    assert sorted(path.name for path in folder.parent.iterdir()) == ["my-plan"]


def test_the_broad_plan_is_the_default(command: Command, monkeypatch: pytest.MonkeyPatch) -> None:
    seen = []

    def refuse(plan: object, _progress: object) -> None:
        seen.append(plan)
        raise KeyboardInterrupt

    monkeypatch.setattr("eosmuster.sweeping.run.run", refuse)
    command("sweep")
    assert [plan.name for plan in seen] == ["broad"]


def test_out_names_the_folder_and_makes_its_parents(command: Command, plan_file: PlanFile) -> None:
    assert command("sweep", plan_file(), "--out", "deep/er/results").status == 0
    assert {path.name for path in Path("deep/er/results").iterdir()} == CONTRACT_FILES


def test_points_can_be_left_out(command: Command, plan_file: PlanFile) -> None:
    assert command("sweep", plan_file(), "--points", "none").status == 0
    folder = Path("eosmuster-results/small")
    assert {path.name for path in folder.iterdir()} == CONTRACT_FILES - {"points.csv"}
    assert json.loads((folder / "manifest.json").read_text())["points"] == {"rows": 4, "written": False}


PUMP = """
components = ["propane", "ammonia"]
models = ["PR", "SRK"]
properties = ["density"]
[states.single_phase]
temperature = ["-20 degC", "0 degC", "20 degC"]
pressure = ["15 bar", "25 bar", "40 bar"]
phase = "liquid"
[tolerance]
density = "15 %"
"""


def test_regions_can_be_left_out(command: Command, tmp_path: Path) -> None:
    plan = tmp_path / "pump.toml"
    plan.write_text(PUMP)
    assert command("sweep", plan, "--out", "with").status == 0
    assert command("sweep", plan, "--out", "without", "--regions", "no").status == 0
    plan.write_text(PUMP.replace("[tolerance]", 'regions = "no"\n[tolerance]'))
    assert command("sweep", plan, "--out", "again", "--regions", "yes").status == 0
    has = {"regions.csv", "regions.json"}
    names = {place: {path.name for path in Path(place).iterdir()} for place in ("with", "without", "again")}
    assert names == {"with": CONTRACT_FILES | has, "without": CONTRACT_FILES, "again": CONTRACT_FILES | has}
    asked = {place: json.loads(Path(place, "manifest.json").read_text())["regions"] for place in names}
    assert asked == {"with": {"rows": 3}, "without": {"rows": 0, "asked": False}, "again": {"rows": 3}}
    for name in ("summary.md", "dossier.html"):
        said = [place for place in names if "not asked for" in Path(place, name).read_text()]
        assert said == ["without"], name
    assert Path("with/points.csv").read_bytes() == Path("without/points.csv").read_bytes()
    assert command("replay", "without").status == 0


def test_a_second_run_replaces_the_first_and_nothing_else(command: Command, plan_file: PlanFile) -> None:
    command("sweep", plan_file("a"))
    command("sweep", plan_file("b"))
    neighbour = content(Path("eosmuster-results/b"))
    Path("eosmuster-results/notes.txt").write_text("mine")
    assert command("sweep", plan_file("a", models='["SRK"]'), "--points", "none").status == 0
    assert {path.name for path in Path("eosmuster-results/a").iterdir()} == CONTRACT_FILES - {"points.csv"}
    with Path("eosmuster-results/a/summary.csv").open(newline="") as file:
        assert {row["candidate"] for row in csv.DictReader(file)} == {"SRK"}
    assert content(Path("eosmuster-results/b")) == neighbour
    assert sorted(path.name for path in Path("eosmuster-results").iterdir()) == ["a", "b", "notes.txt"]


def test_two_runs_write_the_same_bytes(command: Command, plan_file: PlanFile) -> None:
    plan = plan_file(models='"all"', properties='"all"')
    first, second = Path("first"), Path("second")
    for folder in (first, second):
        assert command("sweep", plan, "--out", folder).status == 0
    one, other = content(first), content(second)
    manifests = [json.loads(files.pop("manifest.json")) for files in (one, other)]
    assert one == other
    for manifest in manifests:
        manifest.pop("volatile")
    assert manifests[0] == manifests[1]


@pytest.mark.parametrize("plan", ["lpg-storage", "ammonia-refrigeration"])
def test_service_plans_run_and_fit_the_terminal(command: Command, plan: str) -> None:
    done = command("sweep", plan, "--points", "none")
    assert done.status == 0
    assert max(map(cells_of, done.out.splitlines())) <= WIDTH
    assert f"results: eosmuster-results/{plan}" in done.out


@pytest.mark.parametrize(
    "arguments",
    [
        ("saturate", "propane", "-T", "25 degC"),
        ("saturate", "7732-18-5", "-p", "1 atm"),
        ("saturate", "propylene glycol", "--temperature", "400"),
        ("saturate", "helium", "-T", "4.2 K"),
        ("saturate", "methyl palmitate", "-T", "300 degC"),
        ("list", "models"),
        ("list", "components"),
        ("list", "references"),
        ("list", "properties"),
        ("list", "plans"),
    ],
    ids=" ".join,
)
def test_tables_fit_a_terminal_of_100_columns(command: Command, arguments: tuple[str, ...]) -> None:
    done = command(*arguments)
    assert (done.status, done.err) == (0, "")
    assert max(map(cells_of, done.out.splitlines())) <= WIDTH


def test_saturate_answers_by_model_library_and_handbook(command: Command) -> None:
    done = command("saturate", "propane", "-T", "300 K", "-m", "pr", "--model", "SRK")
    assert done.status == 0
    sources = [line.split()[0] for line in done.out.splitlines()[5:] if line]
    assert sources[:3] == ["PR", "SRK", "coolprop"]
    assert {"wagner-mcgarry-1983", "antoine-poling-2001"} < set(sources)
    assert re.search(r"^PR +9\.97430? ", done.out, re.MULTILINE)  # bar; 997430 Pa by the doctest of `saturate`
    assert "extrapolation refused: valid from 168.90 to 247.76 K" in done.out  # the Antoine correlation's range


@pytest.mark.parametrize("text", ["-40degC", "-40 degC", "233.15", "-40.0degF"])
def test_temperatures_below_zero_need_no_trick(command: Command, text: str) -> None:
    done = command("saturate", "propane", "-T", text, "-m", "PR")
    assert done.status == 0
    assert "233.15 K (-40 degC)" in done.out


def test_help_and_version(capsys: pytest.CaptureFixture[str]) -> None:
    for argument in ("--help", "--version"):
        with pytest.raises(SystemExit) as stop:
            cli.main([argument])
        assert stop.value.code == 0
    assert "Exit status: 0 done; 1 gate not met, or drift; 2 bad plan" in " ".join(capsys.readouterr().out.split())


def test_the_help_of_list_says_what_each_topic_is(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit):
        cli.main(["list", "--help"])
    said = " ".join(capsys.readouterr().out.split())
    for topic in ("models", "components", "references", "properties", "plans"):
        assert f"{topic}: " in said


# ---------------------------------------------------------------- exit statuses 1, 3 and 4


def test_a_gate_that_is_not_met(command: Command, plan_file: PlanFile) -> None:
    plan = plan_file(models='["vdW"]')
    done = command("sweep", plan, "--gate")
    assert done.status == 1
    first, worst = done.err.splitlines()
    assert first == "eosmuster: the gate is not met: 4 outside"
    assert worst.startswith(
        "  n-Propane, vdW, saturation pressure against coolprop: 4 of 4 points outside, at worst +"
    )
    assert "results: eosmuster-results/small" in done.out  # a gate is about what was found: it is all written
    assert command("sweep", plan).status == 0


def test_a_gate_that_is_met(command: Command, plan_file: PlanFile) -> None:
    assert command("sweep", plan_file(tail=HUGE_LIMIT), "--gate").status == 0


def test_a_gate_that_nothing_was_judged_of_is_not_met(command: Command, plan_file: PlanFile) -> None:
    """No reference knows the plan's own component; the pytest plugin fails its item as well."""
    plan = plan_file(components='["propane"]', models='["PR"]', tail=f"{HUGE_LIMIT}\n{OWN_COMPONENT}")
    done = command("sweep", plan, "--gate")
    assert done.status == 1
    first, named = done.err.splitlines()
    assert first == "eosmuster: the gate is not met: 1 not judged at all"
    assert named.startswith("  nothing was judged of 1 that the gate asks: ")
    assert named.endswith(" | PR | saturation_pressure")
    assert command("sweep", plan).status == 0


def test_an_internal_failure(command: Command, plan_file: PlanFile, monkeypatch: pytest.MonkeyPatch) -> None:
    def fail(*_: object) -> None:
        raise IndexError("a slip\nof ours")

    monkeypatch.setattr("eosmuster.sweeping.run.run", fail)
    done = command("sweep", plan_file())
    sentence(done, 3, "internal failure: IndexError: a slip of ours", "--debug")
    debugged = command("sweep", plan_file(), "--debug")
    assert debugged.status == 3
    assert debugged.err.startswith("Traceback (most recent call last):")
    assert debugged.err.splitlines()[-1] == done.err.rstrip("\n")


@pytest.mark.parametrize("tail", [ALL_ABOVE, '[states]\npressure = ["60 bar"]\n'], ids=["temperature", "pressure"])
@pytest.mark.parametrize("properties", ['["saturation_pressure"]', '"all"'])
def test_states_above_the_critical_point_cannot_be_judged(
    command: Command, plan_file: PlanFile, tail: str, properties: str
) -> None:
    done = command("sweep", plan_file(tail=tail, properties=properties), "--gate")
    assert done.status == 4
    assert done.err.startswith("eosmuster: nothing could be judged: no ")
    assert done.err.count("\n") == 1
    # what has a record is written, and what has none says so
    written = Path("eosmuster-results/small/manifest.json").exists()
    assert done.err.endswith("; no results folder is written\n") != written


def test_own_components_alone_cannot_be_judged(command: Command, plan_file: PlanFile) -> None:
    done = command("sweep", plan_file(components="", tail=OWN_COMPONENT))
    sentence(done, 4, "nothing could be judged", "no reference has a value", "; no results folder is written")
    assert not Path("eosmuster-results").exists()


def test_a_model_without_parameters_cannot_be_judged(command: Command, plan_file: PlanFile) -> None:
    done = command("sweep", plan_file(components='["helium"]', models='["PR-Twu91"]'))
    assert done.status == 4
    assert "no parameters" in done.out
    with Path("eosmuster-results/small/summary.csv").open(newline="") as file:
        assert [row["verdict"] for row in csv.DictReader(file)] == ["unavailable"]


@pytest.mark.parametrize("given", [("-T", "400 K"), ("-p", "60 bar")])
def test_saturate_above_the_critical_point_prints_rows_with_their_status(
    command: Command, given: tuple[str, str]
) -> None:
    done = command("saturate", "propane", *given)
    assert done.status == 4
    assert done.err == "eosmuster: no model has a saturated state there\n"
    assert re.search(r"^PR +- +- +- +- +- +\[1\]$", done.out, re.MULTILINE)
    assert "[1] above the model's own critical point (Tc 369.89 K, pc 42.51 bar)" in done.out
    assert "at or above the critical point" in done.out  # the reference library
    assert "extrapolation refused" in done.out  # the correlations


# ---------------------------------------------------------------- bad usage, names and quantities


@pytest.mark.parametrize(
    ("arguments", "fragments"),
    [
        ((), ("required: COMMAND",)),
        (("swep",), ("'swep'", "choose from", "sweep", "saturate")),
        (("list", "model"), ("'model'", "choose from", "models", "components")),
        (("list",), ("required: topic",)),
        (("sweep", "--ouput", "x"), ("--ouput",)),
        (("sweep", "--points", "some"), ("'some'", "choose from", "all", "none")),
        (("sweep", "one", "two"), ("two",)),
        (("saturate",), ("required: substance",)),
        (("saturate", "propane"), ("exactly one of --temperature and --pressure", "phase rule")),
        (("saturate", "propane", "-T", "300", "-p", "1e5"), ("exactly one", "phase rule", "one degree of freedom")),
        (
            ("saturate", "propan", "-T", "300"),
            ("'propan' is unknown", "nearest: propan", "eosmuster list components"),
        ),
        (("saturate", "74-98-7", "-T", "300"), ("'74-98-7' is unknown", "a name, an alias or a CAS number")),
        (("saturate", "R410A", "-T", "300"), ("'R410A' is left out", "a blend")),
        (("saturate", "", "-T", "300"), ("component '' is unknown",)),
        (("saturate", "propane", "-T", "300", "-m", "PR87"), ("'PR87'", "nearest: PR78, PR", "valid: vdW, RK")),
        (("saturate", "propane", "-T", "25 degX"), ("--temperature", "'degX'", "nearest: degR", "valid: K, degC")),
        (("saturate", "propane", "-p", "25 baar"), ("--pressure", "'baar'", "nearest: bar")),
        (("saturate", "propane", "-p", "3 barg"), ("gauge pressure", "never guessed")),
        (("saturate", "propane", "-T", "-5"), ("'-5' is not above absolute zero",)),
        (("saturate", "propane", "-T", "-300degC"), ("'-300degC' is not above absolute zero",)),
        (("saturate", "propane", "-T", "0"), ("'0' is not above absolute zero",)),
        (("saturate", "propane", "-p", "-1bar"), ("'-1bar' is not above",)),
        (("saturate", "propane", "-T", "nan"), ("'nan' is not a temperature",)),
        (("saturate", "propane", "-T", "inf"), ("'inf' is not a temperature",)),
        (("saturate", "propane", "-T", "1e999"), ("not a finite number",)),
        (("saturate", "propane", "-T", "25,5 degC"), ("comma", "decimal point")),
        (("saturate", "propane", "-T", "hot"), ("'hot' is not a temperature",)),
        (("saturate", "propane", "-T", "bar"), ("'bar' is not a temperature",)),
    ],
    ids=lambda value: " ".join(value) if isinstance(value, tuple) else None,
)
def test_bad_usage(command: Command, arguments: tuple[str, ...], fragments: tuple[str, ...]) -> None:
    done = command(*arguments)
    assert sentence(done, 2, *fragments)
    assert done.out == ""


def test_debug_shows_where_an_input_was_refused(command: Command) -> None:
    plain = command("saturate", "propane", "-T", "hot")
    debugged = command("--debug", "saturate", "propane", "-T", "hot")
    assert debugged.status == 2
    assert "Traceback (most recent call last):" in debugged.err
    assert debugged.err.endswith(plain.err)


# ---------------------------------------------------------------- bad plans


@pytest.mark.parametrize(
    ("replaced", "fragments"),
    [
        ({"components": '["propan"]'}, ("components", "'propan' is unknown", "nearest: propan")),
        ({"components": '["R410A"]'}, ("left out", "a blend")),
        ({"models": '["PR", "SRKK"]'}, ("models", "'SRKK'", "nearest: SRK", "valid: vdW")),
        ({"properties": '["saturation_presure"]'}, ("'saturation_presure'", "nearest: saturation_pressure")),
        ({"compnents": '["propane"]'}, ("unknown key 'compnents'", "nearest: component")),
        ({"tail": "[states]\ntemprature = [300]\n"}, ("states", "unknown key 'temprature'", "nearest: temperature")),
        ({"tail": "[states]\ntemperature = ['20 degX']\n"}, ("states.temperature", "'degX'", "nearest: degR")),
        ({"tail": "[states]\ntemperature = [300]\npressure = [1e5]\n"}, ("both given", "phase rule")),
        ({"tail": "[states]\ntemperature = [-5]\n"}, ("-5 is not above absolute zero",)),
        ({"tail": "[states]\ntemperature = [0.0]\n"}, ("0.0 is not above absolute zero",)),
        ({"tail": "[states]\ntemperature = [nan]\n"}, ("nan", "not a finite number")),
        ({"tail": "[states]\npressure = ['-1 bar']\n"}, ("'-1 bar' is not above 0 Pa",)),
        ({"tail": "[states]\nreduced_temperature = [1.2]\n"}, ("1.2", "between 0 and 1")),
        ({"tail": "[states]\ntemperature = []\n"}, ("0 states",)),
        ({"tail": "[tolerance]\nsaturation_pressure = 2\n"}, ("tolerance.saturation_pressure", "no unit", '"2 %"')),
        ({"tail": "[tolerance]\nsaturation_pressure = '0 %'\n"}, ("'0 %' is not above 0",)),
        ({"tail": "[tolerance]\nsaturation_pressure = '-1 %'\n"}, ("'-1 %' is not above 0",)),
        ({"tail": "[tolerance]\nsaturation_pressure = '2 K'\n"}, ("unknown unit 'K'", "valid: %, Pa")),
        ({"tail": "[decision]\nrule = 'strict'\n"}, ("decision.rule", "'strict'", "guarded, simple")),
        ({"tail": "[references]\nuse = ['nist']\n"}, ("references.use", "'nist'", "coolprop, handbook")),
        ({"components": "[]"}, ("components", "empty sweep")),
        ({"models": "[]"}, ("models", "empty sweep")),
        ({"properties": "[]"}, ("properties", "empty sweep")),
        ({"title": '"a'}, ("not valid TOML", "line 4")),
    ],
    ids=lambda value: str(value)[:60] if isinstance(value, dict) else None,
)
def test_bad_plans(
    command: Command, plan_file: PlanFile, replaced: dict[str, str], fragments: tuple[str, ...]
) -> None:
    done = command("sweep", plan_file(**replaced))
    assert sentence(done, 2, "small.toml", *fragments)
    assert content(Path.cwd()) == {}


def _empty(path: Path) -> None:
    path.touch()


def _binary(path: Path) -> None:
    path.write_bytes(b"\x7fELF\x02\x01\x01\x00" * 100)


def _huge(path: Path) -> None:
    with path.open("wb") as file:
        file.truncate(50_000_000)  # sparse: takes no room


@pytest.mark.parametrize(
    ("make", "fragment"),
    [
        (Path.mkdir, "is a folder"),
        (_binary, "is a binary file"),
        (_empty, "is empty"),
        (_huge, "larger than 5 MB"),
        (lambda _: None, "no such file"),
    ],
    ids=["a folder", "binary", "empty", "50 MB", "missing"],
)
def test_what_is_no_plan(command: Command, tmp_path: Path, make: Callable[[Path], None], fragment: str) -> None:
    make(tmp_path / "plan.toml")
    started = time.monotonic()
    sentence(command("sweep", tmp_path / "plan.toml"), 2, "plan.toml", fragment)
    assert time.monotonic() - started < 5.0


def test_a_misspelt_built_in_plan(command: Command) -> None:
    sentence(command("sweep", "lpg-store"), 2, "'lpg-store'", "nearest: lpg-storage", "valid: broad")


# ---------------------------------------------------------------- bad places for results


def test_a_file_in_the_way(command: Command, plan_file: PlanFile) -> None:
    Path("taken").write_text("mine")
    sentence(command("sweep", plan_file(), "--out", "taken"), 2, "taken is a file", "--out")
    sentence(command("sweep", plan_file(), "--out", "taken/below"), 2, "taken/below", "not a directory")
    assert content(Path.cwd()) == {"taken": b"mine"}


@pytest.mark.skipif(not Path("/proc/self").exists(), reason="no file system here that refuses even root")
def test_an_unwritable_place(command: Command, plan_file: PlanFile) -> None:
    sentence(
        command("sweep", plan_file(), "--out", "/proc/eosmuster/results"), 2, "/proc/eosmuster/results", "cannot"
    )


@pytest.mark.skipif(not hasattr(os, "geteuid") or os.geteuid() == 0, reason="root may write anywhere")
def test_a_folder_without_permission(command: Command, plan_file: PlanFile) -> None:
    Path("locked").mkdir(mode=0o500)
    sentence(command("sweep", plan_file(), "--out", "locked/results"), 2, "locked/results", "Permission denied")


@pytest.mark.parametrize("inside", [{"thesis.tex": b"mine"}, {"manifest.json": b'{"format": "another"}'}])
def test_a_foreign_folder(command: Command, plan_file: PlanFile, inside: dict[str, bytes]) -> None:
    Path("foreign").mkdir()
    for name, data in inside.items():
        Path("foreign", name).write_bytes(data)
    sentence(command("sweep", plan_file(), "--out", "foreign"), 2, "foreign folder", "choose another --out")
    assert content(Path("foreign")) == inside


def test_our_own_folder_with_something_foreign_in_it(command: Command, plan_file: PlanFile) -> None:
    command("sweep", plan_file(), "--out", "results")
    Path("results/thesis.tex").write_text("mine")
    before = content(Path.cwd())
    sentence(command("sweep", plan_file(), "--out", "results"), 2, "'thesis.tex'", "stays")
    assert content(Path.cwd()) == before


@pytest.mark.parametrize("place", ["", ".", "..", "/", "a\0b"])
def test_places_that_are_never_results_folders(command: Command, plan_file: PlanFile, place: str) -> None:
    sentence(command("sweep", plan_file(), "--out", place), 2)
    assert content(Path.cwd()) == {}


# ---------------------------------------------------------------- interruptions


def interrupt(*_arguments: object, **_keywords: object) -> None:
    raise KeyboardInterrupt


@pytest.mark.parametrize(
    "stage",
    ["eosmuster.api.builtin.load", "eosmuster.sweeping.run.judge", "eosmuster.sweeping.run.windows", "written"],
)
@pytest.mark.parametrize("earlier", [True, False], ids=["over earlier results", "the first time"])
def test_interrupted_at_any_stage(
    command: Command, plan_file: PlanFile, monkeypatch: pytest.MonkeyPatch, stage: str, earlier: bool
) -> None:
    if earlier:
        command("sweep", plan_file(), "--out", "deep/results")
    before = content(Path.cwd())
    if stage == "written":  # points.csv and summary.csv are there already, beside
        monkeypatch.setitem(results_folder.VIEWS, "windows.csv", interrupt)
    else:
        monkeypatch.setattr(stage, interrupt)
    plan = "broad" if stage.endswith("load") else plan_file(models='["SRK"]')
    sentence(command("sweep", plan, "--out", "deep/results"), 130, "interrupted")
    assert content(Path.cwd()) == before
    assert Path("deep").exists() == earlier


def test_a_full_disk_loses_nothing(command: Command, plan_file: PlanFile, monkeypatch: pytest.MonkeyPatch) -> None:
    command("sweep", plan_file())
    before = content(Path.cwd())

    def full(*_: object) -> None:
        raise OSError(28, "No space left on device")

    monkeypatch.setitem(results_folder.VIEWS, "summary.csv", full)
    sentence(command("sweep", plan_file(models='["SRK"]')), 2, "No space left on device")
    assert content(Path.cwd()) == before


IMPATIENT = """
import sys
from eosmuster import progress
from eosmuster.cli import main
progress.PATIENCE = 0.0
sys.exit(main(sys.argv[1:]))
"""


@pytest.mark.skipif(os.name != "posix", reason="no pseudo-terminals here")
def test_control_c_in_the_middle_of_a_sweep_on_a_terminal(
    command: Command,
    plan_file: PlanFile,
    python: str,
    environment: Mapping[str, str],
) -> None:
    import pty
    import signal

    assert command("sweep", plan_file(), "--out", "results").status == 0
    before = content(Path.cwd())
    ours, theirs = pty.openpty()
    arguments = ["sweep", "broad", "--out", "results"]
    process = subprocess.Popen(
        [python, "-c", IMPATIENT, *arguments], stdout=subprocess.DEVNULL, stderr=theirs, env=dict(environment)
    )
    os.close(theirs)
    shown = b""
    try:
        while b"references" not in shown:  # the progress bar: the sweep is under way
            shown += os.read(ours, 4096)
        process.send_signal(signal.SIGINT)
        while chunk := _read(ours):
            shown += chunk
        assert process.wait(timeout=30) == 130
    finally:
        os.close(ours)
        if process.poll() is None:
            process.kill()
            process.wait()
    bar, wiped, said = shown.decode().replace("\r\n", "\n").rpartition("\r")
    assert re.search(r"references +\[[#.]{30}\] +\d+ s", bar)
    assert wiped
    assert said == "eosmuster: interrupted; a results folder is written whole or not at all\n"
    assert content(Path.cwd()) == before


def _read(descriptor: int) -> bytes:
    try:
        return os.read(descriptor, 4096)
    except OSError:  # Linux says so when the other end of a pseudo-terminal has gone
        return b""


# ---------------------------------------------------------------- where the output goes


@pytest.fixture
def nobody_reads(monkeypatch: pytest.MonkeyPatch) -> Iterator[None]:
    """Let stdout be a pipe whose reader has gone."""
    reading, writing = os.pipe()
    os.close(reading)
    with os.fdopen(writing, "w", encoding="utf-8") as stream:
        monkeypatch.setattr(sys, "stdout", stream)
        yield


@pytest.mark.usefixtures("nobody_reads")
@pytest.mark.parametrize(
    ("arguments", "status", "said"),
    [
        (("sweep", "vdw.toml", "--gate"), 1, "eosmuster: the gate is not met: 4 outside\n  n-Propane, vdW"),
        (("sweep", "vdw.toml"), 0, ""),
        (("saturate", "propane", "-T", "400 K", "-m", "PR"), 4, "eosmuster: no model has a saturated state there\n"),
        (("list", "plans"), 0, ""),
    ],
    ids=lambda value: " ".join(value) if isinstance(value, tuple) else None,
)
def test_a_reader_that_has_gone_does_not_change_the_status(
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    capsys: pytest.CaptureFixture[str],
    plan_file: PlanFile,
    arguments: tuple[str, ...],
    status: int,
    said: str,
) -> None:
    plan_file("vdw", models='["vdW"]')
    monkeypatch.chdir(tmp_path)
    assert cli.main(arguments) == status
    assert capsys.readouterr().err.startswith(said)
    assert ("sweep" in arguments) == Path("eosmuster-results/vdw/summary.csv").exists()


@pytest.mark.usefixtures("nobody_reads")
def test_files_are_written_though_nobody_reads_what_is_printed(plan_file: PlanFile, tmp_path: Path) -> None:
    place = str(tmp_path / "results")
    assert cli.main(["sweep", str(plan_file()), "--out", place, "--dossier", "no"]) == 0
    assert cli.main(["drift", place, place, "--csv", str(tmp_path / "rows.csv")]) == 0
    assert (tmp_path / "rows.csv").exists()


def test_complaints_need_no_reader_either(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    reading, writing = os.pipe()
    os.close(reading)
    with os.fdopen(writing, "w", encoding="utf-8") as stream:
        monkeypatch.setattr(sys, "stderr", stream)
        assert cli.main(["saturate", "propan", "-T", "300"]) == 2
        assert cli.main(["saturate", "propan", "-T", "300", "--debug"]) == 2


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="no device here that is always full")
def test_what_cannot_be_printed_is_said(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    with Path("/dev/full").open("w", encoding="utf-8") as full:
        monkeypatch.setattr(sys, "stdout", full)
        assert cli.main(["list", "plans"]) == 2
    said = "eosmuster: what is to be printed cannot be written: No space left on device\n"
    assert capsys.readouterr().err == said


def test_without_any_stdout_the_work_is_done(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "stdout", None)  # as Python has it where the process was started without one
    assert cli.main(["list", "plans"]) == 0


@pytest.mark.parametrize("name", ["\x1b[31mred", "\u202eturned"])
def test_names_do_not_steer_the_terminal(command: Command, name: str) -> None:
    for arguments in (
        ("sweep", f"{name}.toml"),
        ("combine", name),
        ("replay", name),
        ("sweep", "--out", name, "x.t"),
    ):
        done = command(*arguments)
        assert done.status == 2
        assert done.err.rstrip("\n").isprintable()


@pytest.mark.parametrize("arguments", [("list", "components"), ("--help",)], ids=" ".join)
def test_a_pipe_that_closes_early_is_no_error(
    python: str, environment: Mapping[str, str], arguments: tuple[str, ...]
) -> None:
    reading, writing = os.pipe()
    os.close(reading)
    try:
        done = subprocess.run(
            [python, "-m", "eosmuster", *arguments],
            stdout=writing,
            stderr=subprocess.PIPE,
            env=dict(environment),
            check=False,
        )
    finally:
        os.close(writing)
    assert (done.returncode, done.stderr) == (0, b"")


def test_a_terminal_that_knows_only_ascii(python: str, environment: Mapping[str, str]) -> None:
    settings = {**environment, "PYTHONIOENCODING": "ascii", "PYTHONUTF8": "0"}
    done = subprocess.run(
        [python, "-m", "eosmuster", "list", "models"], capture_output=True, env=settings, check=False
    )
    assert (done.returncode, done.stderr) == (0, b"")
    assert b"SRK-Twu95" in done.stdout
    assert max(map(len, done.stdout.decode("ascii").splitlines())) <= WIDTH


@pytest.mark.parametrize("encoding", ["ascii", "latin-1", "cp437", "utf-16"])
def test_a_sweep_prints_in_any_encoding(
    plan_file: PlanFile, tmp_path: Path, monkeypatch: pytest.MonkeyPatch, encoding: str
) -> None:
    path = plan_file(title='"水 and water"')
    stream = io.TextIOWrapper(io.BytesIO(), encoding=encoding)
    monkeypatch.setattr(sys, "stdout", stream)
    assert cli.main(["sweep", str(path), "--out", str(tmp_path / "results")]) == 0
    stream.flush()
    assert "and water" in stream.buffer.getvalue().decode(encoding)
    assert "水" in (tmp_path / "results" / "summary.md").read_text(encoding="utf-8")


def test_a_narrow_terminal_gets_narrow_tables(command: Command, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys.stdout, "isatty", lambda: True, raising=False)
    monkeypatch.setenv("COLUMNS", "72")
    done = command("list", "plans")
    assert 40 < max(map(cells_of, done.out.splitlines())) <= 72


def test_main_reads_the_arguments_of_the_process(
    monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    monkeypatch.setattr(sys, "argv", ["eosmuster", "list", "properties"])
    assert cli.main() == 0
    assert "saturation_pressure" in capsys.readouterr().out

"""The pytest plugin: what a plan becomes in a test run, in an empty folder, beside files that are none of its own."""

from __future__ import annotations

import os
import re
import subprocess
import tomllib
from collections.abc import Callable, Mapping
from pathlib import Path
from xml.etree import ElementTree

import pytest

from eosmuster import pytest_plugin
from eosmuster.plan.reading import parse_plan

pytest_plugins = ["pytester"]

# Judged against the handbook alone, so that no reference library has to be loaded, and by a limit that leaves no
# doubt: van der Waals' equation gives twice the vapor pressure of propane and more at 0.7 Tc, which by the definition
# of the acentric factor is 42.51 bar x 10^-(1 + 0.152) = 3.0 bar. Helium has no Twu parameters, an invented cut no
# reference.
PLAN = """
components = ["propane", "helium", "cut"]
models = ["PR", "vdW", "PR-Twu91"]
properties = ["saturation_pressure"]
[states]
reduced_temperature = [0.7, 0.8, 0.9]
[references]
use = ["handbook"]
[tolerance]
saturation_pressure = "5 %"
[[component]]
name = "cut"
critical_temperature = "540.2 K"
critical_pressure = "27.4 bar"
acentric_factor = 0.35
molar_mass = "100.2 g/mol"
source = "invented"
"""
GATED = PLAN + '[gate]\ncomponents = ["propane"]\ncandidates = ["PR", "PR-Twu91"]\n'

Run = Callable[..., pytest.RunResult]


@pytest.fixture(scope="module", autouse=True)
def loaded() -> None:
    """Load what a sweep needs before a run inside this process does: its modules are unloaded after it."""
    pytest_plugin.outcomes(parse_plan(PLAN, "small", "small.toml"))


@pytest.fixture
def folder(pytester: pytest.Pytester, monkeypatch: pytest.MonkeyPatch) -> Path:
    """An empty folder in which pytest knows this plugin and those that are named, whatever else is installed."""
    monkeypatch.setenv("PYTEST_DISABLE_PLUGIN_AUTOLOAD", "1")
    for name in ("PYTEST_ADDOPTS", "CI", "BUILD_NUMBER"):
        monkeypatch.delenv(name, raising=False)
    return pytester.path


@pytest.fixture
def run(pytester: pytest.Pytester, folder: Path) -> Run:
    """Write a plan and run pytest in this process."""

    def run(plan: str, *arguments: str, name: str = "small.eos.toml") -> pytest.RunResult:
        (folder / name).write_text(plan, encoding="utf-8")
        return pytester.runpytest_inprocess(*arguments, plugins=[pytest_plugin])

    return run


def outcomes(result: pytest.RunResult) -> dict[str, str]:
    """Item -> outcome, of a verbose run."""
    found = re.findall(r"^\S+\.eos\.toml::(.*?) (PASSED|FAILED|SKIPPED|ERROR)\b", result.stdout.str(), re.MULTILINE)
    return dict(found)


def collected(result: pytest.RunResult) -> list[str]:
    """Node ids of a run with ``--collect-only -q``."""
    return [line for line in result.outlines if "::" in line]


# ---------------------------------------------------------------- items and their outcomes


def test_one_item_a_component_candidate_and_property(run: Run) -> None:
    result = run(PLAN, "-v", "-rs")
    assert outcomes(result) == {
        "n-Propane | PR | saturation_pressure": "PASSED",
        "n-Propane | vdW | saturation_pressure": "FAILED",
        "n-Propane | PR-Twu91 | saturation_pressure": "PASSED",
        "Helium | PR | saturation_pressure": "FAILED",
        "Helium | vdW | saturation_pressure": "FAILED",
        "Helium | PR-Twu91 | saturation_pressure": "SKIPPED",
        "cut | PR | saturation_pressure": "FAILED",
        "cut | vdW | saturation_pressure": "FAILED",
        "cut | PR-Twu91 | saturation_pressure": "FAILED",
    }
    assert result.ret == pytest.ExitCode.TESTS_FAILED
    result.stdout.fnmatch_lines(["*PR-Twu91 is unavailable for Helium: no parameters*"])


def test_a_failure_says_all_that_is_needed_and_shows_no_code(run: Run) -> None:
    result = run(PLAN, "-k", "propane and :vdW:")
    shown = result.stdout.str()
    assert "Traceback" not in shown
    assert ".py" not in shown
    result.stdout.re_match_lines(
        [
            r"_+ n-Propane \| vdW \| saturation_pressure _+",
            r"\d of \d points? outside against handbook:\S+ and \d more, at worst \+\d+ % at -?[\d.]+ degC "
            r"\(limit 5 %\)",
            r"against handbook:wagner-poling-2001: 3 of 3 points outside",
            r"  worst point  at -14\.2\d? degC \(T/Tc 0\.7\)",
            r"  predicted    [\d.]+ bar",
            r"  reference    (2\.99|3\.0)\d* bar",
            r"  deviation    \+1\d\d %, limit 5 %",
            r"  note         simple rule: the reference's uncertainty is not stated",
            r"  inside       at none of the states",
            r"FAILED small.eos.toml::n-Propane \| vdW \| saturation_pressure - .*",
        ],
        consecutive=False,
    )
    assert max(map(len, result.outlines)) <= 140


def test_in_ci_where_pytest_trims_nothing_a_failure_is_listed_by_its_first_line(
    run: Run, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("CI", "true")
    result = run(PLAN, "-k", "propane and :vdW:", "--junitxml=out.xml")
    listed = result.outlines.index("=========================== short test summary info ============================")
    assert len(result.outlines) == listed + 3
    assert re.match(
        r"FAILED .* - Failed: 3 of 3 points outside against .*, at worst \+\d+ % ", result.outlines[listed + 1]
    )
    assert sum("worst point" in line for line in result.outlines) == 5
    failure = next(ElementTree.parse("out.xml").getroot().iter("failure"))
    assert "\n" not in failure.get("message", "")
    assert (failure.text or "").count("worst point") == 5


def test_the_other_references_are_named_that_the_gate_is_met_against(run: Run) -> None:
    tight = PLAN.replace('"5 %"', '"0.35 %"')  # the correlations differ by 0.2 % among themselves
    result = run(tight, "-k", "propane and :PR:")
    result.stdout.re_match_lines(
        [r"against handbook:\S+: \d of \d points? outside", r"the gate is met against: hand.*"]
    )
    met = next(line for line in result.outlines if line.startswith("the gate is met"))
    failing = {line.split()[1].rstrip(":") for line in result.outlines if line.startswith("against handbook:")}
    assert not failing & set(re.findall(r"handbook:[\w-]+", met))


def test_nothing_judged_is_a_failure_with_the_reason(run: Run) -> None:
    result = run(PLAN, "-k", "cut and :PR:")
    assert result.ret == pytest.ExitCode.TESTS_FAILED
    sentence = "nothing was judged: no reference has a value of saturation_pressure for cut at any state of the plan"
    assert sentence in result.outlines


def test_a_plan_without_any_reference_is_a_failure_too(run: Run) -> None:
    """The sweep itself ends with `NothingJudged`; on the command line that is exit status 4."""
    result = run(PLAN.replace('"propane", "helium", ', ""))
    result.assert_outcomes(failed=3)
    assert "nothing could be judged: no reference has a value" in result.stdout.str()


def test_what_the_gate_names_and_nothing_else_fails(run: Run) -> None:
    named = PLAN + '[gate]\nfail_on = ["unavailable"]\ncomponents = ["propane", "helium"]\n'
    result = run(named, "-v")
    assert {name for name, outcome in outcomes(result).items() if outcome == "FAILED"} == {
        "Helium | PR-Twu91 | saturation_pressure"
    }
    assert "Helium, PR-Twu91, saturation pressure: unavailable, no parameters" in result.outlines
    result.assert_outcomes(passed=5, failed=1)


def test_only_what_the_gate_asks_becomes_an_item(run: Run) -> None:
    result = run(GATED, "-v")
    assert outcomes(result) == {
        "n-Propane | PR | saturation_pressure": "PASSED",
        "n-Propane | PR-Twu91 | saturation_pressure": "PASSED",
    }
    assert result.ret == pytest.ExitCode.OK


# ---------------------------------------------------------------- once, and not before


def counting(monkeypatch: pytest.MonkeyPatch) -> list[str]:
    """Count the sweeps of this process, by the names of their plans."""
    from eosmuster.sweeping import run as running

    swept, real = [], running.run

    def run(plan: object, *arguments: object) -> object:
        swept.append(plan.name)  # type: ignore[attr-defined]
        return real(plan, *arguments)  # type: ignore[arg-type]

    monkeypatch.setattr(running, "run", run)
    return swept


def test_collecting_reads_and_does_not_sweep(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    swept = counting(monkeypatch)
    result = run(GATED, "--collect-only", "-q")
    assert collected(result) == [
        "small.eos.toml::n-Propane | PR | saturation_pressure",
        "small.eos.toml::n-Propane | PR-Twu91 | saturation_pressure",
    ]
    assert run(GATED, "-k", "nothing_of_the_kind").ret == pytest.ExitCode.NO_TESTS_COLLECTED
    assert swept == []


def test_a_plan_is_swept_once_in_whatever_order_items_run(
    run: Run, folder: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (folder / "other.eos.toml").write_text(GATED, encoding="utf-8")
    (folder / "conftest.py").write_text(
        "def pytest_collection_modifyitems(items):\n    items.sort(key=lambda item: (item.name, item.nodeid))\n"
    )
    swept = counting(monkeypatch)
    run(GATED).assert_outcomes(passed=4)
    assert len(swept) == 2


def test_a_sweep_that_breaks_is_shown_once_and_not_repeated(run: Run, monkeypatch: pytest.MonkeyPatch) -> None:
    tried = []

    def fail(*_: object) -> None:
        tried.append(1)
        raise IndexError("a slip of ours")

    monkeypatch.setattr("eosmuster.sweeping.run.run", fail)
    result = run(GATED)
    result.assert_outcomes(errors=2)
    assert result.outlines.count("internal failure: IndexError: a slip of ours") == 2
    assert result.outlines.count("Traceback (most recent call last):") == 1
    assert result.outlines.count("IndexError: a slip of ours") == 1
    assert len(tried) == 1


def test_a_plan_found_wrong_by_its_sweep_is_an_error_of_one_sentence(run: Run) -> None:
    """Measured files that do not exist: known only to the sweep."""
    result = run(GATED.replace('["handbook"]', '["handbook"]\nfiles = ["lab/*.csv"]'))
    result.assert_outcomes(errors=2)
    shown = result.stdout.str()
    assert "lab/*.csv" in shown
    assert "Traceback" not in shown
    assert ".py" not in shown


# ---------------------------------------------------------------- bad plans, other files


@pytest.mark.parametrize(
    ("plan", "sentence"),
    [
        (PLAN + '[constants]\nsource = "crc-59"', "constants.source = 'crc-59' is unknown; nearest: crc-95"),
        (PLAN.replace('"vdW"', '"PR87"'), "models: unknown model 'PR87'; nearest: PR78"),
        (PLAN + '[gate]\ncandidates = ["PR78"]', "gate.candidates: 'PR78' is none of the plan's candidates"),
        ("", "is empty; a plan names at least its components and properties"),
        ("components = [", "is not valid TOML"),
        ("\x00", "is a binary file"),
    ],
)
def test_a_bad_plan_is_a_collection_error_of_one_sentence(run: Run, plan: str, sentence: str) -> None:
    result = run(plan)
    assert result.ret == pytest.ExitCode.INTERRUPTED
    result.assert_outcomes(errors=1)
    said = [line for line in result.outlines if sentence in line]
    assert len(said) == 1
    assert "small.eos.toml: " in said[0]
    assert "Traceback" not in result.stdout.str()
    assert ".py" not in result.stdout.str()


def test_other_files_are_left_alone(run: Run, folder: Path) -> None:
    for name in ("plan.toml", "eos.toml", ".eos.toml", "a.eos.toml.bak", "b_eos.toml", "c.EOS.TOML"):
        (folder / name).write_text("not = = a plan", encoding="utf-8")
    (folder / "deep" / "er.eos.toml").mkdir(parents=True)  # a folder of that name
    (folder / "deep" / "mine.eos.toml").write_text(GATED, encoding="utf-8")
    (folder / "test_own.py").write_text("def test_own():\n    pass\n", encoding="utf-8")
    result = run(GATED, "--collect-only", "-q")
    assert {node.partition("::")[0] for node in collected(result)} == {
        "small.eos.toml",
        "deep/mine.eos.toml",
        "test_own.py",
    }


# ---------------------------------------------------------------- names

HOSTILE = (
    "a :: b [1]",
    "a :: b (1)",
    "cut | PR | saturation_pressure",
    "-x",
    "水とアンモニア",
    "quote ' and \\\" and \\\\",
    "n" * 60,
    "<script>&amp;",
    "{curly} $HOME `id` %s",
)


def hostile_plan() -> str:
    own = PLAN[PLAN.index("[[component]]") :]
    components = "".join(own.replace('"cut"', f'"{name}"') for name in HOSTILE)
    head = PLAN[: PLAN.index("[[component]]")].replace('"propane", "helium", "cut"', "")
    return head.replace('models = ["PR", "vdW", "PR-Twu91"]', 'models = ["PR"]') + components


def test_hostile_names_make_items_that_can_be_picked_one_by_one(run: Run) -> None:
    nodes = collected(run(hostile_plan(), "--collect-only", "-q"))
    assert len(set(nodes)) == len(nodes) == len(HOSTILE)
    names = [node.removeprefix("small.eos.toml::") for node in nodes]
    assert names[:2] == ["a : b (1) | PR | saturation_pressure", "a : b (1) | PR | saturation_pressure #2"]
    for name in names:
        assert name.isprintable()
        assert not {"::", "[", "]"} & {name[i : i + n] for n in (1, 2) for i in range(len(name))}
    for node in (nodes[0], nodes[1], nodes[4], nodes[5], nodes[8]):
        assert collected(run(hostile_plan(), "--collect-only", "-q", node)) == [node]


def test_names_are_shortened_and_stay_different() -> None:
    from eosmuster.sweeping.gate import Key

    keys = [Key("x" * 5000 + end, "two\nlines", "density") for end in "ab"]
    first, second = pytest_plugin.item_names(keys)
    assert second == f"{first} #2"
    assert first.endswith("… | two lines | density")
    assert len(first) < 100


def test_k_picks_a_whole_name_between_colons(run: Run) -> None:
    """Without the colons PR is in PR-Twu91 and, since case does not count, in every propane and every pressure."""
    assert len(collected(run(PLAN, "--collect-only", "-q", "-k", "PR"))) == 9
    assert collected(run(PLAN, "--collect-only", "-q", "-k", ":PR: and :helium:")) == [
        "small.eos.toml::Helium | PR | saturation_pressure"
    ]
    assert len(collected(run(PLAN, "--collect-only", "-q", "-k", "not :PR:"))) == 6


# ---------------------------------------------------------------- pytest's own options


def test_x_stops_at_the_first_failure(run: Run) -> None:
    run(PLAN, "-x").assert_outcomes(passed=1, failed=1)


def test_last_failed_runs_those_again(run: Run) -> None:
    run(PLAN).assert_outcomes(passed=2, failed=6, skipped=1)
    run(PLAN, "--lf").assert_outcomes(failed=6)


def test_junit_xml_is_of_the_strict_form(run: Run, folder: Path) -> None:
    """The xunit2 schema allows a case no properties, and no attributes but these."""
    run(PLAN, "--junitxml=junit.xml", "-o", "junit_family=xunit2")
    [suite] = ElementTree.parse(folder / "junit.xml").getroot()
    assert {name: suite.get(name) for name in ("tests", "failures", "skipped", "errors")} == {
        "tests": "9",
        "failures": "6",
        "skipped": "1",
        "errors": "0",
    }
    cases = suite.findall("testcase")
    assert [case.get("name") for case in cases][:2] == [
        "n-Propane | PR | saturation_pressure",
        "n-Propane | vdW | saturation_pressure",
    ]
    for case in cases:
        assert set(case.attrib) == {"name", "classname", "time"}
        assert case.get("classname") == "small.eos.toml"
        assert {child.tag for child in case} <= {"failure", "skipped"}
    failure = cases[1].find("failure")
    assert failure is not None
    assert re.match(r"Failed: \d of \d points? outside against handbook:", failure.get("message", ""))
    assert "worst point  at -14.2" in (failure.text or "")


def test_hostile_names_make_whole_xml(run: Run, folder: Path) -> None:
    run(hostile_plan(), "--junitxml=junit.xml")
    names = [case.get("name", "") for case in ElementTree.parse(folder / "junit.xml").iter("testcase")]
    assert len(set(names)) == len(HOSTILE)
    assert "<script>&amp; | PR | saturation_pressure" in names


def test_workers_share_the_items(pytester: pytest.Pytester, folder: Path, environment: Mapping[str, str]) -> None:
    (folder / "small.eos.toml").write_text(PLAN, encoding="utf-8")
    settings = {**environment, "PYTEST_DISABLE_PLUGIN_AUTOLOAD": "1"}
    arguments = ("-m", "pytest", "-p", "xdist", "-p", "eosmuster.pytest_plugin", "-n", "2", "-v")
    done = in_folder(folder, settings, *arguments)
    assert done.returncode == pytest.ExitCode.TESTS_FAILED, done.stdout + done.stderr
    found = re.findall(r"^\[gw(\d)\].* (PASSED|FAILED|SKIPPED) small\.eos\.toml::(.*?) *$", done.stdout, re.MULTILINE)
    assert len({name for _, _, name in found}) == 9
    assert sorted(outcome for _, outcome, _ in found) == ["FAILED"] * 6 + ["PASSED"] * 2 + ["SKIPPED"]
    assert {worker for worker, _, _ in found} == {"0", "1"}


# ---------------------------------------------------------------- how it is found, and what it costs the others


def in_folder(folder: Path, settings: Mapping[str, str], *arguments: str) -> subprocess.CompletedProcess[str]:
    import sys

    return subprocess.run(
        [sys.executable, *arguments], cwd=folder, env=dict(settings), capture_output=True, text=True, check=False
    )


def test_it_is_installed_with_the_package(folder: Path, root: Path, environment: Mapping[str, str]) -> None:
    """An installed distribution is a folder of metadata beside the package: here with the project's entry points."""
    project = tomllib.loads((root / "pyproject.toml").read_text(encoding="utf-8"))["project"]
    installed = folder / "site" / "eosmuster-0.dist-info"
    installed.mkdir(parents=True)
    (installed / "METADATA").write_text("Metadata-Version: 2.1\nName: eosmuster\nVersion: 0\n")
    listed = "".join(f"{name} = {value}\n" for name, value in project["entry-points"]["pytest11"].items())
    (installed / "entry_points.txt").write_text(f"[pytest11]\n{listed}")
    (folder / "small.eos.toml").write_text(GATED, encoding="utf-8")
    path = os.pathsep.join([environment["PYTHONPATH"], str(installed.parent)])
    settings = {**environment, "PYTHONPATH": path, "PYTEST_DISABLE_PLUGIN_AUTOLOAD": "1"}
    done = in_folder(folder, settings, "-m", "pytest", "-p", "eosmuster", "--collect-only", "-q")
    assert "small.eos.toml::n-Propane | PR | saturation_pressure" in done.stdout, done.stdout + done.stderr


def test_a_run_without_a_plan_loads_nothing(folder: Path, environment: Mapping[str, str]) -> None:
    """It is part of every run of its environment: two modules of the package, and none that is heavy."""
    (folder / "pyproject.toml").write_text("[tool.pytest.ini_options]\nfilterwarnings = ['error']\n")
    (folder / "test_own.py").write_text(
        "import sys\n\n\ndef test_own():\n"
        "    mine = {name for name in sys.modules if name.partition('.')[0] == 'eosmuster'}\n"
        "    assert mine == {'eosmuster', 'eosmuster.errors', 'eosmuster.pytest_plugin'}\n"
        "    assert not {'numpy', 'pandas', 'CoolProp', 'scipy'} & set(sys.modules)\n"
    )
    settings = {**environment, "PYTEST_DISABLE_PLUGIN_AUTOLOAD": "1"}
    done = in_folder(folder, settings, "-m", "pytest", "-p", "eosmuster.pytest_plugin", "-q", "--strict-config")
    assert done.returncode == pytest.ExitCode.OK, done.stdout + done.stderr

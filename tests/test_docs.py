"""README is true: its console blocks are run again, its Python is run, and its commands are CI's."""

import doctest
import re
import shlex
from pathlib import Path

import pytest

from eosmuster.cli import main
from eosmuster.plan.reading import parse_plan

TOP = Path(__file__).parents[1]
README = (TOP / "README.md").read_text(encoding="utf-8")


def blocks(language: str) -> list[str]:
    return re.findall(rf"^```{language}\n(.*?)^```$", README, re.MULTILINE | re.DOTALL)


@pytest.mark.parametrize("block", blocks("console"), ids=lambda b: b.splitlines()[0][2:50])
def test_console_block_is_what_the_command_prints(
    block: str, capsys: pytest.CaptureFixture[str], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.chdir(tmp_path)
    command, _, expected = block.partition("\n")
    program, *arguments = shlex.split(command.removeprefix("$ "))
    assert program == "eosmuster"
    assert main(arguments) == 0
    printed = [line.rstrip() for line in capsys.readouterr().out.strip().splitlines()]
    wanted = [line.rstrip() for line in expected.strip().splitlines()]
    assert wanted, f"run `{command}` and paste what it prints"
    start = 0
    for part in "\n".join(wanted).split("\n...\n"):  # a line of three dots leaves some out
        lines = part.strip("\n").splitlines()
        found = [i for i in range(start, len(printed)) if printed[i : i + len(lines)] == lines]
        assert found, f"not printed by `{command}`:\n{part}"
        start = found[0] + len(lines)


def test_python_block_runs() -> None:
    [block] = blocks("python")
    flags = doctest.NORMALIZE_WHITESPACE | doctest.ELLIPSIS
    example = doctest.DocTestParser().get_doctest(block, {}, "README", "README.md", 0)
    assert doctest.DocTestRunner(optionflags=flags).run(example).failed == 0


def test_plan_block_is_a_plan() -> None:
    [block] = blocks("toml")
    plan = parse_plan(block, "chiller", "README.md")
    assert [c.name for c in plan.components] == ["n-Propane", "Ethane", "my cut"]
    assert plan.models[-1] == "my PR"


def test_ci_runs_the_second_command() -> None:
    run, test = (block.strip() for block in blocks("sh"))
    assert run.endswith("eosmuster sweep")
    assert test in (TOP / ".ci" / "run").read_text(encoding="utf-8")


def test_pure_components_only_is_said() -> None:
    assert "Pure components only" in README

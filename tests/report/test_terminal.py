import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from eosmuster.report.terminal import SaturationRow, saturation_table, terminal_summary
from eosmuster.report.text import cells_of


def lines_of(record, width=100, folder=None):
    return terminal_summary(record, folder, width).split("\n")


def test_says_what_holds_in_the_first_lines(block, record_of):
    blocks = []
    for i, fluid in enumerate(("alphane", "betane", "gammol")):
        verdict = np.zeros((3, 9), dtype=np.int8)
        verdict[0], verdict[1, : 3 * i] = 1, 4
        blocks.append(replace(block(fluid, ("vdW", "SRK", "PR"), 9), verdict=verdict))
    record = record_of(blocks)
    lines = lines_of(replace(record, summary=record.summary[:-1]))
    assert lines[:5] == [
        "An invented run",
        "3 fluids, 3 candidates, 81 points: 45 inside, 27 outside, 9 unsolved",
        "",
        "saturation pressure, limits 1 to 3 %, T/Tc 0.534 to 0.99",
        "  holds for all 3 fluids: PR",
    ]
    table = [line for line in lines if line.startswith(("vdW", "SRK", "PR"))]
    assert [line.split()[0] for line in table] == ["vdW", "SRK", "PR"]  # worst first
    assert [line.split("  ")[-1].strip() for line in table] == ["none", "only alphane", "all"]
    assert "unsolved: 9 points" in lines


def test_says_where_the_best_candidate_is_inside_of_the_fluids_it_does_not_hold(block, record_of):
    fluids = {"alphane": [0, 0, 0, 0], "betane": [0, 0, 0, 1], "gammol": [1, 1, 1, 4]}
    blocks = [replace(block(f, ("PR",), 4), verdict=np.array([v], dtype=np.int8)) for f, v in fluids.items()]
    record = record_of(blocks)
    windows = tuple(w for w in record.windows if w.component != "gammol")
    lines = lines_of(replace(record, windows=windows, summary=record.summary[:-1]))
    assert "  fluids held, of 3: PR 1" in lines
    assert "  where PR is inside, degC: gammol nowhere, betane -62.65 to 67.1" in lines
    assert "  held by no candidate, 2 fluids: gammol, betane" in lines


def test_nothing_held_is_said_with_what_comes_nearest(block, record_of):
    verdict = np.array([[1, 1, 1, 1], [0, 1, 1, 1]], dtype=np.int8)
    record = record_of([replace(block(states=4), verdict=verdict)])
    assert "  no candidate holds it; nearest: SRK, 25 % of its points inside" in lines_of(record)


@pytest.mark.parametrize("width", [40, 72, 100])
def test_no_line_is_wider_than_the_terminal(block, record_of, nasty_names, width):
    blocks = [block(name, (name, "PR"), 3, source=name, seed=i) for i, name in enumerate(nasty_names)]
    record = record_of(blocks, title="\x1b[2J" + "long title " * 30)
    record = replace(record, left_out=tuple((name, name) for name in nasty_names))
    lines = lines_of(record, width)
    assert max(map(cells_of, lines)) <= width
    assert all(line.isprintable() for line in lines)


def test_failures_are_counted_and_the_folder_named(record, tmp_path, monkeypatch):
    text = terminal_summary(record, tmp_path / "results")
    assert "unsolved: " in text
    assert "PR-Twu91: 1 fluid (alphane) no Twu parameters for this component" in text
    assert "left out: Air (why: manifest.json)" in text
    assert str(tmp_path / "results") in text
    monkeypatch.chdir(tmp_path)
    assert terminal_summary(record, tmp_path / "results").endswith("\n\nresults: results")
    assert terminal_summary(record, Path("/" + "x" * 200)).endswith("\n\nresults:\n/" + "x" * 200)


def test_no_failure_is_said_too(block, record_of):
    one = block(states=3)
    record = record_of([replace(one, verdict=one.verdict * 0)])
    assert "unsolved: none" in lines_of(replace(record, left_out=(), summary=record.summary[:-1]))


def test_many_candidates_and_reasons_are_cut_with_a_sentence(block, record_of):
    verdict = np.full((60, 2), 4, dtype=np.int8)
    text = terminal_summary(record_of([replace(block("a", [f"m{i}" for i in range(60)], 2), verdict=verdict)]), None)
    assert "21 candidates that hold fewer fluids are left out; see summary.csv" in text
    assert "more groups in points.csv" in text


def test_saturation_table_fits_and_footnotes_what_is_missing():
    nan = float("nan")
    rows = [
        SaturationRow("PR", 9.9817349, 490.123, 21.61, 15.12, 8.43),
        SaturationRow("a model of the user's own with a long name", 9.98, 490.0, 21.6, 15.1, 8.4),
        SaturationRow("Antoine", nan, nan, nan, nan, nan, "refused: 300 K lies outside 190 to 260 K " * 4),
        SaturationRow("Wagner", nan, nan, nan, nan, nan, "refused: 300 K lies outside 190 to 260 K " * 4),
        SaturationRow("coolprop", 9.97, 489.0, 20.6, 15.1, nan, "another note"),
    ]
    headers = ["model", "p_sat, bar", "liquid, kg/m3", "vapor, kg/m3", "h_vap, kJ/mol", "fugacity, bar"]
    for width in (80, 100):
        lines = saturation_table(rows, headers, width).split("\n")
        assert max(map(cells_of, lines)) <= width
        rule = next(i for i, line in enumerate(lines) if line.startswith("---"))
        assert lines[rule + 1].split()[:2] == ["PR", "9.98173"]
        assert [line.split()[-1] for line in lines[rule + 3 : rule + 6]] == ["[1]", "[1]", "[2]"]
        assert lines[-1] == "[2] another note"
    assert "[" not in saturation_table(rows[:1], headers)


@pytest.mark.parametrize("width", [40, 50, 60, 70, 80])
def test_no_unit_is_cut_on_a_narrow_terminal(width):
    rows = [SaturationRow("dippr101-perry-2008", *[0.868395] * 5), SaturationRow("PR", *[24.0171] * 5, "a note")]
    headers = ["", "p_sat, bar", "liquid, kg/m3", "vapor, kg/m3", "h_vap, kJ/mol", "fugacity, bar"]
    text = saturation_table(rows, headers, width)
    above, _, below = text.partition("---")
    assert max(map(cells_of, text.split("\n"))) <= width
    assert "…" not in above
    left_out = " ".join(below.partition("left out, for want of room: ")[2].split()).split(", ")
    for header in headers[1:]:
        name, unit = header.split(", ")
        assert (name in above) != (name in left_out)
        assert name not in above or unit in above


def test_a_list_of_fluids_that_has_no_room_is_left_out(block, record_of):
    record = record_of([block("alphane", ("a candidate with a long name",), 9)])
    assert any("fluids held" in line for line in lines_of(record, 100))
    for width in range(40, 100):
        assert not [line for line in lines_of(record, width) if line.endswith(("fluids h…", "fluids…", "fluids"))]


def test_importing_the_reports_loads_nothing_heavy():
    script = (
        "import sys, eosmuster.report.folder, eosmuster.report.terminal; "
        "print([m for m in ('pandas', 'scipy', 'CoolProp', 'tabulate', 'importlib.metadata') if m in sys.modules])"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"

import re
from dataclasses import replace

import pytest

from eosmuster.record import CAUSE_FOUND
from eosmuster.report.markdown import LIMIT, summary_markdown

BARE_PIPE = re.compile(r"(?<!\\)\|")


def assert_tables_are_whole(text):
    width = None
    for line in text.split("\n"):
        if not line.startswith("|"):
            width = None
            continue
        columns = len(BARE_PIPE.findall(line))
        width = width or columns
        assert columns == width, line


def test_the_answer_comes_in_the_first_lines(record):
    first = summary_markdown(record).split("\n")[:15]
    assert first[0] == "# An invented run"
    assert any("saturation pressure, limits 1 to 3 %" in line for line in first)
    assert any("hold" in line for line in first)
    assert "216 points" in first[2]
    assert "unsolved" in first[2]


def test_has_every_section_a_reader_is_owed(record):
    text = summary_markdown(record)
    for heading in (
        "Decision rule",
        "saturation pressure: candidates, worst first",
        "boiling temperature: fluids x candidates",
        "Largest deviations",
        "Rows that do not hold, worst first",
        "Windows of the 3 best candidates",
        "Unsolved points",
        "Unavailable",
        "Left out",
        "Notes on constants",
        "Cautions",
    ):
        assert heading in text
    assert "| PR-Twu91 | no Twu parameters for this component | 1 | alphane |" in text
    assert "| Air | a blend: two saturation pressures at one temperature |" in text
    assert "acentric factor replaced: invented" in text
    assert "licensed engineer" in text
    assert "Pure components only, for now" in text
    assert "not made: alphane." in text  # the quantum gas of this record
    assert_tables_are_whole(text)


def test_the_grid_stands_beside_the_aad(record):
    header = next(line for line in summary_markdown(record).split("\n") if "| AAD |" in line)
    assert "| points | from, degC | to, degC | AAD | bias | RMS | median | P95 | maximum | at, degC |" in header


def test_failures_have_a_mark_of_their_own(block, record_of):
    one = block("alphane", ("inside", "failing"), 4)
    verdict = one.verdict.copy()
    verdict[0], verdict[1] = 0, [0, 0, 0, 4]
    text = summary_markdown(record_of([replace(one, verdict=verdict)]))
    assert "| alphane | ok | 75%! | n/a |" in text


@pytest.mark.parametrize(
    ("changes", "expected"),
    [
        ({"decision": {"rule": "simple"}}, "Simple rule"),
        ({"decision": {"rule": "own", "note": "x"}}, "- Rule: own."),
        ({"decision": {}}, "- Rule: ?."),
        (
            {"constants": {"alphane": {"class": "associating"}}},
            "hydrogen bonds a cubic equation does not know: alphane.",
        ),
        ({"left_out": ()}, "Nothing."),
        ({"display": {}}, "from, K"),
    ],
)
def test_says_what_the_record_says(record, changes, expected):
    assert expected in summary_markdown(replace(record, **changes))


def test_temperatures_deviate_in_kelvin_and_densities_read_in_the_display_unit(block, record_of):
    boiling = block("alphane", name="boiling_temperature", unit="K", states=3, seed=4)
    density = block("alphane", name="liquid_density", unit="mol/m3", states=3, seed=4)
    record = record_of([boiling, density])
    text = summary_markdown(replace(record, display={"density": "kg/m3"}))
    assert re.search(r"\| boiling temperature \| alphane .* \| [+-][\d.]+ K \| [\d.]+ K \|", text)
    assert re.search(r"\| saturated liquid density \| alphane .* \| kg/m3 \| [+-][\d.]+ % \|", text)
    assert "| mol/m3 |" in summary_markdown(replace(record, display={"density": "kg/m3"}, constants={}))


def test_names_of_users_cannot_break_a_table_or_run(block, record_of, nasty_names, constants):
    blocks = [block(name, (name, "PR"), 3, source=name, seed=i) for i, name in enumerate(nasty_names)]
    record = replace(
        record_of(blocks, title="<script>\n# title"),
        left_out=tuple((name, name) for name in nasty_names),
        constants={name: constants(name, name) for name in nasty_names},
    )
    text = summary_markdown(record)
    assert_tables_are_whole(text)
    assert "<" not in text
    assert text.startswith("# &lt;script&gt; # title\n")
    assert all(line.isprintable() for line in text.split("\n"))


def test_a_record_with_nothing_in_it(record_of):
    record = replace(record_of([]), summary=(), windows=(), plan_title="", constants={})
    text = summary_markdown(record)
    assert text.startswith("# invented\n")
    assert "0 points" in text


def test_a_huge_record_stays_below_what_ci_takes(record, constants):
    names = [f"component with a very long name and a number {i:05d}" for i in range(400)]
    models = [f"model with quite a long name as well {i:03d}" for i in range(30)]
    properties = ("saturation_pressure", "liquid_density", "vapor_density", "enthalpy_of_vaporization")
    row = next(r for r in record.summary if r.verdict == "partly")
    summary = tuple(
        replace(row, component=n, candidate=m, property=p) for p in properties for n in names for m in models[:8]
    )
    window = record.windows[0]
    windows = tuple(replace(window, component=n, candidate=m) for n in names for m in models[:8])
    huge = replace(
        record,
        blocks=(),
        summary=summary,
        windows=windows,
        left_out=tuple((n * 10, n * 100) for n in names),
        constants={n: constants(n, *[n * 20] * 10) for n in names},
    )
    text = summary_markdown(huge)
    assert len(text.encode()) < LIMIT == 2**20
    assert_tables_are_whole(text)
    assert re.search(r"\d+ more rows are left out here; all are in summary.csv", text)


def test_too_many_candidates_side_by_side_are_left_out_with_a_sentence(block, record_of):
    text = summary_markdown(record_of([block("alphane", [f"m{i}" for i in range(40)], 2)]))
    assert "The 9 candidates that hold the fewest fluids are left out; all are in summary.csv." in text


def test_tolerances_are_told_with_their_reasons(record):
    tolerance = {
        "property": "liquid_density",
        "limit": "6 %",
        "class": "associating",
        "rationale": "invented | reason",
    }
    band = {"above_reduced_temperature": 0.7, "below_reduced_temperature": 0.9}
    plain = {"property": "boiling_temperature", "limit": "0.5 K", "below_reduced_temperature": None}
    text = summary_markdown(replace(record, decision={"rule": "simple", "tolerances": [tolerance | band, plain]}))
    row = r"| saturated liquid density | 6 % | associating, T/Tc from 0.7, T/Tc below 0.9 | invented \| reason |"
    assert row in text
    assert "| boiling temperature | 0.5 K | everywhere |  |" in text
    assert_tables_are_whole(text)


def test_remedies_are_not_cut_and_notes_have_their_own_heading(record):
    why = "column 'p' " + "why " * 100 + "declare a unit"
    conflicts = (("alphane", "x", "a and b disagree"), ("alphane", "x", f"{CAUSE_FOUND}gauge pressure"))
    changed = replace(record, left_out=(("lab.csv", why),), notes=(("lab.csv", "read as text"),), conflicts=conflicts)
    text = summary_markdown(changed)
    assert f"| lab.csv | {why} |" in text
    left_out, notes = text.partition("## Left out")[2].split("## Notes on measured files")
    assert "read as text" not in left_out
    assert "| lab.csv | read as text |" in notes
    assert notes.index(CAUSE_FOUND) < notes.index("a and b disagree")
    assert "## Notes on measured files" not in summary_markdown(record)

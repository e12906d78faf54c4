"""What the page says is what the record holds."""

import base64
import hashlib
import re
from dataclasses import replace
from functools import partial
from itertools import pairwise

import numpy as np
import pytest

from eosmuster.record import POINT_VERDICTS, WindowRow
from eosmuster.report import words
from eosmuster.report.answer import answer
from eosmuster.report.cautions import cautions
from eosmuster.report.dossier import colours, data, remarks, tables
from eosmuster.report.views import overviews

SECTIONS = [
    *("answer", "rule", "maps", "deviations", "windows", "contested", "worst-points", "tables", "ilac", "not-done"),
    *("sources", "cautions", "sign-off"),
]


def table(page, anchor):
    return page.one("table", id=anchor)


def data_of(page, anchor, header):
    """Read one column of a table by what its rows begin with."""
    headers = [th.text for th in table(page, anchor).all("th")]
    return {row[0]: row[headers.index(header)] for row in table(page, anchor).rows()}


@pytest.fixture
def referenced(record):
    """The invented record, with an order of its references."""
    return replace(record, references=("coolprop",))


def test_the_answer_comes_first_and_says_what_every_view_says(referenced, read_page):
    page = read_page(referenced)
    sections = page.one("main").all("section")
    assert [section.attributes["id"] for section in sections] == SECTIONS
    articles = sections[0].all("article")
    views = overviews(referenced)
    assert len(articles) == len(views) == 2
    for article, view in zip(articles, views, strict=True):
        heading, *sentences = answer(referenced, view, 600)
        assert article.one("h3").text == heading
        said = [p.text for p in article.all("p")]
        assert said[: len(sentences)] == sentences


def test_the_best_candidates_are_counted_as_the_record_counts_them(referenced, read_page):
    page = read_page(referenced)
    for i, view in enumerate(overviews(referenced)):
        for cells, standing in zip(table(page, f"best-{i}").rows(), reversed(view.standings), strict=True):
            judged = len(view.fluids) - len(standing.fluids["unavailable"]) - len(standing.fluids["unjudged"])
            assert cells[0] == standing.candidate
            assert cells[1] == f"{standing.held} of {judged}"
            assert cells[2] == f"{standing.held_by_all} of {judged}"
            assert cells[5] == str(standing.unsolved)


def test_every_cell_of_the_map_is_the_share_of_points_inside(referenced, read_page):
    page = read_page(referenced)
    blocks = {(b.property, b.component): b for b in referenced.blocks}
    for i, name in enumerate(("saturation_pressure", "boiling_temperature")):
        caption = page.one("caption", id=f"sheet-{i}-1")
        sheet = next(t for t in page.all("table", class_="map") if caption in t.parts)
        columns = [th.text for th in sheet.all("th", class_="up")]
        seen = 0
        for row in sheet.one("tbody").all("tr"):
            fluid, *cells = (part for part in row.parts if not isinstance(part, str))
            block = blocks[name, fluid.text]
            for candidate, cell in zip(columns, cells, strict=True):
                if candidate not in block.candidates:
                    assert cell.text in ("n/a", "")
                    continue
                verdict = block.verdict[block.candidates.index(candidate)]
                inside, unsolved = int((verdict == 0).sum()), int((verdict == 4).sum())
                judged = int((verdict != 5).sum())
                if cell.text not in ("?", "●", "○"):
                    figure = int(cell.text.rstrip("!"))
                    # whole percent, and never 0 or 100 by rounding
                    assert abs(figure - 100 * inside / judged) <= 1.0
                    assert cell.text.endswith("!") == (unsolved > 0)
                    assert ("u" in cell.attributes["class"].split()) == (unsolved > 0)
                elif cell.text != "?":
                    assert inside == judged
                assert f"{inside} of {judged} point" in cell.attributes["title"]
                seen += 1
        assert seen == 12


def test_held_undecided_and_unavailable_have_a_mark_of_their_own(block, record_of, read_page):
    one = block("alphane", ("held", "once", "open", "none"), 4)
    other = replace(one, reference_source="handbook:x")
    verdict = np.array([[0, 0, 0, 0], [0, 0, 0, 0], [0, 0, 2, 0], [1, 1, 1, 1]], dtype=np.int8)
    elsewhere = verdict.copy()
    elsewhere[1, 2] = 1
    record = record_of([replace(one, verdict=verdict), replace(other, verdict=elsewhere)])
    page = read_page(replace(record, references=("coolprop", "handbook")))
    row = page.one("table", class_="map").one("tbody").one("tr")
    marks = {cell.attributes["title"].split(", ")[1].split(":")[0]: cell for cell in row.all("td")}
    assert {name: cell.text for name, cell in marks.items()} == {
        "held": "●", "once": "○", "open": "?", "none": "0", "PR-Twu91": "n/a",
    }  # fmt: skip
    assert len({cell.attributes["class"] for cell in marks.values()}) == 5


def test_the_rows_of_the_summary_are_those_of_the_record(referenced, read_page):
    page = read_page(referenced)
    cells = {
        (row[0], row[1]): row
        for i in range(2)
        for row in table(page, f"rows-{i}").rows()
        if i == 0  # saturation pressure: deviations in percent throughout
    }
    rows = [row for row in referenced.summary if row.property == "saturation_pressure"]
    assert len(cells) == len(rows) == 13
    for row in rows:
        shown = cells[row.component, row.candidate]
        assert shown[3] == str(row.points)
        assert shown[13:17] == [str(n) for n in (row.inside, row.undecided, row.outside, row.unsolved)]
        assert shown[-1] == row.verdict
        for text, value in zip(shown[6:12], (row.aad_pct, row.bias_pct, row.rms_pct), strict=False):
            assert (text == "-") == np.isnan(value)
            if text != "-":
                assert float(text) == pytest.approx(value, rel=5e-3)  # three digits are shown


def test_rows_count_the_states_without_a_reference_and_name_the_range_that_was_judged(block, record_of, read_page):
    one = block("alphane", ("PR",), 3)
    one = replace(one, temperature=np.array([200.0, 250.0, 300.0]), verdict=np.array([[5, 0, 0]], np.int8))
    page = read_page(replace(record_of([one]), references=("coolprop",)))
    [heads] = [[th.text for th in tr.all("th")] for tr in table(page, "rows-0").one("thead").all("tr")]
    row = dict(zip(heads, table(page, "rows-0").rows()[0], strict=True))
    assert [row[head] for head in ("points", "from, degC", "to, degC", "no reference")] == [
        "3",
        "-23.15",
        "26.85",
        "1",
    ]
    whole = replace(one, verdict=one.verdict * 0)
    page = read_page(replace(record_of([whole]), references=("coolprop",)))
    assert "no reference" not in table(page, "rows-0").one("thead").text


def test_windows_are_shown_in_the_unit_people_read(referenced, read_page):
    page = read_page(referenced)
    shown = table(page, "spans-0").rows()
    windows = [w for w in referenced.windows if w.property == "saturation_pressure"]
    assert sorted(row[1] for row in shown) == sorted(w.component for w in windows)
    assert all(row[3:] == ["-62.65", "67.1", "plan limit", "limit"] for row in shown)  # 210.5 K and 340.25 K
    bars = page.one("section", id="windows").all("svg", class_="bar")
    labels = [bar.attributes["aria-label"] for bar in bars]
    assert any("inside -62.65 to 67.1 degC" in label for label in labels)


def test_windows_of_another_reference_do_not_answer(referenced, read_page):
    foreign = WindowRow("alphane", "PR", "saturation_pressure", "handbook:x", 250.0, 260.0, "limit", "limit")
    page = read_page(replace(referenced, windows=(foreign,)))
    assert not page.all("table", id="spans-0")
    labels = [bar.attributes["aria-label"] for bar in page.one("section", id="windows").all("svg", class_="bar")]
    assert not [label for label in labels if " to " in label and label.startswith("PR, alphane")]


@pytest.mark.parametrize(
    ("source", "what"), [("handbook:table", "tabulated states"), ("measured:lab.csv", "measured points")]
)
def test_a_source_without_windows_is_told_by_its_states(block, record_of, read_page, source, what):
    """Tables and measured points have no windows: `nowhere` would deny what the answer says."""
    one = block("alphane", ("held", "partly", "none"), 4, source=source)
    verdict = np.array([[0, 0, 0, 0], [0, 1, 1, 0], [1, 1, 1, 1]], dtype=np.int8)
    one = replace(one, verdict=verdict, reference=np.full(4, 1e5), deviation_pct=np.full((3, 4), 0.1))
    page = read_page(replace(record_of([one]), windows=(), references=(source.partition(":")[0],)))
    section = page.one("section", id="windows")
    bars = {b.attributes["aria-label"].split(",")[0]: b for b in section.all("svg", class_="bar")}
    assert bars["held"].attributes["aria-label"] == f"held, alphane: inside at 4 of 4 {what}"
    assert bars["partly"].attributes["aria-label"] == f"partly, alphane: inside at 2 of 4 {what}"
    assert bars["none"].attributes["aria-label"] == "none, alphane: inside nowhere"
    said = [span.text for span in section.all("span", class_="span")]
    assert said == [f"at 4 of 4 {what}", f"at 2 of 4 {what}", "nowhere", "n/a"]
    dots = {who: [d.attributes["d"].count("h0") for d in b.all("path", class_="at")] for who, b in bars.items()}
    assert (dots["held"], dots["partly"], dots["none"]) == ([4], [2], [])


def test_every_source_that_answers_has_a_bar_over_its_own_range(block, record_of, read_page):
    cold, warm = (
        replace(
            block("alphane", ("PR",), 3, source=f"handbook:{name}"),
            temperature=np.linspace(low, low + 50.0, 3),
            reference=np.full(3, 1e5),
            deviation_pct=np.full((1, 3), 0.1),
            verdict=np.full((1, 3), inside, np.int8),
        )
        for name, low, inside in (("cold", 200.0, 1), ("warm", 300.0, 0))
    )
    window = WindowRow("alphane", "PR", "saturation_pressure", "handbook:warm", 300.0, 350.0, "plan_limit", "limit")
    page = read_page(replace(record_of([cold, warm]), windows=(window,), references=("handbook",), display={}))
    table = page.one("section", id="windows").one("table", class_="bars")
    first = table.one("tbody").all("td")[0]
    assert [span.text for span in first.all("span", class_="span")] == [
        "nowhere (by handbook:cold)",
        "300 to 350 (by handbook:warm)",
    ]
    tracks = [track.attributes["d"] for track in first.all("path", class_="track")]
    assert tracks == ["M6 11H82", "M158 11H234"]  # a third of the axis each, from 200 to 350 K


def test_fluids_of_which_nothing_was_judged_are_not_counted(block, record_of, read_page):
    one = block("alphane", ("PR",), 3)
    judged = replace(one, reference=np.full(3, 1e5), verdict=np.zeros((1, 3), np.int8))
    none = np.full((1, 3), np.nan)
    silent = replace(
        one, component="silentane", reference=none[0], deviation_pct=none, verdict=np.full((1, 3), 5, np.int8)
    )
    record = record_of([judged, silent])
    page = read_page(replace(record, summary=record.summary[:-1], references=("coolprop",)))
    assert table(page, "best-0").rows()[0][1:3] == ["1 of 1", "1 of 1"]
    legend = {li.text.strip()[0] for li in page.one("section", id="maps").one("ul", class_="legend").all("li")}
    used = {cell.text for cell in page.one("table", class_="map").all("td")}
    assert used <= legend
    assert "–" in used


@pytest.mark.parametrize(
    ("rule", "said"),
    [("guarded", "the deviation alone decides the others. "), ("simple", "by the simple rule the deviation alone")],
)
def test_how_sure_the_answer_is_goes_by_the_rule(referenced, read_page, rule, said):
    page = read_page(replace(referenced, decision={**referenced.decision, "rule": rule}))
    sure = page.all("p", class_="sure")[0].text
    assert said in sure
    answering = [b for b in referenced.blocks if b.property == referenced.blocks[0].property]
    answering = [b for b in answering if b.reference_source == referenced.references[0]]
    states = sum(int((b.verdict != 5).any(axis=0).sum()) for b in answering)
    assert f" of {states} judged states" in sure
    assert ("undecided" in sure) == (rule == "guarded")


def test_what_is_read_in_its_own_unit_is_ranked_and_limited_in_it(block, record_of, read_page):
    """Percent of a coefficient that passes through zero would pick the wrong point, and a limit that says nothing."""
    near = replace(
        block("near zero", ("PR",), 2, "joule_thomson_coefficient", "K/Pa"),
        reference=np.array([1e-8, 2e-8]),
        deviation_pct=np.array([[2000.0, 100.0]]),  # of 0.001 and 0.002 K/bar
        reference_uncertainty_pct=np.full(2, np.nan),
        limit_pct=np.array([1e4, 5e3]),
        verdict=np.zeros((1, 2), np.int8),
    )
    far = replace(
        near,
        component="far from it",
        reference=np.array([1e-5, 1e-5]),
        deviation_pct=np.array([[16.0, 1.0]]),  # of 1 K/bar
        limit_pct=np.full(2, 10.0),
        verdict=np.array([[1, 0]], np.int8),
    )
    record = record_of([near, far])
    page = read_page(replace(record, summary=record.summary[:-1], references=("coolprop",)))
    assert [row[1] for row in table(page, "worst").rows()] == ["far from it", "near zero"]
    assert data_of(page, "rows-0", "passes at limit, K/bar") == {"near zero": "0.02", "far from it": "0.16"}


def test_only_the_worst_fluids_in_the_unit_that_is_read_are_named(block, record_of, read_page, monkeypatch):
    monkeypatch.setattr(tables, "worst", partial(tables.worst, most=1))
    one = replace(
        block("near zero", ("PR",), 2, "joule_thomson_coefficient", "K/Pa"), deviation_pct=np.full((1, 2), 900.0)
    )
    near = replace(one, reference=np.full(2, 1e-8), limit_pct=np.full(2, 1e4))
    far = replace(
        one, component="far from it", reference=np.full(2, 1e-5), deviation_pct=np.full((1, 2), 16.0),
        limit_pct=np.full(2, 10.0),
    )  # fmt: skip
    page = read_page(replace(record_of([near, far]), references=("coolprop",)))
    assert [row[1] for row in table(page, "worst").rows()] == ["far from it"]


def test_risk_and_surely_passing_limit_are_shown(referenced, read_page):
    rows = tuple(replace(r, false_acceptance_pct=1.25, surely_passing_limit_pct=4.5) for r in referenced.summary)
    page = read_page(replace(referenced, summary=rows))
    assert {row[-2] for row in table(page, "best-0").rows()} >= {"1.2"}
    assert set(data_of(page, "rows-0", "risk, %").values()) == {"1.2"}
    assert set(data_of(page, "rows-0", "surely at, %").values()) == {"4.5"}
    assert words.RISK in page.one("section", id="answer").text


def test_the_service_is_one_line_like_every_name(referenced, read_page):
    text = 'service = """cold\nstorage \u202e' + "x" * 1000 + '"""'
    shown = read_page(replace(referenced, plan_text=text)).one("p", class_="service").text
    assert shown.startswith("cold storage xxx")
    assert "\u202e" not in shown
    assert len(shown) <= 300
    assert not read_page(replace(referenced, plan_text='service = " "')).all("p", class_="service")


def test_worst_points_are_the_largest_deviations_of_their_rows(referenced, read_page):
    rows = table(read_page(referenced), "worst").rows()
    assert len(rows) == 24
    for row in rows:
        if row[0] != "saturation pressure":
            continue
        block = next(b for b in referenced.blocks if b.component == row[1] and b.property == "saturation_pressure")
        deviation = block.deviation_pct[block.candidates.index(row[2])]
        at = int(np.nanargmax(np.abs(deviation)))
        assert row[10].endswith(" %")
        assert float(row[10].split()[0]) == pytest.approx(deviation[at], abs=5e-3)
        assert float(row[4]) == pytest.approx(block.temperature[at] - 273.15, abs=0.051)
        assert row[12] == POINT_VERDICTS[block.verdict[block.candidates.index(row[2]), at]].replace("_", " ")


def test_the_caption_of_the_worst_points_counts_the_fluids_there_are(block, record_of, read_page):
    for fluids, counted in ((["alphane"], "1 fluid,"), (["alphane", "betane"], "2 fluids,")):
        record = record_of([block(fluid, ("PR", "SRK"), 6) for fluid in fluids])
        assert f"of each candidate and property {counted}" in table(read_page(record), "worst").one("caption").text
    many = record_of([block(f"fluid {i}", ("PR", "SRK"), 2) for i in range(70)])  # a third candidate is unavailable
    assert "the 66 fluids with the largest deviation" in table(read_page(many), "worst").one("caption").text


def test_the_four_statements_are_counted_for_every_point(referenced, read_page):
    """ILAC-G8:09/2019, section 4.2.3, with w = U, point by point."""
    counted = {}
    for block in referenced.blocks:
        for i, j in np.ndindex(block.verdict.shape):
            size, limit = abs(block.deviation_pct[i, j]), block.limit_pct[j]
            doubt = block.reference_uncertainty_pct[j]
            if np.isnan(size):
                said = "no deviation"
            elif np.isnan(doubt):
                said = "U not known"
            elif size <= limit:
                said = "pass" if size <= limit - doubt else "conditional pass"
            else:
                said = "conditional fail" if size <= limit + doubt else "fail"
            key = (block.property.replace("_", " "), POINT_VERDICTS[block.verdict[i, j]].replace("_", " "), said)
            counted[key] = counted.get(key, 0) + 1
    shown = {
        (row[0], row[1], statement): int(n)
        for row in table(read_page(referenced), "ilac-table").rows()
        for statement, n in zip(remarks.STATEMENTS, row[2:], strict=True)
        if n != "0"
    }
    assert shown == counted


def test_what_was_not_done_is_said(referenced, read_page):
    conflicts = (("alphane", "saturation_pressure", "x stands alone"),)
    notes = (("lab.csv", "read as text"),)
    page = read_page(replace(referenced, conflicts=conflicts, notes=notes))
    assert table(page, "left-table").rows() == [list(referenced.left_out[0])]
    assert table(page, "notes-table").rows() == [list(notes[0])]
    assert table(page, "unavailable-table").rows() == [
        ["PR-Twu91", "no Twu parameters for this component", "1", "alphane"]
    ]
    silent = table(page, "silent-table").rows()
    assert [row[:2] for row in silent if "boiling temperature" in row[4]]
    states = sum(int(row[3].split(" of ")[0]) * len(row[4].split(", ")) for row in silent)
    by_note = [(b, note) for b in referenced.blocks for note in range(len(b.notes))]
    assert states == sum(int(((b.verdict == 5) & (b.note == n)).any(axis=0).sum()) for b, n in by_note)
    unsolved = sum(int((b.verdict == 4).sum()) for b in referenced.blocks)
    assert sum(int(row[3]) for row in table(page, "unsolved-table").rows()) == unsolved
    assert table(page, "contested-table").rows() == [["alphane", "saturation pressure", "x stands alone"]]
    constants = table(page, "constants-table").rows()
    assert constants[0][0] == "alphane"
    assert constants[0][3] == "375"
    assert constants[0][6] == "100"
    assert constants[0][-1] == "acentric factor replaced: invented"
    assert table(page, "citations-table").rows() == [["invented", "nobody, nowhere"]]
    assert [li.text for li in page.one("section", id="cautions").all("li")] == list(cautions(referenced))


def test_the_run_is_identified_and_nothing_in_the_page_is_volatile(referenced, read_page, written):
    text = 'title = "x"\nservice = "storage <invented>"\n'
    record = replace(referenced, plan_text=text, files=(("lab.csv", "ab" * 32),))
    page = read_page(record)
    identity = {div.one("dt").text: div.one("dd").text for div in page.one("dl", class_="identity").all("div")}
    assert identity["SHA-256 of the plan's text"] == hashlib.sha256(text.encode()).hexdigest()
    assert identity["SHA-256 of lab.csv"] == "ab" * 32
    assert "manifest.json" in identity["made by, on, when"]
    assert page.one("p", class_="service").text == "storage <invented>"
    assert page.one("pre").text == text
    assert written(record) == written(record)
    roles = page.one("table", class_="signatures").rows()
    assert [row[0] for row in roles] == ["prepared", "checked", "approved"]


def test_the_page_asks_for_nothing_and_runs_only_its_own_script(referenced, read_page, written):
    page = read_page(referenced)
    policy = page.all("meta")[1].attributes["content"]
    script = page.one("script").text
    digest = base64.b64encode(hashlib.sha256(script.encode()).digest()).decode()
    rules = dict(rule.strip().partition(" ")[::2] for rule in policy.split(";"))
    assert rules["default-src"] == "'none'"
    assert rules["script-src"] == f"'sha256-{digest}'"
    assert "unsafe-inline" not in rules["script-src"]
    for node in page.walk():
        assert not [name for name in node.attributes if name.startswith("on")]
        for name in ("src", "srcset", "href", "xlink:href", "action", "data", "poster"):
            assert node.attributes.get(name, "#").startswith("#") or node.attributes[name] == "data:,"
    style = page.one("style").text
    assert "url(" not in style
    assert "@import" not in style
    assert b"http://" not in written(referenced)
    assert b"https://" not in written(referenced)


def test_names_of_users_stay_names(block, record_of, constants, nasty_names, read_page, written):
    blocks = [
        block(fluid, nasty_names, 5, name, unit, source="\"'><script>x</script>", seed=i)
        for i, fluid in enumerate(nasty_names[::2])
        for name, unit in (("saturation_pressure", "Pa"), ("boiling_temperature", "K"))
    ]
    plain = record_of([block()])
    record = replace(
        record_of(blocks, title="</title><script>alert(1)</script>\u202e" + "y" * 500),
        plan_name="<img src=x onerror=alert(1)>",
        plan_text='service = "</pre><script>x</script>"\n# \u202e\x1b]0;x\x07',
        constants={n: constants("<b>", n) for n in nasty_names},
        citations={n: n for n in nasty_names},
        models={n: {"source": n, "form": n} for n in nasty_names},
        conflicts=tuple((n, n, n) for n in nasty_names),
        left_out=tuple((n, n) for n in nasty_names),
        files=tuple((n, "0" * 64) for n in nasty_names),
        references=("\"'><script>x</script>",),
    )
    page = read_page(record)
    assert {node.tag for node in page.walk()} <= {node.tag for node in read_page(plain).walk()}
    assert len(page.all("script")) == 1
    assert page.one("head").one("title").text.startswith("</title><script>alert(1)</script>yyy")
    ids = [node.attributes["id"] for node in page.walk() if "id" in node.attributes]
    assert all(re.fullmatch(r"[a-zA-Z]+(-[a-z0-9]+)*", one) for one in ids)
    text = written(record).decode()
    assert not set(text) & set("\u202e\u202c\x1b\x07\0\r\t")
    assert max(len(word) for node in page.all("td") for word in node.text.split()) <= 1000
    shown = {cell.text for cell in page.all("td")}
    assert "=cmd|' /C calc'!A0" in shown
    assert "two lines of name" in shown
    assert "(no name)" in shown


def test_tables_that_are_cut_say_what_they_leave_out(referenced, read_page, monkeypatch):
    monkeypatch.setattr(data, "MOST_ROWS", 10)
    monkeypatch.setattr(data, "MOST_FIGURES", 2)
    monkeypatch.setattr(data, "MOST_FLUIDS", 1)
    monkeypatch.setattr(data, "MOST_CANDIDATES", 3)
    page = read_page(referenced)
    left = [p.text for p in page.all("p", class_="left")]
    assert "8 more rows are left out here; all are in summary.csv." in left  # 13 rows, five of them shown
    assert "2 more fluids are left out here; all are in points.csv." in left  # one picture a property
    assert "2 more fluids are left out here; all are in summary.csv." in left
    assert "2 more candidates are left out here; all are in summary.csv." in left
    assert len(table(page, "rows-0").rows()) == 5
    assert len(page.all("svg", class_="dev")) == 2


def test_many_candidates_are_shown_in_sheets(block, record_of, read_page, monkeypatch):
    monkeypatch.setattr(data, "COLUMNS", 4)
    names = [f"m{i}" for i in range(10)]
    page = read_page(record_of([block("alphane", names)]))
    sheets = page.all("table", class_="map")
    assert [len(sheet.all("th", class_="up")) for sheet in sheets] == [4, 4, 3]
    assert {th.text for sheet in sheets for th in sheet.all("th", class_="up")} == {*names, "PR-Twu91"}
    assert "candidates 5 to 8 of 11" in sheets[1].one("caption").text


def test_a_record_without_anything_still_makes_a_page(record_of, read_page):
    page = read_page(replace(record_of([]), summary=(), windows=(), plan_text="not [ toml"))
    assert "The record holds no property." in page.one("main").text
    assert not page.all("p", class_="service")


def test_noise_stays_small(block, record_of, written):
    """Noise cannot be thinned, so this is more than 20 fluids and 21 models ever take; 49 may take 5 MB."""
    models = [f"model {i}" for i in range(21)]
    blocks = [
        block(f"fluid {i}", models, 41, name, unit, seed=i)
        for i in range(20)
        for name, unit in (("saturation_pressure", "Pa"), ("liquid_density", "mol/m3"))
    ]
    text = written(record_of(blocks))
    assert len(text) < 2_000_000
    assert text.count(b'class="dev"') == 40


def test_the_page_of_the_broad_plan_stays_small(broad, written):
    """The target is 5 MB; tests/benchmarks/dossier.py measures how long it takes."""
    assert len(written(broad.record)) < 5_000_000


def static_faults(page):
    """List what the Web Content Accessibility Guidelines 2.2 ask for and a program can see."""
    faults = []
    ids = [node.attributes["id"] for node in page.walk() if "id" in node.attributes]
    faults += [f"id twice: {one}" for one in set(ids) if ids.count(one) > 1]
    for node in page.walk():
        named = node.attributes.get("aria-label") or node.attributes.get("aria-labelledby")
        if node.tag == "a" and node.attributes["href"][1:] not in ids:
            faults.append(f"no such anchor: {node.attributes['href']}")
        if node.attributes.get("aria-labelledby", "") not in ("", *ids):
            faults.append(f"no such label: {node.attributes['aria-labelledby']}")
        if node.tag == "svg" and not ("aria-hidden" in node.attributes or (node.attributes.get("role") and named)):
            faults.append("a picture without a name")
        if node.tag == "th" and node.attributes.get("scope") not in ("col", "row"):
            faults.append(f"th without scope: {node.text}")
        if node.tag == "table" and not node.all("caption")[0].text.strip():
            faults.append("a table without caption")
        if node.attributes.get("role") == "region" and not (named and node.attributes.get("tabindex") == "0"):
            faults.append("a region that scrolls without name or focus")
    labelled = {id(box) for label in page.all("label") if label.text.strip() for box in label.all("input")}
    faults += ["an input without label" for box in page.all("input") if id(box) not in labelled]
    levels = [int(node.tag[1]) for node in page.walk() if re.fullmatch("h[1-6]", node.tag)]
    faults += [f"h{a} before h{b}" for a, b in pairwise(levels) if b > a + 1]
    if levels.count(1) != 1:
        faults.append("not one h1")
    if page.one("html").attributes.get("lang") != "en":
        faults.append("no language")
    faults += [f"not one {tag}" for tag in ("main", "nav", "header", "head") if len(page.all(tag)) != 1]
    return faults


def test_the_page_is_accessible_as_far_as_a_program_can_see(referenced, plane_record, read_page):
    assert static_faults(read_page(referenced)) == []
    assert static_faults(read_page(plane_record)) == []


def test_a_fault_of_accessibility_is_seen(referenced, read_page):
    page = read_page(referenced)
    page.one("h1").tag = "h2"
    page.all("svg", class_="dev")[0].attributes.pop("aria-label")
    page.all("th")[0].attributes.pop("scope")
    page.all("a")[1].attributes["href"] = "#nowhere"
    assert len(static_faults(page)) == 4


def test_a_part_of_a_run_says_so(referenced, read_page):
    assert not read_page(referenced).all("p", class_="part")
    assert "This is part 2 of 5 of a run" in read_page(replace(referenced, part=(2, 5))).one("p", class_="part").text


def test_every_line_of_the_style_has_its_colour(referenced, read_page):
    style = read_page(referenced).one("style").text
    for i, colour in enumerate(colours.RAMP):
        assert f".s{i}{{background:{colour};color:{colours.on(colour)}}}" in style
    assert f".devs:has(.x4:checked) .c4{{stroke:{colours.stroke(4).colour}" in style

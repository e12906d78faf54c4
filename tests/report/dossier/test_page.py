"""What the page says is what the record holds."""

import base64
import hashlib
import re
from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest

from eosmuster.record import POINT_VERDICTS, WindowRow
from eosmuster.report import words
from eosmuster.report.dossier import colours, data, remarks
from eosmuster.report.views import overviews

SECTIONS = [
    *("answer", "rule", "maps", "deviations", "windows", "contested", "worst-points", "tables", "ilac", "not-done"),
    *("sources", "cautions", "sign-off"),
]


def table(page, anchor):
    return page.one("table", id=anchor)


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
        heading, *sentences = words.answer(referenced, view, 600)
        assert article.one("h3").text == heading
        said = [p.text for p in article.all("p")]
        assert said[: len(sentences)] == sentences


def test_the_best_candidates_are_counted_as_the_record_counts_them(referenced, read_page):
    page = read_page(referenced)
    for i, view in enumerate(overviews(referenced)):
        for cells, standing in zip(table(page, f"best-{i}").rows(), reversed(view.standings), strict=True):
            judged = len(view.fluids) - len(standing.fluids["unavailable"])
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
    assert "inside nowhere" in page.one("section", id="windows").all("svg", class_="bar")[-1].attributes["aria-label"]


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
    page = read_page(replace(referenced, conflicts=conflicts))
    assert table(page, "left-table").rows() == [list(referenced.left_out[0])]
    assert table(page, "unavailable-table").rows() == [
        ["PR-Twu91", "no Twu parameters for this component", "1", "alphane"]
    ]
    unsolved = sum(int((b.verdict == 4).sum()) for b in referenced.blocks)
    assert sum(int(row[3]) for row in table(page, "unsolved-table").rows()) == unsolved
    assert table(page, "contested-table").rows() == [["alphane", "saturation pressure", "x stands alone"]]
    constants = table(page, "constants-table").rows()
    assert constants[0][0] == "alphane"
    assert constants[0][3] == "375"
    assert constants[0][6] == "100"
    assert constants[0][-1] == "acentric factor replaced: invented"
    assert table(page, "citations-table").rows() == [["invented", "nobody, nowhere"]]
    assert [li.text for li in page.one("section", id="cautions").all("li")] == list(words.cautions(referenced))


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


def test_a_broad_record_stays_small(block, record_of, written):
    """Noise cannot be thinned, so this is more than a record of 49 fluids and 21 models ever takes."""
    models = [f"model {i}" for i in range(21)]
    blocks = [
        block(f"fluid {i}", models, 41, name, unit, seed=i)
        for i in range(49)
        for name, unit in (("saturation_pressure", "Pa"), ("liquid_density", "mol/m3"))
    ]
    text = written(record_of(blocks))
    assert len(text) < 5_000_000
    assert text.count(b'class="dev"') == 98


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

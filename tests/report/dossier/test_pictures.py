"""Pictures are read back: their coordinates are the numbers of the record."""

import re
from dataclasses import replace

import numpy as np
import pytest

from eosmuster.record import REGION_EDGES, WindowRow
from eosmuster.report.dossier import bars, figures, regions


def points(d):
    """Read a path back: relative lines (``M x y l dx dy ...``) or single points (``M x y h0``)."""
    found = []
    for part in d.split("M")[1:]:
        numbers = [int(n) for n in re.findall(r"-?\d+", part.replace("h0", ""))]
        x, y = numbers[:2]
        found.append((x, y))
        for dx, dy in zip(numbers[2::2], numbers[3::2], strict=True):
            x, y = x + dx, y + dy
            found.append((x, y))
    return np.array(found)


def lines(drawing):
    """Candidate -> ``d`` of its line."""
    return dict(re.findall(r'<path class="k [^"]*" d="([^"]*)"><title>([^<]*)', drawing))


@pytest.fixture
def smooth(block):
    one = block("alphane", ("PR", "SRK"), 30)
    tr = one.reduced_temperature
    deviation = np.vstack([4.0 * np.sin(9.0 * tr), 300.0 * (tr - 0.7)])
    verdict = np.zeros(deviation.shape, dtype=np.int8)
    verdict[1, 3] = 4
    return replace(one, deviation_pct=deviation, verdict=verdict, reference=np.full(30, 100.0))


def test_a_line_is_where_the_deviation_is(smooth):
    scale = figures.scale_of("saturation_pressure", [smooth])
    drawing = figures.deviations(smooth, [], {"PR": 0, "SRK": 1}, scale)
    found = {name: points(d) for d, name in lines(drawing).items()}
    for i, name in enumerate(smooth.candidates):
        x, y = found[name].T
        wanted_x = scale.x(smooth.reduced_temperature)
        wanted_y = scale.y(smooth.deviation_pct[i])
        assert np.abs(np.interp(wanted_x, x, y) - wanted_y).max() <= 2.5  # a pixel of thinning, one of rounding
    assert found["SRK"].T[1].max() <= figures.HEIGHT - 42  # what lies beyond the end is drawn at the end


def test_the_scale_is_signed_and_keeps_the_limits_apart():
    scale = figures.Scale(0.5, 1.0, 1.0, 50.0, "%")
    heights = scale.y(np.array([-1e9, -50.0, -1.0, 0.0, 1.0, 50.0, 1e9]))
    assert heights[0] == heights[1]
    assert heights[-1] == heights[-2]
    assert all(np.diff(heights[1:-1]) < -15.0)  # upwards is positive
    assert heights[3] - heights[4] == pytest.approx(heights[2] - heights[3])


def test_the_band_follows_a_limit_that_steps(smooth):
    scale = figures.scale_of("saturation_pressure", [smooth])
    drawing = figures.deviations(smooth, [], {}, scale)
    band = re.search(r'class="band" d="([^"]*)', drawing)[1]
    corners = [tuple(map(float, pair)) for pair in re.findall(r"(-?\d+) (-?\d+)", band)]
    tops = {y for _, y in corners}
    for limit in (1.0, 3.0):
        for side in (limit, -limit):
            assert min(abs(y - float(scale.y(np.array(side)))) for y in tops) <= 0.5
    step = float(scale.x(np.array(300.0 / 375.0)))
    assert min(abs(x - step) for x, _ in corners) <= 12.0  # half way between two states


def test_unsolved_points_are_crossed_at_their_temperature(smooth):
    scale = figures.scale_of("saturation_pressure", [smooth])
    drawing = figures.deviations(smooth, [], {}, scale)
    crosses = re.search(r'class="u" d="([^"]*)"><title>([^<]*)', drawing)
    assert crosses[2] == "SRK: unsolved"
    assert [int(x) + 4 for x in re.findall(r"M(-?\d+) ", crosses[1])] == pytest.approx(
        [float(scale.x(smooth.reduced_temperature[3]))], abs=1.0
    )


def test_other_references_are_drawn_only_at_the_same_state(smooth):
    same = replace(
        smooth, reference_source="handbook:x", reference=np.full(30, 102.0), pressure=smooth.pressure.copy()
    )
    moved = replace(same, reference_source="handbook:y", temperature=smooth.temperature + 0.01)
    scale = figures.scale_of("saturation_pressure", [smooth])
    drawing = figures.deviations(smooth, [same, moved], {}, scale)
    assert "handbook:y" not in drawing
    d = re.search(r'class="o" d="([^"]*)"><title>handbook:x', drawing)[1]
    found = points(d)
    assert len(found) == 30
    assert set(found[:, 1]) == {round(float(scale.y(np.array(2.0))))}


def test_temperatures_deviate_in_kelvin(block):
    one = block("alphane", ("PR",), 8, "boiling_temperature", "K")
    one = replace(one, reference=np.full(8, 200.0), limit_pct=np.full(8, 0.25), deviation_pct=np.full((1, 8), 0.25))
    scale = figures.scale_of("boiling_temperature", [one])
    assert (scale.unit, scale.linear) == ("K", 0.5)
    drawn = points(next(iter(lines(figures.deviations(one, [], {}, scale)))))
    assert set(drawn[:, 1]) == {round(float(scale.y(np.array(0.5))))}


def test_repeated_temperatures_are_points_not_a_zigzag(smooth):
    twice = replace(smooth, reduced_temperature=np.repeat(smooth.reduced_temperature[::2], 2))
    scale = figures.scale_of("saturation_pressure", [twice])
    assert all("h0" in d and "l" not in d for d in lines(figures.deviations(twice, [], {}, scale)))


def states(block, chosen):
    """Keep some states of a block."""
    kept = ("temperature", "pressure", "reduced_temperature", "reference", "reference_uncertainty_pct", "limit_pct")
    wide = ("predicted", "deviation_pct", "probability_inside", "verdict", "note")
    return replace(
        block,
        **{name: getattr(block, name)[chosen] for name in kept},
        **{name: getattr(block, name)[:, chosen] for name in wide},
    )


def test_a_state_alone_has_a_mark_for_every_candidate_a_tick_and_its_uncertainty(smooth):
    one = replace(states(smooth, [7]), reference_uncertainty_pct=np.array([0.4]))
    scale = figures.scale_of("saturation_pressure", [one])
    drawing = figures.deviations(one, [], {"PR": 0, "SRK": 1}, scale)
    marks = dict(re.findall(r'<path class="k c\d (dot|mark)" d="([^"]+)"', drawing))
    assert marks.keys() == {"dot", "mark"}  # the shape tells them apart, also in grey
    _, height = map(int, re.match(r"M(\d+) (\d+)h0", marks["dot"]).groups())
    assert height == round(float(scale.y(one.deviation_pct[0, 0])))
    middle = float(scale.x(one.reduced_temperature[0]))
    ticks = re.findall(r'<text x="(\d+)" y="\d+" class="m">([^<]*)', drawing)
    assert ticks == [(f"{middle:.0f}", f"{one.reduced_temperature[0]:.3g}")]
    top, foot = re.search(r'class="whisker" d="M\d+ (\d+)h8m-4 0V(\d+)', drawing).groups()
    assert [int(top), int(foot)] == [round(float(scale.y(np.array(u)))) for u in (0.4, -0.4)]


def test_measured_points_are_marked_and_a_state_without_neighbours_as_well(smooth):
    measured = replace(smooth, reference_source="measured:lab.csv")
    scale = figures.scale_of("saturation_pressure", [measured])
    assert "l" not in "".join(lines(figures.deviations(measured, [], {"PR": 0, "SRK": 3}, scale)))
    deviation = smooth.deviation_pct.copy()
    deviation[0, [10, 12]] = np.nan
    drawing = figures.deviations(replace(smooth, deviation_pct=deviation), [], {"PR": 0, "SRK": 1}, scale)
    alone = re.findall(r'<path class="k c0 dot" d="M(\d+) (\d+)h0">', drawing)
    wanted = scale.x(smooth.reduced_temperature[11]), scale.y(deviation[0, 11])
    assert alone == [tuple(f"{float(v):.0f}" for v in wanted)]


def test_the_limits_are_numbered_beside_the_axis(smooth):
    scale = figures.scale_of("saturation_pressure", [smooth])
    drawing = figures.deviations(smooth, [], {}, scale)
    numbered = {words: float(y) - 6 for y, words in re.findall(r'y="(\d+)" class="e lim">([^<]*)', drawing)}
    limits = sorted(set(smooth.limit_pct.tolist()))
    assert numbered.keys() == {f"{sign}{limit:g}" for limit in limits for sign in "+−"}
    for limit in limits:
        assert numbered[f"+{limit:g}"] == pytest.approx(float(scale.y(np.array(limit))), abs=0.5)
    heights = sorted(float(y) for y in re.findall(r'y="(\d+)" class="e(?: lim)?"', drawing))
    assert min(np.diff(heights)) >= 17.0  # the height of the type; positions are rounded


def test_a_bar_is_as_long_as_its_window():
    track = bars.Track(200.0, 400.0)
    window = WindowRow("a", "PR", "p", "r", 250.0, 300.0, "limit", "unsolved")
    drawing = bars.bar(track, (220.0, 390.0), [window], 1.0, "words")
    left, width = map(float, re.search(r'class="win" d="M([\d.]+) 5h([\d.]+)', drawing).groups())
    assert left == pytest.approx(track.x(250.0), abs=0.05)
    assert width == pytest.approx(track.x(300.0) - track.x(250.0), abs=0.1)
    assert drawing.count('class="stop"') == 1
    assert drawing.count('class="u"') == 1
    assert 'aria-label="words"' in drawing


def test_a_region_is_where_its_corners_are(plane_record, read_page):
    page = read_page(plane_record)
    pictures = page.all("svg", class_="reg")
    assert [svg.attributes["aria-label"].split(":")[0] for svg in pictures] == [
        *("PR, alphane", "SRK, alphane", "PR, betane", "SRK, betane"),
    ]  # fmt: skip
    region = plane_record.regions[0]
    # the axes hold the states and the corners: 230 K to 400 K, 1 bar to 100 bar
    axes = regions.plane(np.array([230.0, 400.0]) - 273.15, np.array([1.0, 100.0]))
    assert axes.logarithmic
    area = pictures[0].one("path", class_="area").attributes["d"]
    rings = [np.array(re.findall(r"(-?\d+) (-?\d+)", part), dtype=float) for part in area.split("M")[1:]]
    for ring, drawn in zip((region.outline, *region.holes), rings, strict=True):
        assert drawn[:, 0] == pytest.approx(axes.x(ring.temperature - 273.15), abs=0.51)
        assert drawn[:, 1] == pytest.approx(axes.y(ring.pressure / 1e5), abs=0.51)
    edges = {(p.attributes["class"], p.one("title").text) for p in pictures[0].all("path") if p.all("title")}
    reasons = {*region.outline.reasons, *region.holes[0].reasons}
    assert edges == {(f"g{REGION_EDGES.index(reason)}", reason.replace("_", " ")) for reason in reasons}


def test_states_and_regions_are_listed_beside_their_pictures(plane_record, read_page):
    page = read_page(plane_record)
    assert page.one("table", id="areas-0").rows() == [
        ["PR", "alphane", "coolprop", "liquid", "41 %", "2", "1", "-33.15 to 76.85", "1 to 60"]
    ]
    captions = [f.one("figcaption").text for f in page.one("section", id="regions").all("figure")]
    assert captions[0] == "PR 41 % of the plane, -33.15 to 76.85 degC, 1 to 60 bar; 1 smaller not drawn"
    assert captions[1] == "SRK inside nowhere"
    block = plane_record.blocks[0]
    picture = page.all("svg", class_="reg")[1]
    assert picture.one("path", class_="pi").attributes["d"].count("M") == int((block.verdict[1] == 0).sum())
    assert picture.one("path", class_="u").attributes["d"].count("M") == int((block.verdict[1] == 4).sum())


def test_no_region_covers_the_unit_of_the_pressure(plane_record, read_page):
    picture = read_page(plane_record).all("svg", class_="reg")[0]
    unit = next(text for text in picture.all("text") if text.text.startswith("p, "))
    heights = [float(y) for y in re.findall(r" (\d+)", picture.one("path", class_="area").attributes["d"])]
    axes = regions.plane(np.array([230.0, 400.0]), np.array([1.0, 100.0]))
    assert float(unit.attributes["y"]) < min([*heights, float(axes.y(np.array(100.0)))])


def test_a_plane_of_one_state_has_it_in_the_middle():
    axes = regions.plane(np.array([300.0]), np.array([20.0]))
    middle = float(axes.x(np.array(300.0))), float(axes.y(np.array(20.0)))
    assert middle == pytest.approx(((62 + 400) / 2, (28 + 294) / 2))


@pytest.mark.parametrize(("low", "high"), [(0.0, 1.0), (-45.0, 55.0), (1e5, 3e7), (3.0, 3.0), (0.45, 0.99)])
def test_ticks_are_few_and_inside(low, high):
    ticks = regions.nice_ticks(low, high)
    assert 1 <= len(ticks) <= 6
    assert all(low - 1e-9 <= tick <= high * (1 + 1e-9) for tick in ticks)

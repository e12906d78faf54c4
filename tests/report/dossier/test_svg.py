import re

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from eosmuster.report.dossier import svg


def corners(d):
    """Read a path of relative lines back: one list of points a line."""
    lines = []
    for part in d.split("M")[1:]:
        start, _, steps = part.partition("l")
        x, y = (int(n) for n in re.findall(r"-?\d+", start))
        points = [(x, y)]
        numbers = [int(n) for n in re.findall(r"-?\d+", steps)]
        for dx, dy in zip(numbers[::2], numbers[1::2], strict=True):
            x, y = x + dx, y + dy
            points.append((x, y))
        lines.append(points)
    return lines


@given(
    st.lists(st.one_of(st.none(), st.integers(-300, 300)), min_size=1, max_size=40),
    st.integers(1, 9),
    st.integers(1, 4),
)
def test_a_line_passes_every_point_closely(heights, step, slack):
    """No point is further from the drawn line than the slack, and gaps stay gaps."""
    x = np.arange(len(heights)) * float(step)
    y = np.array([np.nan if h is None else float(h) for h in heights])
    lines = corners(svg.path(x, y, slack))
    runs = "".join("0" if h is None else "1" for h in heights).split("0")
    assert len(lines) == sum(bool(run) for run in runs)
    for a, b in zip(x.tolist(), y.tolist(), strict=True):
        if np.isnan(b):
            continue
        line = next(points for points in lines if points[0][0] <= a <= points[-1][0])
        drawn = np.interp(a, [p[0] for p in line], [p[1] for p in line])
        assert abs(drawn - b) <= slack + 1e-9  # rounding of the interpolation


def test_a_straight_line_needs_two_points_and_repeated_places_keep_theirs():
    assert len(corners(svg.path(np.arange(50.0), 3.0 * np.arange(50.0)))[0]) == 2
    upright = corners(svg.path(np.array([5.0, 5.0, 5.0]), np.array([0.0, 90.0, 10.0])))[0]
    assert (5, 90) in upright
    assert upright[-1] == (5, 10)
    assert svg.path(np.array([np.nan]), np.array([1.0])) == ""


def test_dots_are_drawn_once_each():
    assert svg.dots(np.array([1.0, 1.2, np.nan]), np.array([2.0, 2.0, 2.0])) == "M1 2h0"


@pytest.mark.parametrize("text", ['"><script>x</script>', "a&b", "'", "\u202e<"])
def test_text_stays_text(text):
    drawn = svg.picture(10, 10, svg.name(text), [svg.text(1, 2, svg.name(text), "m")])
    assert "<script" not in drawn
    assert drawn.count("<") == drawn.count(">") == 4
    assert "\u202e" not in drawn


def test_a_foreign_script_is_isolated_in_an_attribute():
    assert svg.isolated("\u05d0 b") == "\u2068\u05d0 b\u2069"
    assert svg.isolated("plain") == "plain"

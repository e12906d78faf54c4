"""Contrast as the Web Content Accessibility Guidelines 2.2 ask for: 4.5 for text (1.4.3), 3 for lines (1.4.11)."""

from itertools import pairwise

import pytest

from eosmuster.report.dossier import colours


@pytest.mark.parametrize(
    ("one", "other", "expected"),
    # black on white is 21 by definition; #767676 on white is the guidelines' own border case of 4.54
    [("#000000", "#ffffff", 21.0), ("#767676", "#ffffff", 4.54), ("#ffffff", "#ffffff", 1.0)],
)
def test_contrast_is_that_of_the_guidelines(one, other, expected):
    assert colours.contrast(one, other) == pytest.approx(expected, abs=0.005)


@pytest.mark.parametrize("back", colours.RAMP)
def test_figures_in_the_map_can_be_read(back):
    assert colours.contrast(colours.on(back), back) >= 4.5


@pytest.mark.parametrize("text", [colours.INK, colours.MUTED, colours.ACCENT, colours.FAILURE, colours.ABSENT])
def test_text_can_be_read(text):
    assert colours.contrast(text, colours.PAPER) >= 4.5


def test_a_share_reads_the_same_in_grey():
    lightness = [colours.luminance(colour) for colour in colours.RAMP]
    assert all(a > 1.2 * b for a, b in pairwise(lightness))


@pytest.mark.parametrize("line", [*colours.LINES, colours.FAILURE])
def test_lines_stand_out_from_paper_and_from_the_band(line):
    assert colours.contrast(line, colours.PAPER) >= 3.0
    assert colours.contrast(line, colours.BAND) >= 3.0


def test_failures_look_like_nothing_else():
    others = {*colours.RAMP, *colours.LINES, colours.INK, colours.PAPER, colours.MUTED, colours.ACCENT}
    assert not {colours.FAILURE, colours.ABSENT} & others
    assert colours.FAILURE != colours.ABSENT


def test_all_candidates_of_the_catalogue_are_told_apart():
    strokes = [colours.stroke(i) for i in range(21)]
    assert len(set(strokes)) == 21
    for one, following in pairwise(strokes):
        assert one.colour != following.colour
        assert one.dash != following.dash

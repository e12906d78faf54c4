from __future__ import annotations

import unicodedata
from collections.abc import Callable

import pytest

from eosmuster.drifting.changes import CAUSES
from eosmuster.drifting.comparing import Drift
from eosmuster.drifting.text import drift_text, headline
from eosmuster.report.text import cells_of

Invented = Callable[..., Drift]


@pytest.mark.parametrize("width", [100, 80, 60])
@pytest.mark.parametrize("rows", [0, 1, 4, 2000])
def test_no_line_is_wider_than_the_terminal_and_none_steers_it(invented: Invented, rows: int, width: int) -> None:
    text = drift_text(invented(rows), width)
    assert all(cells_of(line) <= width for line in text.split("\n"))
    assert not [c for c in text if c != "\n" and unicodedata.category(c) in ("Cc", "Cf", "Zl", "Zp")]
    assert len(text.split("\n")) < 150


def test_the_answer_comes_first(invented: Invented) -> None:
    lines = drift_text(invented(40)).split("\n")
    assert lines[0] == "drift: 10 verdicts flipped, 10 vanished, 10 appeared, 10 moved; 3 rows unchanged"
    assert lines[1].startswith("causes: coverage ")
    assert any(line.startswith("worst: ") for line in lines[2:6])
    assert "inside -> outside" in "\n".join(lines[:8])


def test_one_of_each(invented: Invented) -> None:
    assert headline(invented(1)) == "drift: 1 verdict flipped; 3 rows unchanged"
    assert headline(invented(0)) == "no drift: 3 rows unchanged"


def test_every_cause_is_explained_once(invented: Invented) -> None:
    text = drift_text(invented(60))
    for cause, meaning in CAUSES.items():
        assert f"{cause} " in text
        assert meaning[:40] in text


def test_rows_that_are_left_out_are_counted(invented: Invented) -> None:
    text = drift_text(invented(400))
    assert "verdict flipped: 100 rows" in text
    assert "85 more rows; --csv FILE or --markdown FILE has them" in text


def test_what_moves_no_number_is_only_named(invented: Invented) -> None:
    assert "moving no number: constants of cut, no. 7" in drift_text(invented(1))
    assert "without effect on any row" in drift_text(invented(0))
    assert "without effect" not in drift_text(invented(1))


def test_at_a_hundred_columns_no_header_is_cut(invented: Invented) -> None:
    lines = drift_text(invented(40), 100).split("\n")
    rules = [i for i, line in enumerate(lines) if line.startswith("---")]
    assert rules
    assert not [line for i in rules for line in lines[max(i - 2, 0) : i] if "…" in line]

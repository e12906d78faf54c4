"""The progress bar: on a terminal, after two seconds, and gone without a trace."""

from __future__ import annotations

import io
import re
from collections.abc import Iterator

import pytest

from eosmuster import progress
from eosmuster.progress import PATIENCE, Bar


class Terminal(io.StringIO):
    def isatty(self) -> bool:
        return True


@pytest.fixture
def clock(monkeypatch: pytest.MonkeyPatch) -> Iterator[list[float]]:
    now = [100.0]
    monkeypatch.setattr(progress.time, "monotonic", lambda: now[0])
    return now


def test_quick_work_shows_nothing(clock: list[float]) -> None:
    terminal = Terminal()
    with Bar(terminal) as bar:
        for i in range(10):
            clock[0] += PATIENCE / 11
            bar("verdicts", i, 10)
    assert terminal.getvalue() == ""


def test_long_work_is_shown_after_two_seconds_and_wiped_at_the_end(clock: list[float]) -> None:
    terminal = Terminal()
    with Bar(terminal) as bar:
        clock[0] += 1.9
        bar("references", 1, 4)
        assert terminal.getvalue() == ""
        clock[0] += 0.2
        bar("references", 2, 4)
        assert terminal.getvalue() == f"\rreferences   [{'#' * 15}{'.' * 15}]    2 s"
    shown = terminal.getvalue()
    visible = shown.rstrip("\r").rpartition("\r")[2]
    assert visible.strip() == ""
    assert len(visible) >= len("references   [] 1234 s") + 30
    assert shown.endswith("\r")
    assert "\n" not in shown


def test_it_is_drawn_at_most_ten_times_a_second(clock: list[float]) -> None:
    terminal = Terminal()
    with Bar(terminal) as bar:
        clock[0] += 3.0
        for i in range(100):
            clock[0] += 0.01
            bar("verdicts", i, 100)
    assert 8 <= terminal.getvalue().count("verdicts") <= 11


@pytest.mark.parametrize(("done", "of", "filled"), [(0, 10, 0), (5, 10, 15), (10, 10, 30), (0, 0, 0)])
def test_the_bar_is_as_full_as_the_work_is_done(clock: list[float], done: int, of: int, filled: int) -> None:
    terminal = Terminal()
    bar = Bar(terminal)
    clock[0] += 5.0
    bar("windows", done, of)
    match = re.search(r"\[(#*)(\.*)\]", terminal.getvalue())
    assert match
    assert (len(match[1]), len(match[2])) == (filled, 30 - filled)


def test_what_is_no_terminal_gets_nothing(clock: list[float]) -> None:
    stream = io.StringIO()
    with Bar(stream) as bar:
        clock[0] += 60.0
        bar("references", 1, 2)
    assert stream.getvalue() == ""


def test_it_is_wiped_when_the_work_fails(clock: list[float]) -> None:
    terminal = Terminal()

    def work() -> None:
        with Bar(terminal) as bar:
            clock[0] += 3.0
            bar("references", 1, 2)
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        work()
    assert terminal.getvalue().endswith("\r")
    assert terminal.getvalue().rstrip("\r").rpartition("\r")[2].strip() == ""

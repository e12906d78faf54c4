"""The pytest plugin: a file ``*.eos.toml`` is a plan, and what its gate asks becomes test items.

One item a component, candidate and property, judged against every reference that the gate asks. It is loaded into
every test run of its environment, so nothing is imported, and nothing happens, until there is such a file.
"""

from __future__ import annotations

import re
import traceback
from collections.abc import Iterable, Iterator, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any, NamedTuple

import pytest

from eosmuster.errors import EosmusterError

if TYPE_CHECKING:
    from eosmuster.plan.schema import Plan
    from eosmuster.record import Record
    from eosmuster.report.failing import FailingRows
    from eosmuster.sweeping.gate import Counted, Key

SUFFIX = ".eos.toml"

_LONGEST = 60
_MOST_REFERENCES = 10
_NO_KEYWORD = re.compile(r"[^\w+.\-]")


def pytest_collect_file(file_path: Path, parent: pytest.Collector) -> pytest.File | None:
    """Collect plans, and no other file."""
    if file_path.name.endswith(SUFFIX) and file_path.name != SUFFIX:
        return PlanFile.from_parent(parent, path=file_path)
    return None


class Outcome(NamedTuple):
    """What becomes of an item: ``passed``, ``failed`` or ``skipped``, and why."""

    kind: str
    text: str = ""


class PlanFile(pytest.File):
    """A plan. It is read when it is collected, and swept once, before the first of its items runs."""

    _plan: Plan
    _outcomes: Mapping[Key, Outcome] | None = None
    _failure = ""

    def collect(self) -> Iterator[PlanItem]:
        """Read the plan and list the items, unswept; a bad plan is a collection error of one sentence."""
        from eosmuster.plan.reading import load_plan
        from eosmuster.sweeping.gate import asked

        try:
            self._plan = load_plan(self.path)
        except EosmusterError as error:
            raise self.CollectError(str(error)) from None
        keys = asked(self._plan)
        for key, name in zip(keys, item_names(keys), strict=True):
            yield PlanItem.from_parent(self, name=name, key=key)

    def sweep(self, asking: PlanItem) -> None:
        """Sweep the plan, unless that was done; what goes wrong is an error of every item, and is not tried again."""
        if self._outcomes is None and not self._failure:
            try:
                self._outcomes = outcomes(self._plan)
            except EosmusterError as error:
                self._failure = str(error)
            except Exception as error:
                self._failure = f"internal failure: {type(error).__name__}: {error}"
                asking.add_report_section("setup", "traceback", traceback.format_exc())
        if self._failure:
            pytest.fail(self._failure, pytrace=False)

    def outcome(self, key: Key) -> Outcome:
        """Say what became of an item."""
        assert self._outcomes is not None, "pytest sets an item up before it runs it"
        return self._outcomes[key]


class PlanItem(pytest.Item):
    """One component, candidate and property of a plan."""

    def __init__(self, name: str, parent: PlanFile, key: Key, **given_by_pytest: Any) -> None:
        super().__init__(name, parent, **given_by_pytest)
        self.key = key
        self._file = parent
        # names between colons, so that -k can pick PR without PR78, PRSV and every pressure
        self.extra_keyword_matches.update(f":{_NO_KEYWORD.sub('_', name)}:" for name in key)

    def setup(self) -> None:
        """See to it that the plan was swept: the first item of a file that runs waits for it."""
        self._file.sweep(self)

    def runtest(self) -> None:
        """Pass, skip or fail as the sweep has it."""
        kind, text = self._file.outcome(self.key)
        if kind == "failed":
            pytest.fail(text, pytrace=False)
        if kind == "skipped":
            pytest.skip(text)

    def repr_failure(self, excinfo: pytest.ExceptionInfo[BaseException], *styles: Any) -> Any:
        """Show a failure whole in its place, and by its first line where pytest lists it: CI runs trim nothing."""
        shown = super().repr_failure(excinfo, *styles)
        crash = getattr(shown, "reprcrash", None)
        if crash is not None:
            crash.message = crash.message.partition("\n")[0]
        return shown

    def reportinfo(self) -> tuple[Path, None, str]:
        """Give the heading of a failure."""
        return self.path, None, self.name


def item_names(keys: Iterable[Key]) -> Iterator[str]:
    """Name items readably, on one line, each differently, and so that a node id can be typed and is split right.

    Examples
    --------
    >>> from eosmuster.sweeping.gate import Key
    >>> list(item_names([Key("a::b", "PR[2]", "density"), Key("a:b", "PR(2)", "density")]))
    ['a:b | PR(2) | density', 'a:b | PR(2) | density #2']
    """
    taken: set[str] = set()
    for key in keys:
        plain = " | ".join(map(_plain, key))
        name, number = plain, 1
        while name in taken:
            number += 1
            name = f"{plain} #{number}"
        taken.add(name)
        yield name


def _plain(name: str) -> str:
    from eosmuster.report.text import one_line, shortened

    text = re.sub("::+", ":", one_line(name)).replace("[", "(").replace("]", ")")
    return shortened(text, _LONGEST)


def outcomes(plan: Plan) -> dict[Key, Outcome]:
    """Run a plan and say what becomes of each of its items; of the run itself nothing is kept.

    Raises
    ------
    EosmusterError : what the command line would end with, save that nothing could be judged
    """
    from eosmuster.errors import NothingJudged
    from eosmuster.report.failing import FailingRows
    from eosmuster.sweeping.gate import answers, asked
    from eosmuster.sweeping.run import run

    try:
        record = run(plan)
    except NothingJudged as error:
        return dict.fromkeys(asked(plan), Outcome("failed", str(error)))
    failing = FailingRows(record, plan.gate.fail_on)
    return {key: _outcome(key, rows, record, failing, plan) for key, rows in answers(record, plan).items()}


def _outcome(key: Key, rows: list[Counted], record: Record, failing: FailingRows, plan: Plan) -> Outcome:
    bad = [one for one in rows if one.failing(plan.gate.fail_on)]
    if bad:
        return Outcome("failed", _failure(key, bad, rows, failing))
    unavailable = [one.row.note for one in rows if one.row.verdict == "unavailable"]
    if unavailable:
        why = unavailable[0] or "no reason given"
        return Outcome("skipped", f"{key.candidate} is unavailable for {key.component}: {why}")
    if not any(one.judged for one in rows):
        return Outcome("failed", _nothing(key, rows, record))
    return Outcome("passed")


def _failure(key: Key, bad: list[Counted], rows: list[Counted], failing: FailingRows) -> str:
    """Write why an item fails: the worst in the first line, since a summary shows no more, then everything."""
    from eosmuster.report.text import list_within
    from eosmuster.sweeping.gate import worst_first

    first, *others = (one.row for one in worst_first(bad, failing.blocks))
    if first.verdict == "unavailable":
        return failing.line(first)
    against = f"{first.reference_source} and {len(others)} more" if others else first.reference_source
    lines = [f"{failing.count(first)} against {against}{failing.worst(first)}", "", " | ".join(key)]
    lines += [failing.paragraph(row) for row in (first, *others)[:_MOST_REFERENCES]]
    if len(others) >= _MOST_REFERENCES:
        lines.append(f"{len(others) + 1 - _MOST_REFERENCES} more references: see summary.csv of `eosmuster sweep`")
    met = [one.row.reference_source for one in rows if one not in bad and one.judged]
    return "\n".join([*lines, *([f"the gate is met against: {list_within(met, 76)}"] if met else [])])


def _nothing(key: Key, rows: list[Counted], record: Record) -> str:
    """Say that nothing was judged, and what the run says about it."""
    unsolved = sum(one.counts["unsolved"] for one in rows)
    if unsolved:
        return f"nothing was judged: {key.candidate} has no value at {unsolved} points where a reference has one"
    asked = f" ({', '.join(one.row.reference_source for one in rows)})" if rows else ""
    sentence = f"nothing was judged: no reference{asked} has a value of {key.property} for {key.component}"
    why = [reason for what, reason in record.left_out if what == key.component]
    return "; ".join([f"{sentence} at any state of the plan", *dict.fromkeys(why)])

"""The answer in sentences: what is cut is counted, what says nothing is left out."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from eosmuster.record import Region, Ring
from eosmuster.report.answer import answer
from eosmuster.report.views import overviews


def record_with(record_of, block, verdicts, **changes):
    """Give a record of fluid -> one verdict a candidate, the same at every state."""
    models = tuple(f"m{i}" for i in range(len(next(iter(verdicts.values())))))
    blocks = [
        replace(block(fluid, models, 3), verdict=np.repeat(np.array([of], np.int8).T, 3, axis=1))
        for fluid, of in verdicts.items()
    ]
    record = record_of(blocks)
    return replace(record, summary=record.summary[:-1], windows=(), **changes)


def sentences(record, width=100):
    [view] = overviews(record)
    return answer(record, view, width)[1:]


def test_candidates_that_are_not_named_are_counted(block, record_of):
    record = record_with(record_of, block, {"a": [0] * 9, "b": [1] * 9})
    held, *_ = sentences(record)
    assert held.endswith(" 1 and 4 more with 1")
    assert held.count(" 1, ") == 4
    fewer = record_with(record_of, block, {"a": [0] * 7, "b": [0, 0, 0, 0, 0, 1, 1], "c": [1] * 7})
    assert sentences(fewer)[0].endswith(" 2 and 2 more with fewer")
    assert all(len(line) <= 50 for line in sentences(record, 50))
    assert " more with 1" in sentences(record, 50)[0]


@pytest.mark.parametrize(
    ("fluids", "all_of", "none_of"),
    [(1, "1 fluid", "it"), (2, "both fluids", "it for either fluid"), (3, "all 3 fluids", "it for any of 3 fluids")],
)
def test_all_and_none_are_said_as_people_say_it(block, record_of, fluids, all_of, none_of):
    names = ("a", "b", "c")[:fluids]
    assert sentences(record_with(record_of, block, {name: [0] for name in names})) == [f"holds for {all_of}: m0"]
    [none] = sentences(record_with(record_of, block, {name: [1] for name in names}))
    assert none == f"no candidate holds {none_of}; nearest: m0, 0 % of its points inside"


def test_a_line_of_nothing_but_nowhere_is_left_out(block, record_of):
    record = record_with(record_of, block, {"a": [0, 0], "b": [1, 1], "c": [1, 1]})
    assert sentences(record)[1:] == ["held by no candidate, 2 fluids: b, c"]


def test_a_region_is_said_to_be_a_part_of_the_plane(block, record_of):
    ring = Ring(np.array([253.15, 393.15, 393.15]), np.array([1.2e5, 1.2e5, 2e6]), ("limit",) * 3)
    region = Region("b", "m0", "density", "coolprop", "vapor", ring, (), 0.8)
    record = record_with(record_of, block, {"a": [0], "b": [1]}, regions=(region,))
    blocks = tuple(replace(b, property="density") for b in record.blocks)
    rows = tuple(replace(row, property="density") for row in record.summary)
    said = sentences(replace(record, blocks=blocks, summary=rows))
    assert said[1] == "where m0 is inside: b 80 % of the plane, -20 to 120 degC, 1.2 to 20 bar"

import re
from dataclasses import fields, replace

import pytest

from eosmuster.errors import InputError
from eosmuster.plan import builtin
from eosmuster.plan.parts import MOST_PARTS, part_line, plan_part, read_part


@pytest.fixture(scope="module")
def plan():
    return builtin.load("lpg-storage")


@pytest.mark.parametrize("of", [1, 2, 3, 4, 5, 6, 7, 100])
def test_every_component_is_in_one_part_and_the_parts_are_alike_in_size(plan, of):
    parts = [plan_part(plan, number, of).rows for number in range(1, of + 1)]
    assert sorted(row for rows in parts for row in rows) == list(range(len(plan.components)))
    assert max(map(len, parts)) - min(map(len, parts)) <= 1
    assert all(list(rows) == sorted(rows) for rows in parts)
    assert [len(rows) for rows in parts] == sorted(map(len, parts), reverse=True)


def test_a_part_differs_from_its_plan_in_what_it_is_called_and_sweeps(plan):
    part = plan_part(plan, 2, 4)
    assert part.title == f"{plan.title} (part 2 of 4)"
    assert replace(part, title=plan.title, part=None) == plan
    assert [field.name for field in fields(plan) if getattr(plan, field.name) != getattr(part, field.name)] == [
        "title",
        "part",
    ]


def test_a_whole_plan_sweeps_all_its_components(plan):
    assert list(plan.rows) == list(range(len(plan.components)))


@pytest.mark.parametrize(("number", "of"), [(0, 1), (2, 1), (-1, 3), (1, 0)])
def test_there_is_no_such_part(plan, number, of):
    with pytest.raises(ValueError, match="there is no part"):
        plan_part(plan, number, of)


def test_what_a_part_has_to_do_is_said(plan):
    assert part_line(plan_part(plan, 1, 4)).startswith("part 1 of 4: 2 of the 6 components of lpg-storage; ")
    assert "none of the 6 components of lpg-storage: nothing to do" in part_line(plan_part(plan, 7, 7))


@pytest.mark.parametrize(("text", "part"), [("1/1", (1, 1)), ("2/8", (2, 8)), (f"3/{MOST_PARTS}", (3, MOST_PARTS))])
def test_parts_are_read(text, part):
    assert read_part(text, "--part") == part


@pytest.mark.parametrize(
    "text", ["", "2", "2/", "/8", "0/8", "9/8", "-1/8", "1/0", "1/1001", "2 / 8", "2/8\n", "a/b", "²/8", "1" * 5000]
)
def test_anything_else_is_refused(text):
    with pytest.raises(InputError, match=re.escape("is no part; write K/N, K from 1 to N")) as caught:
        read_part(text, "--part")
    assert "\n" not in str(caught.value)

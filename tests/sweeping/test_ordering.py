from dataclasses import fields, replace

import numpy as np

from eosmuster.plan import builtin
from eosmuster.record import Record, Region, Ring
from eosmuster.sweeping.ordering import by_component, in_order
from eosmuster.sweeping.run import run


def test_a_run_is_in_order_and_any_mixture_of_its_components_comes_back():
    plan = builtin.load("ammonia-refrigeration")
    record = run(plan)
    names = [component.name for component in plan.components]
    assert by_component(record, names) == record
    backwards = by_component(record, names[::-1])  # what is unavailable is so for the first component now
    assert {row.component for row in record.summary if row.verdict == "unavailable"} == {names[-1]}
    for one in (record, backwards):
        unavailable = [row.verdict == "unavailable" for row in one.summary]
        assert unavailable == sorted(unavailable)

    def mixed(items, name_of):
        return tuple(in_order(items, names[::-1], name_of))

    other = replace(
        record,
        blocks=mixed(record.blocks, lambda block: block.component),
        summary=mixed(record.summary, lambda row: row.component),
        windows=mixed(record.windows, lambda row: row.component),
        left_out=mixed(record.left_out, lambda left: left[0]),
        conflicts=mixed(record.conflicts, lambda conflict: conflict[0]),
    )
    assert other.blocks != record.blocks
    again = by_component(other, names)
    for field in fields(Record):
        assert getattr(again, field.name) == getattr(record, field.name), field.name


def test_regions_are_in_order_too():
    ring = Ring(np.zeros(3), np.zeros(3), ("limit",) * 3)
    regions = tuple(Region(name, "PR", "density", "coolprop", "vapor", ring) for name in ("c", "a", "b", "a"))
    record = by_component(Record("x", "x", "", (), (), (), regions=regions), ["a", "b", "c"])
    assert [region.component for region in record.regions] == ["a", "a", "b", "c"]


def test_the_order_of_everything_else_stays():
    items = [("b", 1), ("", 2), ("a", 3), ("b", 4), ("other", 5), ("a", 6)]
    found = in_order(items, ["a", "b"], lambda item: item[0])
    assert found == [("", 2), ("other", 5), ("a", 3), ("a", 6), ("b", 1), ("b", 4)]

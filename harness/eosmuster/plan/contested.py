"""From which disagreement on references contest each other: what a plan says instead of the defaults."""

from __future__ import annotations

import math

from eosmuster.errors import InputError
from eosmuster.plan.tables import Table
from eosmuster.quantities import CONTESTED_ABOVE, shown, split_quantity

KEY = "contested_above"


def read_contested_above(references: Table) -> dict[str, float]:
    """Read from which disagreement, in %, on a fluid is contested: one percentage for all properties, or by property.

    Raises
    ------
    InputError : a property that is not compared, or anything but a percentage above 0

    Examples
    --------
    >>> read_contested_above(Table({KEY: {"liquid_density": "2 %"}}, "x", "references"))["liquid_density"]
    2.0
    >>> sorted(set(read_contested_above(Table({KEY: "5 %"}, "x", "references")).values()))
    [5.0]
    """
    given = references.data.get(KEY, {})
    if not isinstance(given, dict):
        return dict.fromkeys(CONTESTED_ABOVE, _percent(given, references.at(KEY)))
    table = references.table(KEY)
    table.check_keys(CONTESTED_ABOVE)
    return {**CONTESTED_ABOVE, **{name: _percent(value, table.at(name)) for name, value in table.data.items()}}


def _percent(value: object, where: str) -> float:
    example = 'write a percentage, e.g. "2 %"'
    number, unit = split_quantity(value, ("fraction",), where)
    if unit != "%":
        raise InputError(f"{where}: {shown(value)} has no percent sign; {example}")
    if not 0.0 < number < math.inf:
        raise InputError(f"{where}: {shown(value)} is not above 0 and finite; {example}")
    return number

"""The tables ``[tolerance]`` and ``[[tolerance.exception]]`` of a plan, read into rules."""

from __future__ import annotations

import math

from eosmuster.errors import InputError
from eosmuster.plan.schema import Limit, ToleranceRule
from eosmuster.plan.tables import Finder, Table
from eosmuster.quantities import PROPERTIES, UNITS, shown, split_quantity

_EXCEPTION_KEYS = (
    "property",
    "class",
    "component",
    "above_reduced_temperature",
    "below_reduced_temperature",
    "limit",
    "rationale",
)

# dimension of a property -> dimension a limit may be written in -> kind of that limit
_KINDS = {
    "pressure": {"fraction": "percent", "pressure": "pascal", "logarithm": "logarithm"},
    "temperature": {"fraction": "percent", "temperature_difference": "kelvin"},
    "density": {"fraction": "percent", "density": "mol/m3", "mass_density": "kg/m3"},
    "energy": {"fraction": "percent", "energy": "J/mol"},
    "entropy": {"fraction": "percent", "entropy": "J/(mol K)"},
    "speed": {"fraction": "percent", "speed": "m/s"},
    "throttling": {"fraction": "percent", "throttling": "K/Pa"},
    "ratio": {"fraction": "percent", "ratio": "one"},
}


def read_rules(plan: Table, find_component: Finder, find_family: Finder) -> tuple[ToleranceRule, ...]:
    """Read a plan's own rules, in the order in which later ones win.

    Parameters
    ----------
    find_component : (name as written, where) -> the component's own name, or InputError
    find_family : the same for a chemical class

    Raises
    ------
    InputError : unknown key, property, class or unit, a limit that is not positive, an exception to nothing
    """
    table = plan.table("tolerance")
    table.check_keys((*PROPERTIES, "exception"))
    rules = [
        ToleranceRule(key, read_limit(value, key, table.at(key)), "property", rationale="stated by the plan")
        for key, value in table.data.items()
        if key != "exception"
    ]
    for exception in table.tables("exception"):
        rules.extend(_read_exception(exception, find_component, find_family))
    return tuple(rules)


def read_limit(value: object, property_name: str, where: str) -> Limit:
    """Read a limit with its unit.

    Examples
    --------
    >>> read_limit("2 %", "liquid_density", "example")
    Limit(value=2.0, kind='percent')
    >>> read_limit("500 mbar", "saturation_pressure", "example")
    Limit(value=50000.0, kind='pascal')
    >>> read_limit("2 % of ln", "saturation_pressure", "example")
    Limit(value=2.0, kind='logarithm')
    >>> read_limit(0.02, "compressibility_factor", "example")
    Limit(value=0.02, kind='one')
    """
    kinds = _KINDS[PROPERTIES[property_name].dimension]
    number, unit = split_quantity(value, tuple(kinds), where)
    example = 'write it with its unit, e.g. "2 %"'
    if not unit and "ratio" not in kinds:
        raise InputError(f"{where}: the limit {shown(value)} has no unit; {example}")
    unit = unit or "1"
    if not 0.0 < number < math.inf:
        raise InputError(f"{where}: the limit {shown(value)} is not above 0 and finite; {example}")
    dimension = next(d for d in kinds if unit in UNITS[d])
    # percent stays percent: 7 % by way of 0.07 would be 7.000000000000001 %
    percent = dimension in {"fraction", "logarithm"}
    factor = UNITS[dimension][unit][0] / (0.01 if percent else 1.0)
    written = " ".join(value.split()) if isinstance(value, str) else ""
    return Limit(number * factor, kinds[dimension], written)


def _read_exception(table: Table, find_component: Finder, find_family: Finder) -> list[ToleranceRule]:
    table.check_keys(_EXCEPTION_KEYS)
    name = table.known(table.text("property"), "property", PROPERTIES)
    limit = read_limit(table.data.get("limit"), name, table.at("limit"))
    above, below = _read_range(table, PROPERTIES[name].kind)
    classes = [find_family(text, table.at("class")) for text in table.texts("class")]
    components = [find_component(text, table.at("component")) for text in table.texts("component")]
    level = _level(table, bool(classes), bool(components), (above, below) != (0.0, math.inf))
    why = table.text("rationale", "") or "stated by the plan"
    return [
        ToleranceRule(name, limit, level, family, component, above, below, why)
        for family in classes or [""]
        for component in components or [""]
    ]


def _level(table: Table, of_class: bool, of_component: bool, ranged: bool) -> str:
    if of_class and of_component:
        raise InputError(f"{table.at()}: names a class and a component; give one of them")
    if not (of_class or of_component or ranged):
        raise InputError(
            f"{table.at()}: an exception to nothing; give a class, a component, above_reduced_temperature "
            "or below_reduced_temperature, or state the limit in [tolerance]"
        )
    base = "component" if of_component else "class" if of_class else "property"
    return f"{base}_range" if ranged else base


def _read_range(table: Table, kind: str) -> tuple[float, float]:
    """Read a band of reduced temperature; a saturated state has none above 1, a single phase has them all."""
    to = 1.0 if kind == "saturation" else math.inf
    above = _read_border(table, "above_reduced_temperature", 0.0, to)
    below = _read_border(table, "below_reduced_temperature", math.inf, to)
    if not above < below:
        raise InputError(
            f"{table.at()}: above_reduced_temperature = {above:g} is not below "
            f"below_reduced_temperature = {below:g}; the range must ascend"
        )
    return above, below


def _read_border(table: Table, key: str, default: float, to: float) -> float:
    return table.number(key, above=0.0, to=to) if key in table.data else default

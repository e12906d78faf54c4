"""The table ``[states]`` of a plan: one coordinate of the saturated states, two of single-phase states.

The phase rule decides how many: a pure substance has two degrees of freedom, less one for a second phase.
"""

from __future__ import annotations

import math
from dataclasses import replace
from itertools import pairwise

import numpy as np

from eosmuster.errors import InputError
from eosmuster.models.records import SUPERCRITICAL_RULES
from eosmuster.plan.grids import COORDINATES, Grid, SinglePhaseGrid
from eosmuster.plan.schema import Plan
from eosmuster.plan.tables import Table
from eosmuster.quantities import PHASES, PROPERTIES, SATURATION, SINGLE_PHASE, shown, to_si

MOST_STATES = 100_000
"""States of one component in one plan."""

_YES_OR_NO = ("yes", "no")
_ONE_OF = f"give exactly one of {', '.join(COORDINATES)}"
_UNITS = {"temperature": "K", "pressure": "Pa"}


def read_states(plan: Table) -> tuple[Grid | None, SinglePhaseGrid | None]:
    """Read the saturated and the single-phase states; without a table ``[states]`` the former are the default ones.

    Returns
    -------
    each None where the plan has none of its kind

    Raises
    ------
    InputError : none or several coordinates, values out of range, given twice, or too many
    """
    if "states" not in plan.data:
        return Grid(), None
    states = plan.table("states")
    states.check_keys((*COORDINATES, "single_phase"))
    single_phase = _read_single_phase(states.table("single_phase")) if "single_phase" in states.data else None
    given = [c for c in COORDINATES if c in states.data]
    if single_phase is not None and not given:
        return None, single_phase
    if len(given) != 1:
        raise InputError(f"{states.at()}: {_phase_rule(given)}, so {_ONE_OF}")
    return _read_coordinate(states, given[0]), single_phase


def choose_regions(plan: Plan, asked: bool) -> Plan:
    """Say whether regions are looked for, whatever the plan itself says; nothing without single-phase states."""
    grid = plan.single_phase
    return plan if grid is None else replace(plan, single_phase=replace(grid, regions=asked))


def check_states(properties: tuple[str, ...], saturated: bool, single_phase: bool, where: str) -> None:
    """Refuse properties without states of their kind, and states of a kind that no property asks for.

    Raises
    ------
    InputError : naming the phase rule and what to add
    """
    kinds = {PROPERTIES[name].kind for name in properties}
    if "single-phase" in kinds and not single_phase:
        name = next(n for n in properties if n in SINGLE_PHASE)
        raise InputError(
            f"{where}: {name} belongs to single-phase states, which have two degrees of freedom (phase rule); "
            "give them in [states.single_phase] as temperature and pressure"
        )
    if "saturation" in kinds and not saturated:
        name = next(n for n in properties if n in SATURATION)
        raise InputError(
            f"{where}: {name} belongs to saturated states, which have one degree of freedom (phase rule); "
            f"add one of {', '.join(COORDINATES)} to [states]"
        )
    if single_phase and "single-phase" not in kinds:
        raise InputError(
            f"{where}: [states.single_phase] has no property to judge; name some out of {', '.join(SINGLE_PHASE)}"
        )


def _read_single_phase(table: Table) -> SinglePhaseGrid:
    table.check_keys(("temperature", "pressure", "phase", "supercritical_alpha", "regions"))
    missing = [c for c in ("temperature", "pressure") if c not in table.data]
    if missing:
        raise InputError(
            f"{table.at(missing[0])}: missing; a single phase of a pure substance has two degrees of freedom "
            "(phase rule), so give temperature and pressure"
        )
    temperature, pressure = (_read_coordinate(table, c) for c in ("temperature", "pressure"))
    _check_count(temperature.points * pressure.points, table.at(), least=1)
    ratio = np.diff(np.log(pressure.values))
    return SinglePhaseGrid(
        temperature.values,
        pressure.values,
        phase=table.one_of("phase", PHASES, "stable"),
        supercritical_alpha=table.one_of("supercritical_alpha", SUPERCRITICAL_RULES, "own"),
        logarithmic=ratio.size > 1 and bool(np.ptp(ratio) <= 1e-9 * ratio.mean()),
        regions=table.one_of("regions", _YES_OR_NO, "yes") == "yes",
    )


def _phase_rule(given: list[str]) -> str:
    rule = "a saturated pure substance has one degree of freedom (phase rule)"
    return f"{' and '.join(given)} are both given, but {rule}" if given else f"no coordinate is given, and {rule}"


def _read_coordinate(states: Table, coordinate: str) -> Grid:
    value = states.data[coordinate]
    if isinstance(value, dict):
        return _read_range(states.table(coordinate), coordinate)
    items = value if isinstance(value, list) else [value]
    where = states.at(coordinate)
    _check_count(len(items), where, least=1)
    return _listed(coordinate, [_state(item, coordinate, where) for item in items], where)


def _listed(coordinate: str, values: list[float], where: str) -> Grid:
    """Put the values in ascending order: a list of states is a set, and windows need the order."""
    ordered = sorted(values)
    for a, b in pairwise(ordered):
        if a == b:
            raise InputError(
                f"{where}: {a:g} {_UNITS.get(coordinate, '')}".rstrip() + " is given twice; give each state once"
            )
    return Grid(coordinate, tuple(ordered), default_range=False, points=len(ordered))


def _read_range(table: Table, coordinate: str) -> Grid:
    table.check_keys(("from", "to", "points", "spacing"))
    points = _read_points(table)
    if coordinate == "reduced_temperature" and set(table.data) == {"points"}:
        return Grid(coordinate, (), default_range=True, points=points)
    for key in ("from", "to"):
        if key not in table.data:
            raise InputError(f"{table.at(key)}: missing; a range is {{ from = ..., to = ..., points = ... }}")
    first, last = (_state(table.data[key], coordinate, table.at(key)) for key in ("from", "to"))
    if not first < last:
        given = f"from = {shown(table.data['from'])} is not below to = {shown(table.data['to'])}"
        raise InputError(f"{table.at()}: {given}; a range ascends")
    space = np.geomspace if _read_spacing(table, coordinate) == "logarithmic" else np.linspace
    return _listed(coordinate, space(first, last, points).tolist(), table.at())


def _read_points(table: Table) -> int:
    points = table.data.get("points")
    if isinstance(points, bool) or not isinstance(points, int):
        said = "missing" if points is None else f"{shown(points)} is not a whole number"
        raise InputError(f"{table.at('points')}: {said}; write how many states, e.g. points = 41")
    _check_count(points, table.at("points"), least=2)
    return points


def _check_count(count: int, where: str, least: int) -> None:
    if not least <= count <= MOST_STATES:
        raise InputError(f"{where}: {shown(count)} states; there must be {least} to {MOST_STATES}")


def _read_spacing(table: Table, coordinate: str) -> str:
    spacing = table.text("spacing", "linear")
    valid = ("linear", "logarithmic") if coordinate == "pressure" else ("linear",)
    if spacing not in valid:
        raise InputError(
            f"{table.at('spacing')}: {shown(spacing)} is unknown for a {coordinate}; valid: {', '.join(valid)}"
        )
    return spacing


def _state(value: object, coordinate: str, where: str) -> float:
    if coordinate == "reduced_temperature":
        return _reduced(value, where)
    si = to_si(value, coordinate, where)
    if si > 0:
        return si
    lowest = "absolute zero" if coordinate == "temperature" else "0 Pa"
    unit = _UNITS[coordinate]
    bare = "" if isinstance(value, str) else f" (a bare number is in {unit})"
    raise InputError(f"{where}: {shown(value)} is not above {lowest}{bare}; give a {coordinate} above 0 {unit}")


def _reduced(value: object, where: str) -> float:
    number = value if isinstance(value, (int, float)) and not isinstance(value, bool) else math.nan
    if not 0.0 < number < 1.0:
        raise InputError(f"{where}: {shown(value)} is not a reduced temperature; write bare numbers between 0 and 1")
    return float(number)

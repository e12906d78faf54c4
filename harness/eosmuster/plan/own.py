"""The tables ``[[component]]`` and ``[[model]]``: what a plan brings along itself."""

from __future__ import annotations

from typing import TYPE_CHECKING

from eosmuster.components import Component
from eosmuster.errors import InputError
from eosmuster.plan.grids import HIGHEST_REDUCED_TEMPERATURE
from eosmuster.plan.tables import Finder, Table
from eosmuster.quantities import UNITS, shown, split_quantity

if TYPE_CHECKING:
    from eosmuster.models.records import ModelRecord

_CONSTANTS = (
    "critical_temperature",
    "critical_pressure",
    "acentric_factor",
    "molar_mass",
    "critical_density",
    "triple_temperature",
)
_LONGEST_NAME = 60


def read_components(plan: Table, find_family: Finder) -> tuple[Component, ...]:
    """Read the plan's own components.

    The ranges are wider than any known substance; they are there to catch a number without its unit
    (a molar mass of 44.1 is 44.1 kg/mol, a critical pressure of 42.5 is 42.5 Pa).

    Parameters
    ----------
    find_family : (class as written, where) -> the class's own name, or InputError

    Raises
    ------
    InputError : a missing, unknown or implausible entry, or no source
    """
    return tuple(_read_component(table, find_family) for table in plan.tables("component"))


def _read_component(table: Table, find_family: Finder) -> Component:
    table.check_keys(("name", *_CONSTANTS, "family", "class", "source"))
    tc = table.quantity("critical_temperature", "temperature", above=1.0, to=5000.0)
    molar_mass = table.quantity("molar_mass", "molar_mass", above=5e-4, to=2.0)
    source = table.text("source")
    return Component(
        name=_read_name(table),
        critical_temperature=tc,
        critical_pressure=table.quantity("critical_pressure", "pressure", above=1e4, to=1e9),
        acentric_factor=table.number("acentric_factor", above=-0.6, to=2.5),
        molar_mass=molar_mass,
        critical_density=_read_density(table, molar_mass),
        triple_temperature=_read_triple(table, tc),
        family=_read_family(table, find_family),
        sources={c: source for c in _CONSTANTS if c in table.data},
    )


def _read_name(table: Table) -> str:
    name = table.text("name")
    if len(name) > _LONGEST_NAME or not name.isprintable():
        raise InputError(
            f"{table.at('name')}: {shown(name)} is no name; write one line of at most {_LONGEST_NAME} characters"
        )
    if name.casefold() == "all" or name.casefold().startswith("family:"):
        raise InputError(f"{table.at('name')}: {shown(name)} selects from the catalogue; choose another name")
    return name


def _read_density(table: Table, molar_mass: float) -> float | None:
    if "critical_density" not in table.data:
        return None
    where = table.at("critical_density")
    value = table.data["critical_density"]
    number, unit = split_quantity(value, ("density", "mass_density"), where)
    by_mass = unit in UNITS["mass_density"]
    factor = UNITS["mass_density" if by_mass else "density"][unit][0] if unit else 1.0
    density = number * factor / (molar_mass if by_mass else 1.0)
    if not 10.0 < density < 1e5:
        raise InputError(f"{where}: {shown(value)} is {density:g} mol/m3; it must lie between 10 and 100000 mol/m3")
    return density


def _read_triple(table: Table, critical_temperature: float) -> float | None:
    if "triple_temperature" not in table.data:
        return None
    most = HIGHEST_REDUCED_TEMPERATURE * critical_temperature
    return table.quantity("triple_temperature", "temperature", above=0.0, to=most)


def _read_family(table: Table, find_family: Finder) -> str:
    given = [key for key in ("family", "class") if key in table.data]
    if len(given) == 2:
        raise InputError(f"{table.at()}: family and class mean the same; give one of them")
    return find_family(table.text(given[0]), table.at(given[0])) if given else "other"


def read_models(plan: Table, find_component: Finder) -> tuple[ModelRecord, ...]:
    """Read the plan's own models; the models layer says what a record must hold.

    Parameters
    ----------
    find_component : (name as written, where) -> the component's own name, or InputError; parameters are
        given by component under any name it is known by

    Raises
    ------
    InputError : a bad record, an unknown component, or a name that the catalogue or another record has
    """
    tables = plan.tables("model")
    if not tables:
        return ()
    from eosmuster.models.catalogue import model_names
    from eosmuster.models.custom import record_from_plan

    taken = {name.casefold(): "the catalogue" for name in model_names()}
    records = []
    for table in tables:
        name = _read_name(table)
        refuse_taken(name, taken, table.at("name"))
        taken[name.casefold()] = "another model of this plan"
        records.append(record_from_plan(_by_own_names(table, find_component), table.at()))
    return tuple(records)


def _by_own_names(table: Table, find_component: Finder) -> dict[str, object]:
    """Return the table with every ``component = value`` inside parameters and translation by the component's name."""
    data = dict(table.data)
    for key in ("parameters", "translation"):
        inner = data.get(key)
        if isinstance(inner, dict):
            where = table.at(key)
            data[key] = {k: _renamed(v, find_component, f"{where}.{k}") for k, v in inner.items()}
    return data


def _renamed(value: object, find_component: Finder, where: str) -> object:
    if not isinstance(value, dict):
        return value
    renamed: dict[str, object] = {}
    for text, number in value.items():
        name = find_component(text, where)
        if name in renamed:
            raise InputError(f"{where}: {shown(text)} is {name}, which is given twice; give it once")
        renamed[name] = number
    return renamed


def refuse_taken(name: str, taken: dict[str, str], where: str) -> None:
    """Refuse a name (folded) that somebody has already."""
    holder = taken.get(name.casefold())
    if holder:
        raise InputError(f"{where}: {shown(name)} is already the name of one in {holder}; choose another")

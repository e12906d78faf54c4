"""Which components and models a plan means: the only place of this package that asks the catalogues."""

from __future__ import annotations

from collections.abc import Iterable

from eosmuster import components as catalogue
from eosmuster.components import Component
from eosmuster.errors import InputError, suggestion
from eosmuster.models.records import ModelRecord
from eosmuster.plan.own import refuse_taken
from eosmuster.plan.schema import Plan
from eosmuster.plan.tables import Finder, Table
from eosmuster.quantities import shown

ALL = "all"
OTHER = "other"


def select_components(plan: Table, own: tuple[Component, ...]) -> tuple[Component, ...]:
    """Return the components in the order of the plan; its own ones always run, named or not.

    Groups (``all``, ``family:...``) may overlap, with names too; a substance named twice is an error.

    Raises
    ------
    InputError : an unknown name, a substance named twice, an own name that the catalogue has, or none at all
    """
    _refuse_collisions(plan, own)
    where = plan.at("components")
    chosen: dict[str, Component] = {}
    named: dict[str, str] = {}
    for text in plan.texts("components"):
        for component in _resolve(text, own, where):
            chosen.setdefault(component.name, component)
            if not _is_group(text):
                _refuse_same(named, component, text, where)
    chosen |= {c.name: c for c in own if c.name not in chosen}
    if not chosen:
        raise InputError(f'{where}: an empty sweep: no component; name some, e.g. components = ["propane", "CO2"]')
    return tuple(chosen.values())


def _refuse_same(named: dict[str, str], component: Component, text: str, where: str) -> None:
    if component.name in named:
        twice = f"{shown(named[component.name])} and {shown(text)} are both {component.name}"
        raise InputError(f"{where}: {twice}; name each substance once")
    named[component.name] = text


def _resolve(text: str, own: Iterable[Component], where: str) -> tuple[Component, ...]:
    mine = tuple(c for c in own if c.name.casefold() == text.casefold())
    if mine:
        return mine
    try:
        return catalogue.resolve([text])
    except InputError as error:
        raise InputError(f"{where}: {error}") from None


def _is_group(text: str) -> bool:
    return text.casefold() == ALL or text.casefold().startswith("family:")


def left_out(plan: Table) -> tuple[tuple[str, str], ...]:
    """Return (name, why) of the reference library's fluids that "all" does not select: blends."""
    everything = any(text.casefold() == ALL for text in plan.texts("components"))
    return tuple(catalogue.left_out().items()) if everything else ()


def find_family(text: str, where: str) -> str:
    """Return the name of a chemical class, written in the singular or the plural; a plan's own may be "other".

    Examples
    --------
    >>> find_family("quantum gases", "example")
    'quantum gas'
    """
    if text == OTHER:
        return OTHER
    try:
        return catalogue.family(text)[0].family
    except InputError as error:
        raise InputError(f"{where}: {error}") from None


def component_finder(own: tuple[Component, ...]) -> Finder:
    """Return a function (name as written, where) -> the name of that one component."""

    def find(text: str, where: str) -> str:
        if _is_group(text):
            raise InputError(f"{where}: {shown(text)} is a group; name components, or give a class")
        return _resolve(text, own, where)[0].name

    return find


def _refuse_collisions(plan: Table, own: tuple[Component, ...]) -> None:
    taken: dict[str, str] = {}
    for i, component in enumerate(own, start=1):
        where = plan.at(f"component no. {i}.name")
        refuse_taken(component.name, taken, where)
        if _in_catalogue(component.name):
            refuse_taken(component.name, {component.name.casefold(): "the catalogue"}, where)
        taken[component.name.casefold()] = "another component of this plan"


def _in_catalogue(name: str) -> bool:
    try:
        catalogue.find(name)
    except InputError:
        return False
    return True


def select_models(plan: Table, own: tuple[str, ...]) -> tuple[str, ...]:
    """Return the models in the order of the plan, all of them by default; its own ones always run.

    Raises
    ------
    InputError : an unknown name, or none at all
    """
    from eosmuster.models.catalogue import model_names

    valid = (*model_names(), *own)
    by_folded = {name.casefold(): name for name in valid}
    where = plan.at("models")
    chosen: list[str] = []
    for text in plan.texts("models", (ALL,)):
        if text.casefold() not in (ALL, *by_folded):
            raise InputError(f"{where}: unknown model {shown(text)}; {suggestion(text[:60], valid, most=30)}")
        chosen.extend(valid if text.casefold() == ALL else [by_folded[text.casefold()]])
    if not chosen:
        raise InputError(f'{where}: an empty sweep: no model; name some, or write models = "all"')
    return tuple(dict.fromkeys((*chosen, *own)))


def model_records(plan: Plan) -> tuple[ModelRecord, ...]:
    """Return the records of a plan's models, its own among them, in its order."""
    from eosmuster.models.catalogue import CATALOGUE

    own = {record.name: record for record in plan.own_models}
    return tuple(own[name] if name in own else CATALOGUE[name] for name in plan.models)

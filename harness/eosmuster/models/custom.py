"""A user's own model, written in a plan: form + alpha function + parameters + translation."""

from __future__ import annotations

import math
from collections.abc import Mapping
from types import MappingProxyType

from eosmuster.errors import InputError, suggestion
from eosmuster.models.alpha import ALPHA_FUNCTIONS
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.forms import FORMS, Form, constant_shape
from eosmuster.models.records import (
    OWN_RULE,
    SUPERCRITICAL_RULES,
    CovolumeTranslation,
    CriticalTranslation,
    ModelRecord,
    Parameter,
    PerComponent,
    Translation,
    VolumeTranslation,
    polynomial,
)
from eosmuster.quantities import PROPERTIES, shown, to_si

KEYS = ("name", "form", "alpha", "parameters", "supercritical", "translation", "fitted", "source", "note")
TRANSLATIONS = ("volume", "fraction_of_covolume", "rackett")


def record_from_plan(table: Mapping[str, object], where: str) -> ModelRecord:
    """Read one ``[[model]]`` table of a plan.

    Parameters
    ----------
    table : keys of `KEYS`; ``form`` is a published name or ``{delta1 = .., delta2 = ..}``; each parameter is a
        number, the coefficients of a polynomial in the acentric factor (constant first), or a table of numbers by
        component;
        ``supercritical`` is ``own`` (the alpha function's own rule above Tc) or ``Boston-Mathias``;
        ``translation`` is ``{volume = {component = "5 cm3/mol"}}``, ``{fraction_of_covolume = {component = 0.05}}``
        or ``{rackett = [k, z0]}``, the constants of c = k (R Tc/pc)(z0 - z_RA);
        ``fitted`` names the properties for which the parameters were fitted to the reference library's own values,
        so that no verdict on these counts as independent
    where : file and table, for messages

    Raises
    ------
    InputError : an unknown or missing key, name or unit, or a value that is no number.

    Examples
    --------
    >>> own = record_from_plan({"name": "PR-plant", "form": "Peng-Robinson", "alpha": "Soave",
    ...                         "parameters": {"m": [0.38, 1.5, -0.25]}, "source": "in-house fit"}, "plan.toml")
    >>> own.alpha, own.own
    ('Soave', True)
    """
    for key in table:
        if key not in KEYS:
            raise InputError(f"{where}: unknown key {key!r}; {suggestion(key, KEYS)}")
    name = _text(table, "name", where)
    if name in CATALOGUE:
        raise InputError(f"{where}: name = {name!r} is a catalogued model; give your own model a name of its own")
    where = f"{where} {name!r}"
    alpha = _text(table, "alpha", where)
    if alpha not in ALPHA_FUNCTIONS:
        raise InputError(f"{where}: unknown alpha function {alpha!r}; {suggestion(alpha, ALPHA_FUNCTIONS, most=12)}")
    return ModelRecord(
        name=name,
        form=_form(table.get("form"), where),
        alpha=alpha,
        parameters=_parameters(table.get("parameters", {}), ALPHA_FUNCTIONS[alpha].parameters, where),
        source=_text(table, "source", where),
        status="the user's own",
        translation=_translation(table.get("translation"), where),
        note=str(table.get("note", "")),
        fitted=_fitted(table.get("fitted", []), where),
        own=True,
        supercritical=_rule(table.get("supercritical", OWN_RULE), where),
    )


def _text(table: Mapping[str, object], key: str, where: str) -> str:
    value = table.get(key)
    if not isinstance(value, str) or not value.strip():
        raise InputError(f"{where}: {key} = {shown(value)} must be a text that is not empty")
    return value.strip()


def _fitted(value: object, where: str) -> tuple[str, ...]:
    """Read names of properties; a single one may stand without brackets."""
    names = [value] if isinstance(value, str) else value
    if not isinstance(names, list):
        raise InputError(
            f'{where}: fitted = {shown(value)} must be a list of properties, e.g. ["saturation_pressure"]'
        )
    for name in names:
        if not isinstance(name, str) or name not in PROPERTIES:
            known = suggestion(str(name)[:60], PROPERTIES, most=len(PROPERTIES))
            raise InputError(f"{where}: fitted names {shown(name)}, which is no property; {known}")
    return tuple(dict.fromkeys(names))


def _rule(value: object, where: str) -> str:
    if not isinstance(value, str) or value not in SUPERCRITICAL_RULES:
        raise InputError(f"{where}: supercritical = {shown(value)} must be one of {', '.join(SUPERCRITICAL_RULES)}")
    return value


def _number(value: object, where: str) -> float:
    try:
        number = float(value) if isinstance(value, (int, float)) and not isinstance(value, bool) else math.nan
    except OverflowError:
        number = math.inf
    if not math.isfinite(number):
        raise InputError(f"{where} = {shown(value)} is not a finite number")
    return number


def _form(value: object, where: str) -> Form:
    if isinstance(value, str):
        if value not in FORMS:
            raise InputError(f"{where}: unknown form {value!r}; {suggestion(value, FORMS)} or {{delta1, delta2}}")
        return FORMS[value]
    if not isinstance(value, Mapping) or set(value) != {"delta1", "delta2"}:
        raise InputError(
            f"{where}: form = {shown(value)} must be one of {', '.join(FORMS)} or {{delta1 = .., delta2 = ..}}"
        )
    delta1, delta2 = (_number(value[key], f"{where}: form.{key}") for key in ("delta1", "delta2"))
    if min(delta1, delta2) <= -1.0:
        raise InputError(
            f"{where}: form = {shown(value)} must have delta1 and delta2 above -1, or p diverges above b"
        )
    return Form("own", constant_shape(delta1, delta2), "the user's own", one_for_all=True)


def _parameters(value: object, names: tuple[str, ...], where: str) -> Mapping[str, Parameter]:
    if not isinstance(value, Mapping):
        raise InputError(f"{where}: parameters = {shown(value)} must be a table of {', '.join(names) or 'nothing'}")
    for key in value:
        if key not in names:
            raise InputError(f"{where}: unknown parameter {key!r}; {suggestion(str(key), names)}")
    for name in names:
        if name not in value:
            raise InputError(f"{where}: parameter {name!r} is missing; the alpha function needs {', '.join(names)}")
    return MappingProxyType({name: _parameter(value[name], f"{where}: parameters.{name}") for name in names})


def _parameter(value: object, where: str) -> Parameter:
    if isinstance(value, Mapping):
        return PerComponent(MappingProxyType({str(c): _number(v, f"{where}.{c}") for c, v in value.items()}))
    if isinstance(value, list):
        if not value:
            raise InputError(f"{where} = [] must hold at least one coefficient")
        return polynomial(*(_number(v, where) for v in value))
    return polynomial(_number(value, where))


def _translation(value: object, where: str) -> Translation | None:
    if value is None:
        return None
    if not isinstance(value, Mapping) or len(value) != 1 or next(iter(value)) not in TRANSLATIONS:
        raise InputError(f"{where}: translation = {shown(value)} must hold exactly one of {', '.join(TRANSLATIONS)}")
    (kind, given), where = next(iter(value.items())), f"{where}: translation"
    if kind == "rackett":
        if not isinstance(given, list) or len(given) != 2:
            raise InputError(f"{where}.rackett = {shown(given)} must be [k, z0] of c = k (R Tc/pc)(z0 - z_RA)")
        return CriticalTranslation(_number(given[0], f"{where}.rackett"), _number(given[1], f"{where}.rackett"))
    if not isinstance(given, Mapping):
        raise InputError(f"{where}.{kind} = {shown(given)} must be a table of component = value")
    if kind == "volume":
        volumes = {str(c): to_si(v, "molar_volume", f"{where}.volume.{c}") for c, v in given.items()}
        return VolumeTranslation(PerComponent(MappingProxyType(volumes)))
    shifts = {str(c): _number(v, f"{where}.{kind}.{c}") for c, v in given.items()}
    return CovolumeTranslation(PerComponent(MappingProxyType(shifts)))

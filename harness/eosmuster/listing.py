"""What ``list`` and ``saturate`` print: views of the catalogues and of answers."""

from __future__ import annotations

import textwrap
from collections.abc import Callable, Mapping, Sequence
from types import MappingProxyType

from eosmuster.components import Component, catalogue, left_out
from eosmuster.errors import InputError, suggestion
from eosmuster.inquiry import Answer
from eosmuster.listing_references import references_text
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.plan import builtin
from eosmuster.quantities import PROPERTIES, to_si
from eosmuster.report.terminal import SaturationRow, saturation_table
from eosmuster.report.text import number, plain_table


def chosen_models(names: Sequence[str] | None) -> tuple[str, ...]:
    """Resolve the models named on the command line, without regard to case; all of them by default."""
    if not names:
        return tuple(CATALOGUE)
    by_folded = {name.casefold(): name for name in CATALOGUE}
    for name in names:
        if name.casefold() not in by_folded:
            raise InputError(f"--model: unknown model {name!r}; {suggestion(name, CATALOGUE, most=30)}")
    return tuple(dict.fromkeys(by_folded[name.casefold()] for name in names))


def positive(text: str | None, dimension: str, where: str) -> float | None:
    """Read a positive quantity of the command line."""
    if text is None:
        return None
    value = to_si(text, dimension, where)
    if value <= 0.0:
        zero = "absolute zero" if dimension == "temperature" else "zero"
        raise InputError(f"{where}: {text!r} is not above {zero}; a positive {dimension} is needed")
    return value


def saturation_text(
    component: Component, answers: Sequence[Answer], temperature: float | None, pressure: float | None, width: int
) -> str:
    """Lay out the answers to one question."""
    asked = (
        f"T = {temperature:.6g} K ({temperature - 273.15:.6g} degC)"
        if temperature is not None
        else f"p = {number(pressure, 6)} Pa ({number((pressure or 0.0) / 1e5, 6)} bar)"
    )
    tc, pc = component.critical_temperature, component.critical_pressure
    mass = component.molar_mass
    density_unit = "mol/m3" if mass is None else "kg/m3"
    first = "p_sat, bar" if temperature is not None else "T_b, K"
    headers = ["", first, f"liquid, {density_unit}", f"vapor, {density_unit}", "h_vap, kJ/mol", "fugacity, bar"]
    rows = [_saturation_row(a, temperature is None, mass or 1.0) for a in answers]
    lines = [
        f"{component.name}, saturated at {asked}",
        f"Tc {tc:.6g} K, pc {pc / 1e5:.6g} bar, omega {component.acentric_factor:.4g}",
        *(line for note in component.notes for line in _wrapped(note, width)),
        "",
        saturation_table(rows, headers, width),
    ]
    return "\n".join(lines)


def _saturation_row(answer: Answer, by_pressure: bool, mass: float) -> SaturationRow:
    note = answer.note or ("" if answer.status in {"solved", "answered"} else answer.status)
    return SaturationRow(
        answer.source.removeprefix("handbook:"),
        answer.temperature if by_pressure else answer.pressure / 1e5,
        answer.liquid_density * mass,
        answer.vapor_density * mass,
        answer.enthalpy_of_vaporization / 1e3,
        answer.fugacity / 1e5,
        f"unavailable: {note}" if answer.status == "unavailable" else note,
    )


def _wrapped(text: str, width: int) -> list[str]:
    return textwrap.wrap(text, width, subsequent_indent="    ")


def models_text(width: int) -> str:
    """List the catalogue."""
    rows = [[r.name, r.form.name, r.alpha, "yes" if r.translation else "", r.source] for r in CATALOGUE.values()]
    return plain_table(["model", "form", "alpha function", "translated", "source"], rows, width)


def components_text(width: int) -> str:
    """List all fluids, and what is left out."""
    rows = [
        [
            c.name,
            c.cas,
            c.family,
            f"{c.critical_temperature:.2f}",
            f"{c.critical_pressure / 1e5:.3f}",
            f"{c.acentric_factor:.4f}",
        ]
        for c in catalogue().values()
    ]
    lines = [plain_table(["component", "CAS", "class", "Tc, K", "pc, bar", "omega"], rows, width), ""]
    lines += [f"{len(rows)} pure components. Left out:"]
    for name, reason in left_out().items():
        lines += _wrapped(f"  {name}: {reason}", width)
    return "\n".join(lines)


def properties_text(width: int) -> str:
    """List the properties that are judged."""
    rows = [[p.name, p.label, p.unit, p.phase] for p in PROPERTIES.values()]
    return plain_table(["property", "meaning", "SI unit", "phase"], rows, width)


def plans_text(width: int) -> str:
    """List the built-in plans."""
    plans = [builtin.load(name) for name in builtin.names()]
    rows = [[p.name, str(len(p.components)), str(len(p.models)), p.title] for p in plans]
    return plain_table(["plan", "components", "models", "title"], rows, width)


LISTS: Mapping[str, Callable[[int], str]] = MappingProxyType(
    {
        "models": models_text,
        "components": components_text,
        "references": references_text,
        "properties": properties_text,
        "plans": plans_text,
    }
)

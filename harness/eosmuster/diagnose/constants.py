"""Constants that contradict each other, or stand out among their like."""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component, acentric_from_saturation
from eosmuster.diagnose.findings import Finding
from eosmuster.quantities import GAS_CONSTANT

Floats = NDArray[np.float64]

NAN = float("nan")

ACENTRIC_CONTRADICTS, ACENTRIC_DOUBTFUL = 0.1, 0.005
"""Difference of a stored acentric factor from -1 - log10(psat(0.7 Tc)/pc); ours."""

COMPRESSIBILITY = (0.20, 0.34)
"""Range of Z_c of known substances (common practice: 0.22 to 0.31, hydrogen halides and helium a little beyond)."""

SERIES_FAMILY, SERIES_FROM, SERIES_OUTLIER = "n-alkane", 0.058, 0.02
"""Homologous series checked, the molar mass (kg/mol) it starts at, since its first members leave the curve (common
practice), and the share of Tc or pc by which a member may stand off the curve of its neighbours (ours)."""

BOILING_POINT_K = 1.0
"""Difference of two normal boiling points from which they contradict each other; ours."""


def acentric(component: Component, stored: float, psat_at_07: float) -> Iterator[Finding]:
    """Compare an acentric factor with its own definition (Pitzer et al., J. Am. Chem. Soc. 77 (1955) 3433)."""
    own = acentric_from_saturation(psat_at_07, component.critical_pressure)
    difference = abs(stored - own)
    if not difference > ACENTRIC_DOUBTFUL:
        return
    severity = "contradiction" if difference > ACENTRIC_CONTRADICTS else "doubt"
    at = 0.7 * component.critical_temperature
    yield Finding(
        "acentric factor",
        severity,
        component.name,
        "stored constant",
        stored,
        own,
        at,
        at,
        f"stored {stored:.4f}, but psat(0.7 Tc)/pc of the reference's own equation gives {own:.4f}",
    )


def compressibility(component: Component) -> Iterator[Finding]:
    """Check Z_c = pc/(rho_c R Tc) against what substances have."""
    if component.critical_density is None:
        return
    z = component.critical_pressure / (component.critical_density * GAS_CONSTANT * component.critical_temperature)
    low, high = COMPRESSIBILITY
    if not low <= z <= high:
        yield Finding(
            "critical compressibility",
            "doubt",
            component.name,
            "stored constants",
            z,
            0.27,
            NAN,
            NAN,
            f"Z_c = {z:.3f} lies outside {low} to {high}: Tc, pc and the critical density do not fit each other",
        )


def series(components: Sequence[Component]) -> Iterator[Finding]:
    """Check each member of a homologous series against a cubic through its four neighbours in molar mass."""
    members = sorted((c for c in components if c.family == SERIES_FAMILY and _mass(c) > SERIES_FROM), key=_mass)
    for name, label in (("critical_temperature", "Tc"), ("critical_pressure", "pc")):
        for i, component in enumerate(members):
            near = sorted(
                (c for j, c in enumerate(members) if j != i), key=lambda c: abs(_mass(c) - _mass(component))
            )
            inner = min(map(_mass, near[:4]), default=0.0) < _mass(component) < max(map(_mass, near[:4]), default=0.0)
            if len(near) < 4 or not inner:
                continue
            x = np.log([_mass(c) for c in near[:4]])
            y = np.log([getattr(c, name) for c in near[:4]])
            expected = float(np.exp(np.polyval(np.polyfit(x, y, 2), np.log(_mass(component)))))
            value = getattr(component, name)
            if abs(value / expected - 1.0) > SERIES_OUTLIER:
                sentence = (
                    f"{label} = {value:.6g}, but its neighbours among the {SERIES_FAMILY}s lead to {expected:.6g}"
                )
                yield Finding(
                    "homologous series", "doubt", component.name, label, value, expected, NAN, NAN, sentence
                )


def _mass(component: Component) -> float:
    return component.molar_mass or NAN


def duplicates(rows: Mapping[str, tuple[float, ...]], subject: str) -> Iterator[Finding]:
    """Report components that share a row of parameters to the last digit.

    `rows` holds the parameters by component; two unrelated substances never have the same fit.
    """
    seen: dict[tuple[float, ...], str] = {}
    for component, row in rows.items():
        if row in seen:
            yield Finding(
                "duplicated parameters",
                "doubt",
                component,
                subject,
                NAN,
                NAN,
                NAN,
                NAN,
                f"has the very same parameters as {seen[row]}",
            )
        seen.setdefault(row, component)


def critical_table(
    component: Component, values: Mapping[str, Sequence[tuple[str, float, float]]], tolerance: Mapping[str, float]
) -> Iterator[Finding]:
    """Hold critical constants of several sources against each other and against the component's own.

    Parameters
    ----------
    values : constant -> (source, value, stated error or NaN), SI
    tolerance : constant -> relative difference from which a source is reported, beyond its stated error
    """
    for constant, rows in values.items():
        own = getattr(component, constant)
        if own is None or not rows:
            continue
        everyone = np.array([own, *(value for _, value, _ in rows)])
        consensus = float(np.median(everyone))
        for source, value, error in rows:
            allowed = tolerance[constant] * abs(consensus) + (0.0 if np.isnan(error) else error)
            if abs(value - consensus) > allowed and abs(own - consensus) <= tolerance[constant] * abs(consensus):
                off = f"{100 * (value / consensus - 1):+.2f} %"
                sentence = (
                    f"{source} gives {value:.6g}, {off} from the median {consensus:.6g} of {everyone.size} sources: "
                    "it stands alone"
                )
                yield Finding(
                    constant.replace("_", " "),
                    "contradiction",
                    component.name,
                    source,
                    value,
                    consensus,
                    NAN,
                    NAN,
                    sentence,
                )

"""Constants that contradict each other, or stand out among their like."""

from __future__ import annotations

import math
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from types import MappingProxyType

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


@dataclass(frozen=True)
class Series:
    """A homologous series: members of a class whose molar mass (kg/mol) is `ends` and a number of `unit`."""

    name: str
    family: str
    ends: float
    unit: float
    begins: float = 0.0

    def holds(self, component: Component) -> bool:
        """Tell whether a component is of the series, from the molar mass `begins` on.

        Examples
        --------
        >>> from eosmuster.components import find
        >>> [SERIES[1].holds(find(name)) for name in ("R218", "RC318")]   # perfluoropropane, a ring
        [True, False]
        """
        units = (_mass(component) - self.ends) / self.unit
        of_series = abs(units - round(units)) < _WHOLE if math.isfinite(units) else False
        return component.family == self.family and of_series and _mass(component) > self.begins


SERIES = (
    Series("n-alkanes", "n-alkane", 2.016e-3, 14.0266e-3, begins=0.058),
    Series("perfluoro-n-alkanes", "perfluorocarbon", 37.9968e-3, 50.0075e-3),
    Series("linear siloxanes", "siloxane", 88.223e-3, 74.154e-3),
)
"""Homologous series that have members enough: H2 and CH2, F2 and CF2, Si(CH3)4 and OSi(CH3)2. The first
n-alkanes leave the curve of the others (common practice)."""

_WHOLE = 0.02
"""So near to a whole number of units a molar mass has to be: masses are printed in several ways."""

SERIES_OUTLIER = 0.02
"""Share of Tc or pc by which a member may stand off the curve of its neighbours; ours."""

_SHOWN = {"critical_temperature": (1.0, "K"), "critical_pressure": (1e-5, "bar")}
"""Constants of tables: what makes the shown number of an SI value, and its unit."""

STORED = "stored constant"
"""What findings call a constant of the library's record, or of the user's own."""

BOILING_POINT_K = 1.0
"""Difference of two normal boiling points from which they contradict each other; ours."""


def acentric(component: Component, stored: float, psat_at_07: float, subject: str = STORED) -> Iterator[Finding]:
    """Compare an acentric factor with its own definition (Pitzer et al., J. Am. Chem. Soc. 77 (1955) 3433).

    `subject` names the source of one that does not come from the component's record.
    """
    own = acentric_from_saturation(psat_at_07, component.critical_pressure)
    difference = abs(stored - own)
    if not difference > ACENTRIC_DOUBTFUL:
        return
    severity = "contradiction" if difference > ACENTRIC_CONTRADICTS else "doubt"
    at = 0.7 * component.critical_temperature
    given = "stored" if subject == STORED else f"{subject} gives"
    sentence = f"{given} {stored:.4f}, but psat(0.7 Tc)/pc of the reference's own equation gives {own:.4f}"
    yield Finding("acentric factor", severity, component.name, subject, stored, own, at, at, sentence)


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
    """Check each member of a homologous series against its four neighbours in molar mass.

    Through these goes a parabola of the constant's logarithm over that of the molar mass, by least squares.
    """
    for one in SERIES:
        yield from _outliers(one, sorted(filter(one.holds, components), key=_mass))


def _outliers(one: Series, members: Sequence[Component]) -> Iterator[Finding]:
    """Find members of one series, by rising molar mass, that their neighbours do not lead to."""
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
                factor, unit = _SHOWN[name]
                sentence = (
                    f"{label} = {value * factor:.6g} {unit}, but its neighbours among the {one.name} lead to "
                    f"{expected * factor:.6g} {unit}"
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
    component: Component,
    values: Mapping[str, Sequence[tuple[str, float, float]]],
    tolerance: Mapping[str, float],
    own_source: Mapping[str, str] = MappingProxyType({}),
) -> Iterator[Finding]:
    """Hold critical constants of several sources against each other and against the component's own.

    Parameters
    ----------
    values : constant -> (source, value, stated error or NaN), SI; none of them the component's own
    tolerance : constant -> relative difference from which a value is reported, for a source beyond its stated error
    own_source : constant -> where the component's own comes from, `STORED` by default

    Yields
    ------
    sources that stand alone; the component's own value where that does, and most sources agree among themselves
    """
    for constant, rows in values.items():
        own = getattr(component, constant)
        if own is None or not rows:
            continue
        allowed, cited = tolerance[constant], [value for _, value, _ in rows]
        consensus, of = float(np.median(cited)), f"{len(rows)} other sources"
        agreeing = sum(_near(row, consensus, allowed) for row in rows)
        apart = abs(own - consensus) > allowed * abs(consensus)
        if apart and agreeing > max(1.0, len(rows) / 2):
            yield _alone(component, constant, own_source.get(constant, STORED), own, consensus, of)
        else:
            consensus, of = float(np.median([own, *cited])), f"{len(rows) + 1} sources"
            if abs(own - consensus) > allowed * abs(consensus):
                continue  # no majority tells which is right
        away = [row for row in rows if not _near(row, consensus, allowed)]
        yield from (_alone(component, constant, source, value, consensus, of) for source, value, _ in away)


def _near(row: tuple[str, float, float], consensus: float, allowed: float) -> bool:
    """Tell whether a source's value is the consensus, but for a relative difference and its stated error."""
    _, value, error = row
    return abs(value - consensus) <= allowed * abs(consensus) + (0.0 if np.isnan(error) else error)


def _alone(component: Component, constant: str, source: str, value: float, median: float, of: str) -> Finding:
    """Say that a constant of one source stands alone against the median `of` many."""
    factor, unit = _SHOWN[constant]
    given = f"{source} gives" if source != STORED else f"{source}:"
    sentence = (
        f"{given} {value * factor:.6g} {unit}, {100 * (value / median - 1):+.2f} % from the median "
        f"{median * factor:.6g} {unit} of {of}: it stands alone"
    )
    check = constant.replace("_", " ")
    return Finding(check, "contradiction", component.name, source, value, median, NAN, NAN, sentence)

"""References along temperature: a vapor pressure that falls, or a liquid that grows denser on heating, cannot be.

From the triple point to the critical point the saturation pressure rises (Clapeyron's equation), the saturated
vapor grows denser, the saturated liquid thinner, and the enthalpy and entropy of vaporization go to zero. The few
substances that leave the rule near their triple points are named in `LEAVE_THE_RULE`.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from types import MappingProxyType

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.diagnose.pairs import Source
from eosmuster.quantities import CONTESTED_ABOVE

Floats = NDArray[np.float64]

RISES: Mapping[str, bool] = MappingProxyType(
    {
        "saturation_pressure": True,
        "liquid_density": False,
        "vapor_density": True,
        "enthalpy_of_vaporization": False,
        "entropy_of_vaporization": False,
    }
)
"""Property -> whether it rises with temperature, or else falls; heat capacities do both."""

LEAVE_THE_RULE: Mapping[tuple[str, str], tuple[float, str]] = MappingProxyType(
    {
        ("Water", "liquid_density"): (277.2, "densest at 3.98 degC (IAPWS R6-95)"),
        ("HeavyWater", "liquid_density"): (285.3, "densest near 11 to 12 degC (IAPWS R16-17, from memory)"),
        ("Helium", "enthalpy_of_vaporization"): (3.1, "largest near 3 K, as its reference equation has it"),
        ("Hydrogen", "enthalpy_of_vaporization"): (17.0, "largest near 16.6 K, as its reference equation has it"),
        ("ParaHydrogen", "enthalpy_of_vaporization"): (17.0, "largest near 16.7 K, as its reference equation has it"),
        ("OrthoHydrogen", "enthalpy_of_vaporization"): (
            17.0,
            "largest near 16.8 K, as its reference equation has it",
        ),
    }
)
"""Component and property -> temperature in K from which on the rule holds, and why not below."""

ROUNDING_PCT = 1e-6
"""What a formula may turn back by and be monotonic all the same, %: far above the rounding of a double."""


@dataclass(frozen=True)
class Turn:
    """Where a reference goes the wrong way.

    Attributes
    ----------
    component, quantity, source : what of which
    from_K, to_K : between these temperatures
    size_pct : by how much, % of the value at `from_K`, signed
    """

    component: str
    quantity: str
    source: str
    from_K: float
    to_K: float
    size_pct: float

    @property
    def sentence(self) -> str:
        """Say it in words."""
        way = "fall" if RISES[self.quantity] else "rise"
        label = self.quantity.replace("_", " ")
        return (
            f"{label} by {self.source} {way}s with temperature, by {abs(self.size_pct):.3g} % from {self.from_K:.1f} "
            f"to {self.to_K:.1f} K, where that of no fluid does"
        )


def turns(
    component: str, name: str, source: str, temperature: Floats, values: Floats, slack_pct: ArrayLike = ROUNDING_PCT
) -> tuple[Turn, ...]:
    """Find the stretches over which a reference goes the wrong way.

    Parameters
    ----------
    component, name, source : which reference of which property
    temperature, values : (n,), K in any order and SI; NaN for no value
    slack_pct : a number or (n,), what each value may be off by, in %: its uncertainty or the rounding of its last
        digit, so that scatter is no turn

    Returns
    -------
    stretches that go back by more than the values at both of their ends may be off by

    Examples
    --------
    >>> t = np.array([250.0, 260.0, 270.0, 280.0])
    >>> [turn] = turns("x", "saturation_pressure", "lab", t, np.array([2.0, 3.0, 2.5, 4.0]), 1.0)
    >>> print(turn.sentence)
    saturation pressure by lab falls with temperature, by 16.7 % from 260.0 to 270.0 K, where that of no fluid does
    >>> turns("Water", "liquid_density", "lab", np.array([273.2, 277.0]), np.array([55498.0, 55505.0]))
    ()
    """
    if name not in RISES:
        return ()
    from_K, _ = LEAVE_THE_RULE.get((component, name), (0.0, ""))
    slack = np.broadcast_to(np.asarray(slack_pct, np.float64), values.shape)
    kept = np.flatnonzero(np.isfinite(values) & (values > 0.0) & (temperature >= from_K))
    order = kept[np.argsort(temperature[kept], kind="stable")]
    t, v, u = temperature[order], values[order], slack[order]
    return tuple(
        Turn(component, name, source, float(t[i]), float(t[j]), size)
        for i, j in _stretches((np.diff(v) < 0.0) if RISES[name] else (np.diff(v) > 0.0))
        if abs(size := 100.0 * float(v[j] / v[i] - 1.0)) > u[i] + u[j]
    )


def turned(component: str, name: str, source: Source) -> tuple[Turn, ...]:
    """Find where one of several references goes the wrong way, as `turns` does.

    A formula may be off by next to nothing; a table by half of what contests the property, which two neighbours make
    whole, or by the expanded uncertainty of the value where that is more.
    """
    if source.evaluate is not None:
        return turns(component, name, source.name, source.temperature, source.values)
    if name not in RISES:
        return ()
    slack = np.fmax(0.5 * CONTESTED_ABOVE[name], source.uncertainty_pct)
    return turns(component, name, source.name, source.temperature, source.values, slack)


def _stretches(wrong: NDArray[np.bool_]) -> Iterator[tuple[int, int]]:
    """Give the first and last state of every unbroken run of steps that go the wrong way."""
    edges = np.flatnonzero(np.diff(np.r_[False, wrong, False]))
    return zip(edges[::2].tolist(), edges[1::2].tolist(), strict=True)

"""What a model is made of, as frozen data: a form, an alpha function, parameters, a translation, sources."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from types import MappingProxyType

import numpy as np
from numpy.typing import NDArray

from eosmuster.models.forms import Form

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Polynomial:
    """A parameter as a polynomial in the acentric factor, in bands of it.

    Attributes
    ----------
    bands : (upper end of the band, included; coefficients from the constant upwards), ascending

    Examples
    --------
    >>> low, high = (0.37464, 1.54226, -0.26992), (0.379642, 1.48503, -0.164423, 0.016666)
    >>> m = Polynomial(((0.491, low), (float("inf"), high)))
    >>> round(float(m(np.array(0.3))), 6)
    0.813025
    """

    bands: tuple[tuple[float, tuple[float, ...]], ...]

    def __call__(self, omega: Floats) -> Floats:
        """Evaluate at acentric factors of any shape."""
        values = [np.polynomial.polynomial.polyval(omega, np.asarray(c)) for _, c in self.bands]
        conditions = [omega <= upper for upper, _ in self.bands]
        return np.asarray(np.select(conditions, values, np.nan))


def polynomial(*coefficients: float) -> Polynomial:
    """One band over all acentric factors."""
    return Polynomial(((float("inf"), coefficients),))


@dataclass(frozen=True)
class CompressibilityPolynomial:
    """A polynomial in the acentric factor whose coefficients are linear in the substance's Z_c times `factor`."""

    rows: tuple[tuple[float, float], ...]
    factor: float

    def __call__(self, omega: Floats, zc: Floats) -> Floats:
        """Evaluate: sum of (c0 + c1 factor Z_c) omega**i."""
        z = self.factor * zc
        return np.asarray(sum((c0 + c1 * z) * omega**i for i, (c0, c1) in enumerate(self.rows)))


@dataclass(frozen=True)
class Tabulated:
    """A parameter tabulated by CAS number: a file of ``references/parameters`` and its column.

    A component that is not in the file has no such model.
    """

    file: str
    column: str


@dataclass(frozen=True)
class PerComponent:
    """A parameter given component by component in the user's own plan."""

    values: Mapping[str, float]


Parameter = Polynomial | CompressibilityPolynomial | Tabulated | PerComponent


@dataclass(frozen=True)
class CriticalTranslation:
    """c = k (R Tc/pc)(z0 - z_RA), with V = V_EOS - c and the Rackett factor z_RA = r0 + r1 omega."""

    k: float
    z0: float
    r0: float = 0.29056
    r1: float = -0.08775


@dataclass(frozen=True)
class CovolumeTranslation:
    """c = shift b, the shift tabulated by component."""

    shift: Tabulated | PerComponent


@dataclass(frozen=True)
class VolumeTranslation:
    """c in m3/mol, tabulated by component."""

    volume: Tabulated | PerComponent


OWN_RULE, BOSTON_MATHIAS_RULE = "own", "Boston-Mathias"
SUPERCRITICAL_RULES = (OWN_RULE, BOSTON_MATHIAS_RULE)
"""How alpha goes on above Tc: as published with the alpha function, or by Boston and Mathias's extrapolation."""

Translation = CriticalTranslation | CovolumeTranslation | VolumeTranslation


@dataclass(frozen=True)
class ModelRecord:
    """A named equation of state: cited data, no code.

    Attributes
    ----------
    name : the published name; a variant is the name plus what was done (``PR+Peneloux``)
    form, alpha : the cubic form and the name of the alpha function
    parameters : alpha parameter -> how a component gets it
    source : citation
    status : how the constants were read (``checked``, ``read in a transcription``, ``from memory``)
    translation : or None
    constants : file of ``references/parameters`` whose own Tc and pc go with the parameters; "" for the component's
    note : what a user must know
    fitted : properties for which parameters were fitted to the reference library's own values
    own : whether the user's plan brought it
    supercritical : one of `SUPERCRITICAL_RULES`
    supercritical_parameters : alpha parameters whose values are others above Tc
    """

    name: str
    form: Form
    alpha: str
    parameters: Mapping[str, Parameter]
    source: str
    status: str
    translation: Translation | None = None
    constants: str = ""
    note: str = ""
    fitted: tuple[str, ...] = ()
    own: bool = False
    supercritical: str = OWN_RULE
    supercritical_parameters: Mapping[str, Parameter] = field(default_factory=lambda: MappingProxyType({}))


def frozen(**parameters: Parameter) -> Mapping[str, Parameter]:
    """Freeze a mapping of parameters."""
    return MappingProxyType(parameters)

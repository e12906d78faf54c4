"""What becomes of an alpha function above Tc: its own published rule, or Boston and Mathias's extrapolation."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from eosmuster.models import alpha_jets as jets
from eosmuster.models.alpha import ALPHA_FUNCTIONS, AlphaFunction
from eosmuster.models.alpha_jets import Jet
from eosmuster.models.records import BOSTON_MATHIAS_RULE, ModelRecord

Floats = NDArray[np.float64]


@dataclass(frozen=True)
class Supercritical:
    """The alpha function above Tc and its parameters, arrays of one shape."""

    alpha: AlphaFunction
    parameters: tuple[Floats, ...]

    def take(self, index: NDArray[np.intp] | int | slice) -> Supercritical:
        """Give the rows asked for, in that order."""
        return Supercritical(self.alpha, tuple(p[index] for p in self.parameters))

    def jet(self, tau: Floats) -> Jet:
        """alpha - 1 and its first and second derivative with respect to ln(T)."""
        return self.alpha.jet(tau, *self.parameters)


def boston_mathias_excess(tau: Floats, m: Floats) -> Floats:
    """Alpha = exp[2 c (1 - Tr**d)], d = 1 + m/2, c = 1 - 1/d: value and slope are those of any function at Tc.

    Boston and Mathias, Proc. 2nd Int. Conf. on Phase Equilibria and Fluid Properties in the Chemical Process
    Industries, Berlin (1980) 823 (the formula read in a transcription that cites the paper, the page from memory).
    m = -d alpha/d Tr at Tc, which is Soave's m for his function.

    Examples
    --------
    >>> float(boston_mathias_excess(np.array(-1e-6), 0.8)) / 1e-6   # d alpha/d Tr at Tc
    -0.79999...
    """
    return jets.boston_mathias(tau, m)[0]


def boston_mathias_slope(tau: Floats, m: Floats) -> Floats:
    """Logarithmic slope of Boston and Mathias's function: -m Tr**d."""
    return np.asarray(-m * np.exp((1.0 + 0.5 * m) * np.log1p(-tau)))


BOSTON_MATHIAS = AlphaFunction(
    "Boston-Mathias",
    ("m",),
    boston_mathias_excess,
    boston_mathias_slope,
    "Boston and Mathias 1980",
    jets.boston_mathias,
)
"""Not among `ALPHA_FUNCTIONS`: it is meant for T > Tc alone."""


def supercritical_alpha(
    record: ModelRecord, alpha: AlphaFunction, values: tuple[Floats, ...], above: tuple[Floats, ...], count: int
) -> Supercritical | None:
    """Give the alpha function of a record above Tc; None if it is the one below.

    Parameters
    ----------
    values, above : the parameters of `alpha` below Tc, and those that the record gives for T > Tc, shape (count,)
    """
    if record.supercritical == BOSTON_MATHIAS_RULE:
        return Supercritical(BOSTON_MATHIAS, (-alpha.log_slope(np.zeros(count), *values),))
    if record.supercritical_parameters:
        return Supercritical(alpha, above)
    if alpha.above is not None:
        name, parameters = alpha.above(*values)
        return Supercritical(ALPHA_FUNCTIONS[name], parameters)
    return None

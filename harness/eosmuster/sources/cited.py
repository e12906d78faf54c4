"""What cited sources give of one property of one component: a correlation with its range, or a table."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike, NDArray

from eosmuster.errors import InputError
from eosmuster.sources.correlations import FORMS
from eosmuster.sources.inversion import invert
from eosmuster.sources.vapor_pressure import Coefficients, Floats


@dataclass(frozen=True)
class Correlation:
    """One property of one component as a formula in temperature, valid from `from_K` to `to_K`.

    Attributes
    ----------
    component, cas : which substance
    property : a name of `eosmuster.quantities.PROPERTIES`
    source : key people see, ``handbook:<form>-<citation>``
    citation : key into `bibliography`
    from_K, to_K : ends of the range, both included
    form : a name of `eosmuster.sources.correlations.FORMS`
    coefficients : in that form's order
    note : what a reader must know, or ""
    excluded : True for a row left out by default; the note says on which evidence

    Examples
    --------
    >>> from eosmuster.sources.handbook import correlations
    >>> methane = correlations("74-82-8", "saturation_pressure")[0]
    >>> methane.source
    'handbook:wagner-mcgarry-1983'
    >>> methane(np.array([50.0, 111.67])).round(-2)
    array([    nan, 101600.])
    >>> round(methane.temperature_at(101325.0), 2)
    111.63
    """

    component: str
    cas: str
    property: str
    source: str
    citation: str
    from_K: float
    to_K: float
    form: str
    coefficients: Coefficients
    note: str = ""
    excluded: bool = False

    def __call__(self, temperature: ArrayLike) -> Floats:
        """Give the property (SI) at temperatures in K, same shape; NaN outside the range."""
        kelvin, inside = self._gated(temperature)
        result = np.full(kelvin.shape, np.nan)
        result[inside] = FORMS[self.form].value(kelvin[inside], self.coefficients)
        return result

    def slope(self, temperature: ArrayLike) -> Floats:
        """Give dp/dT in Pa/K, same shape; NaN outside the range. Only vapour pressures have one."""
        kelvin, inside = self._gated(temperature)
        log_slope = FORMS[self.form].log_slope
        if log_slope is None:
            raise InputError(f"{self.source}: {self.property} has no slope here; only vapour pressures have one")
        result = self(kelvin)
        result[inside] *= log_slope(kelvin[inside], self.coefficients)
        return result

    def _gated(self, temperature: ArrayLike) -> tuple[Floats, NDArray[np.bool_]]:
        kelvin = np.asarray(temperature, dtype=np.float64)
        return kelvin, (kelvin >= self.from_K) & (kelvin <= self.to_K)

    def temperatures_at(self, pressure: ArrayLike) -> Floats:
        """Give the boiling temperatures (K) at pressures in Pa, same shape; NaN where outside the range."""
        p = np.asarray(pressure, dtype=np.float64)
        found = invert(FORMS[self.form], self.coefficients, p.reshape(-1), (self.from_K, self.to_K))
        return found.reshape(p.shape)

    def temperature_at(self, pressure: float) -> float:
        """Give the boiling temperature (K) at one pressure in Pa; NaN where outside the range."""
        return float(self.temperatures_at(pressure))


@dataclass(frozen=True)
class Table:
    """Tabulated values of one property of one component, from one source, in order of temperature.

    Attributes
    ----------
    component, cas, property, source, citation, note, excluded : as in `Correlation`
    temperature : K, shape (n,)
    pressure : Pa where the source states the condition by pressure, else NaN; shape (n,)
    values : SI, shape (n,)
    last_digit : unit of the last printed digit of each value, in SI, shape (n,); see `printed.last_digits`
    """

    component: str
    cas: str
    property: str
    source: str
    citation: str
    temperature: Floats
    pressure: Floats
    values: Floats
    last_digit: Floats
    note: str = ""
    excluded: bool = False

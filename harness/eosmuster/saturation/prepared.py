"""A model's numbers together with the curves they need: what every block of states is solved with."""

from __future__ import annotations

from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from numpy.typing import NDArray

from eosmuster.models.critical import critical_point
from eosmuster.models.model import Parameters
from eosmuster.quantities import GAS_CONSTANT
from eosmuster.saturation import tables

Floats = NDArray[np.float64]

_MANY = 50_000  # states a curve from which finer tables pay for their building


@dataclass(frozen=True)
class Prepared:
    """Parameters with their curves: what every block of states needs."""

    parameters: Parameters
    table: tables.Table
    first_row: NDArray[np.intp] | int
    density_scale: Floats  # 1/b, mol/m3
    covolume: Floats  # c, m3/mol; 0 without translation

    def part(self, piece: slice) -> Prepared:
        """Give the parameters of one block of states."""
        p = self.parameters
        if p.critical_temperature.ndim == 0:
            return self
        first = self.first_row if isinstance(self.first_row, int) else self.first_row[piece]
        return Prepared(p.take(piece), self.table, first, self.density_scale[piece], self.covolume[piece])


def prepare(parameters: Parameters, count: int) -> Prepared:
    """Find or build the curves of `parameters` for about `count` states."""
    s, m = parameters.s, parameters.m
    table = tables.shipped_table(float(s[0]), float(m[0])) if s.size == 1 else None
    # in an array of several substances a state's digits must not depend on what else is asked: only one substance
    # alone is served as the number of its states has it
    alone = parameters.critical_temperature.ndim == 0
    if table is None:
        resolution = tables.FINE if alone and count > _MANY * s.size else tables.COARSE
        table = _built_table(s.tobytes(), m.tobytes(), resolution)
    first: NDArray[np.intp] | int = 0
    if s.size > 1:
        first = parameters.form * table.resolution.intervals
    elif not alone:
        first = np.broadcast_to(np.intp(0), parameters.critical_temperature.shape)  # every state by itself
    omega_b = critical_point(s, m).omega_b[parameters.form]
    molar = GAS_CONSTANT * parameters.critical_temperature / parameters.critical_pressure
    shift = np.zeros_like(molar) if parameters.translation is None else parameters.translation * molar
    return Prepared(parameters, table, first, np.asarray(1.0 / (omega_b * molar)), np.asarray(shift))


@lru_cache(maxsize=32)
def _built_table(s: bytes, m: bytes, resolution: tables.Resolution) -> tables.Table:
    """Curves made on demand; forms that do not exist stand as Peng-Robinson's and are never asked for."""
    s_all, m_all = np.frombuffer(s), np.frombuffer(m)
    exists = np.isfinite(s_all) & np.isfinite(m_all)
    return tables.build_for(np.where(exists, s_all, 2.0), np.where(exists, m_all, -1.0), resolution)

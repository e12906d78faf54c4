"""What a diagnosis looks at of a measured set, so that it need not know the readers."""

from __future__ import annotations

from typing import Protocol

import numpy as np
from numpy.typing import NDArray

from eosmuster.components import Component

Floats = NDArray[np.float64]


class MeasuredSet(Protocol):
    """n points of one property of one substance; every reader's sets are such sets."""

    def __len__(self) -> int: ...

    @property
    def component(self) -> Component:
        """The substance."""

    @property
    def phase(self) -> str:
        """``liquid``, ``vapor``, ``fluid`` or ``two-phase``."""

    @property
    def state(self) -> str:
        """``saturated`` or ``single_phase``."""

    @property
    def block(self) -> int:
        """The block of its file."""

    @property
    def rows(self) -> NDArray[np.int64]:
        """(n,), for messages."""

    @property
    def temperature(self) -> Floats:
        """(n,), K; NaN where it is not given."""

    @property
    def pressure(self) -> Floats:
        """(n,), Pa; NaN where it is not given."""

    @property
    def values(self) -> Floats:
        """(n,), SI and molar, above 0."""

    @property
    def standard_uncertainty(self) -> Floats:
        """(n,), SI; NaN where there is none."""

    @property
    def property(self) -> str:  # last, since it hides the decorator
        """A name of ours."""

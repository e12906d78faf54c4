"""Vapor compositions join bubble points of other blocks, and whatever is not joined is accounted for."""

from __future__ import annotations

import numpy as np

from eosmuster.components import find
from eosmuster.sources.measured.table import Source
from eosmuster.sources.thermoml.binary import Equilibrium
from eosmuster.sources.thermoml.joining import INCOMPLETE, joined

PAIR = (find("R32"), find("propane"))
NOWHERE = np.array([np.nan])
INVENTED = Source(file="invented.xml", doi="", citation="invented")


def block(number: int, measured: tuple[str, ...], **columns: float) -> Equilibrium:
    values = {name: np.array([value]) for name, value in columns.items()}
    return Equilibrium(number, PAIR, ("R32", "propane"), "", values, dict.fromkeys(measured, NOWHERE))


BUBBLES = block(1, ("pressure",), temperature=280.0, pressure=9e5, liquid_fraction=0.4)


def test_a_vapor_composition_joins_the_bubble_point_at_its_state() -> None:
    vapor = block(2, ("vapor_fraction",), temperature=280.0, liquid_fraction=0.4, vapor_fraction=0.6)
    [found], told, unread = joined(INVENTED, [BUBBLES, vapor])
    assert found.vapor_fraction.tolist() == [0.6]
    assert found.blocks == (1, 2)
    assert (told, unread) == ([], {})


def test_a_block_that_measured_more_is_counted_as_not_read() -> None:
    """Joined, its pressures would be gone without a word: the bubble points have their own."""
    vapor = block(2, ("pressure", "vapor_fraction"), temperature=280.0, pressure=9e5, vapor_fraction=0.6)
    [alone], told, unread = joined(INVENTED, [BUBBLES, vapor])
    assert np.isnan(alone.vapor_fraction).all()
    assert (told, dict(unread)) == ([], {INCOMPLETE: 2})

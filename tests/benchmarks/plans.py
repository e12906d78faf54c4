"""The plans that the benchmark scripts sweep; invented, and small ones for quick runs."""

from __future__ import annotations

import sys

IMPORTS = "import CoolProp, pandas, scipy.optimize"
"""What the cost of a whole command is compared with."""

QUICK_IMPORTS = "import numpy"

_PLAN = """
title = "{title}"
components = {components}
models = "all"
properties = [
    "saturation_pressure", "boiling_temperature", "liquid_density", "vapor_density", "enthalpy_of_vaporization",
]

[states]
reduced_temperature = {{ points = {states} }}

[references]
use = ["{reference}"]
"""


def whole_catalogue(states: int) -> str:
    """Every pure fluid x every model x five saturation properties, against the reference library."""
    return _PLAN.format(
        title="The whole catalogue: an invented plan to measure what it takes",
        components='"all"',
        states=states,
        reference="coolprop",
    )


def two_fluids(states: int) -> str:
    """A plan that takes no time: two fluids against the handbook, without the reference library."""
    return _PLAN.format(
        title="Two fluids: an invented plan to try a script",
        components='["propane", "water"]',
        states=states,
        reference="handbook",
    )


def imports(quick: bool) -> tuple[str, ...]:
    """Command that imports what a sweep is compared with."""
    return (sys.executable, "-c", QUICK_IMPORTS if quick else IMPORTS)

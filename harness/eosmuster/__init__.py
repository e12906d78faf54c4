"""eosmuster: batch validation of cubic equations of state against reference data.

Names are loaded when they are first used, so that importing the package costs next to nothing.

Examples
--------
>>> import eosmuster as em
>>> r = em.saturate("propane", "PR", temperature=300.0)
>>> f"{float(r.pressure):.6g} Pa"
'997430 Pa'
"""

from __future__ import annotations

import importlib
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from eosmuster.api import Results, SaturatedStates, saturate, sweep
    from eosmuster.components import Component
    from eosmuster.drifting.comparing import Drift, drift
    from eosmuster.errors import EosmusterError, InputError, NothingJudged
    from eosmuster.replaying import Replay, replay

__version__ = "0.1.0"

_HOME = {
    "Component": "components",
    "Drift": "drifting.comparing",
    "EosmusterError": "errors",
    "InputError": "errors",
    "NothingJudged": "errors",
    "Replay": "replaying",
    "Results": "api",
    "SaturatedStates": "api",
    "drift": "drifting.comparing",
    "replay": "replaying",
    "saturate": "api",
    "sweep": "api",
}

__all__ = [
    "Component",
    "Drift",
    "EosmusterError",
    "InputError",
    "NothingJudged",
    "Replay",
    "Results",
    "SaturatedStates",
    "__version__",
    "drift",
    "replay",
    "saturate",
    "sweep",
]


def __getattr__(name: str) -> Any:
    if name not in _HOME:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(importlib.import_module(f"{__name__}.{_HOME[name]}"), name)


def __dir__() -> list[str]:
    return sorted(__all__)

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
    from eosmuster.errors import EosmusterError, InputError, NothingJudged

__version__ = "0.1.0"

_HOME = {
    "Component": "components",
    "EosmusterError": "errors",
    "InputError": "errors",
    "NothingJudged": "errors",
    "Results": "api",
    "SaturatedStates": "api",
    "saturate": "api",
    "sweep": "api",
}

__all__ = [
    "Component",
    "EosmusterError",
    "InputError",
    "NothingJudged",
    "Results",
    "SaturatedStates",
    "__version__",
    "saturate",
    "sweep",
]


def __getattr__(name: str) -> Any:
    if name not in _HOME:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(importlib.import_module(f"{__name__}.{_HOME[name]}"), name)


def __dir__() -> list[str]:
    return sorted(__all__)

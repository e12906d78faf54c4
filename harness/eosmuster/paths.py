"""Where the reference data lies: inside an installed wheel, or beside the source tree."""

from __future__ import annotations

from functools import cache
from pathlib import Path

from eosmuster.errors import EosmusterError


@cache
def references_folder() -> Path:
    """Return the folder of the cited reference data.

    A wheel carries it as ``eosmuster/_references``; a checkout (or an editable
    install of one) has it as ``references/`` at the top level.
    """
    package = Path(__file__).resolve().parent
    for folder in (package / "_references", package.parents[1] / "references"):
        if folder.is_dir():
            return folder
    raise EosmusterError(f"the reference data is missing beside {package}: install eosmuster again")

"""One family of errors, each with the exit status the command line gives it.

A message is one sentence that names the file, line or key, the offending value,
and what would be valid.
"""

from __future__ import annotations

import difflib
from collections.abc import Iterable


class EosmusterError(Exception):
    """Base of every error this package raises on purpose (exit status 3)."""

    exit_status = 3


class InputError(EosmusterError):
    """A bad plan, input file or call (exit status 2)."""

    exit_status = 2


class NothingJudged(EosmusterError):
    """Nothing could be judged or solved (exit status 4)."""

    exit_status = 4


def suggestion(name: str, valid: Iterable[str], most: int = 8) -> str:
    """Tell what a misspelt name may have meant, and what is valid.

    Examples
    --------
    >>> suggestion("PR87", ["PR", "PR78", "SRK"])
    'nearest: PR78, PR; valid: PR, PR78, SRK'
    >>> suggestion("zzz", ["a", "b", "c"], most=2)
    'valid: a, b, ... (3 in all)'
    """
    valid = list(valid)
    by_folded = {v.casefold(): v for v in valid}
    near = [by_folded[f] for f in difflib.get_close_matches(name.casefold(), by_folded, n=3, cutoff=0.55)]
    listed = ", ".join(valid[:most]) + (f", ... ({len(valid)} in all)" if len(valid) > most else "")
    return (f"nearest: {', '.join(near)}; " if near else "") + f"valid: {listed}"

"""What a precheck finds: one row a finding, the same for constants, alpha functions and references."""

from __future__ import annotations

from dataclasses import dataclass

SEVERITIES = ("contradiction", "doubt", "note")
"""contradiction: two statements cannot both be true; doubt: outside what is usual; note: a limit worth knowing."""


@dataclass(frozen=True)
class Finding:
    """One finding of a precheck.

    Attributes
    ----------
    check : what was checked (``acentric factor``, ``alpha function``, ...)
    severity : one of `SEVERITIES`
    component : "" where it is not about one
    subject : the model, source or constant it is about
    value, expected : SI or dimensionless numbers behind it; NaN where there is none
    from_K, to_K : temperatures it is about; NaN where it is about none
    sentence : the finding in words, with the evidence
    """

    check: str
    severity: str
    component: str
    subject: str
    value: float
    expected: float
    from_K: float
    to_K: float
    sentence: str

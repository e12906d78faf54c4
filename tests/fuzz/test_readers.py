"""Some hundreds of mutated files a run; `fuzz_readers.py` does any number of them."""

from __future__ import annotations

import fuzz_readers
import pytest
from fuzz_readers import LABORATORY, OPERATIONS, PIECES, THERMOML, TOKENS, mutated
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

SHARES = st.floats(0.0, 1.0, exclude_max=True)
SETTINGS = settings(derandomize=True, max_examples=150, deadline=None, suppress_health_check=[HealthCheck.too_slow])


def files(samples: list[bytes], operations: tuple[str, ...]) -> st.SearchStrategy[bytes]:
    one = st.tuples(st.sampled_from(operations), SHARES, SHARES, st.integers(0, len(PIECES) - 1))
    return st.builds(mutated, st.sampled_from(samples), st.lists(one, min_size=1, max_size=6))


@SETTINGS
@given(files(THERMOML, TOKENS))
def test_thermoml_with_changed_elements(data: bytes) -> None:
    fuzz_readers.check("thermoml", data)


@SETTINGS
@given(files(THERMOML, OPERATIONS) | st.binary(max_size=200))
def test_thermoml_with_changed_bytes(data: bytes) -> None:
    fuzz_readers.check("thermoml", data)


@SETTINGS
@given(files(LABORATORY, OPERATIONS) | st.binary(max_size=200))
def test_laboratory_files(data: bytes) -> None:
    fuzz_readers.check("laboratory", data)


@pytest.mark.parametrize("sample", range(len(THERMOML)))
def test_the_oracle_agrees_with_unchanged_thermoml(sample: int) -> None:
    assert fuzz_readers.check("thermoml", THERMOML[sample]).values > 0


@pytest.mark.parametrize("sample", range(len(LABORATORY)))
def test_the_oracle_agrees_with_unchanged_tables(sample: int) -> None:
    assert fuzz_readers.check("laboratory", LABORATORY[sample]).sets


@pytest.mark.parametrize(("kind", "sample"), [("thermoml", THERMOML[2]), ("laboratory", LABORATORY[0])])
def test_the_oracle_sees_a_wrong_value(monkeypatch: pytest.MonkeyPatch, kind: str, sample: bytes) -> None:
    monkeypatch.setattr(fuzz_readers.oracle, "close", lambda a, b: a == 2.0 * b)
    with pytest.raises(AssertionError):
        fuzz_readers.check(kind, sample)

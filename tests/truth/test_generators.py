"""The frozen truth is what its generators make, and the multi-precision solver solves what it says."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import generate_own_components
import generate_reduced_states
import mpmath as mp
import multiprecision
import pytest

MODULES = (generate_own_components, generate_reduced_states)


def table(module):
    with module.FILE.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(line for line in file if not line.startswith("#")))


def same(printed, value, digits):
    assert abs(mp.mpf(printed) / value - 1) < mp.mpf(10) ** (1 - digits)


@pytest.mark.parametrize("module", MODULES, ids=lambda module: module.__name__)
def test_the_package_is_not_used(module):
    for path in (module.__file__, multiprecision.__file__):
        assert "eosmuster" not in Path(path).read_text(encoding="utf-8")


def test_own_components_are_all_there():
    rows = table(generate_own_components)
    assert len({row["component"] for row in rows}) == 5
    assert len(rows) == 5 * 10 * 2
    assert len({(row["model"], row["component"], row["temperature_K"]) for row in rows}) == len(rows)


@pytest.mark.parametrize("number", [0, 19, 49, 54, 99])
def test_own_components_come_out_again(number):
    row = table(generate_own_components)[number]
    given = [float(row[name]) for name in generate_own_components.COLUMNS[2:6]]
    values = generate_own_components.state(row["model"], *given)
    for name, value in zip(generate_own_components.COLUMNS[6:], values, strict=True):
        same(row[name], value, generate_own_components.PRINTED)


def test_reduced_states_are_the_drawn_ones():
    rows = table(generate_reduced_states)
    drawn = [(form, repr(reduced)) for form, reduced in generate_reduced_states.drawn()]
    assert [(row["form"], row["reduced_temperature"]) for row in rows] == drawn
    ratios = [1.0 / float(row["reduced_temperature"]) for row in rows]
    assert len(rows) == 2000
    assert min(ratios) >= 1.0001 * (1 - 1e-15)
    assert max(ratios) <= 12.0 * (1 + 1e-15)
    assert min(ratios) < 1.01  # the range is used to its ends
    assert max(ratios) > 11.9


@pytest.mark.parametrize("number", range(0, 2000, 211))
def test_reduced_states_come_out_again(number):
    row = table(generate_reduced_states)[number]
    values = generate_reduced_states.state(row["form"], float(row["reduced_temperature"]))
    for name, value in zip(generate_reduced_states.COLUMNS[2:], values, strict=True):
        same(row[name], value, generate_reduced_states.PRINTED)


@pytest.mark.parametrize(("s", "m"), [*multiprecision.FORMS.values(), (1.5, 2.0), (3.1, -2.1)])
@pytest.mark.parametrize("ratio", [1 + 1e-9, 1.3, 9.0])
def test_multi_precision_states_are_saturated(s, m, ratio):
    """Equal pressures, and Maxwell's equal areas by numerical integration; (1.5, 2.0) has complex d1, d2."""
    s, m = mp.mpf(s), mp.mpf(m)
    q = multiprecision.critical(s, m).q * mp.mpf(ratio)
    found = multiprecision.saturated(q, s, m)
    for v in (found.liquid, found.vapor):
        # the liquid's pressure is a small difference of large numbers: v relates to it as 1 : 1e16 at the coldest
        assert abs(multiprecision.pressure(v, q, s, m) / found.p - 1) < mp.mpf(10) ** -50
    with mp.workdps(40):
        u, w = mp.log(found.liquid - 1), mp.log(found.vapor - 1)
        stops = [u + (w - u) * i / 12 for i in range(13)]
        area = mp.quad(lambda x: (multiprecision.pressure(1 + mp.exp(x), q, s, m) - found.p) * mp.exp(x), stops)
        assert abs(area) < mp.mpf(10) ** -18 * found.p * (found.vapor - found.liquid)


@pytest.mark.parametrize("form", multiprecision.FORMS)
def test_multi_precision_critical_points_are_closed_forms(form):
    """Omega_a, Omega_b: 27/64, 1/8; 1/(9(2**(1/3) - 1)), (2**(1/3) - 1)/3; eta of Peng and Robinson."""
    third = mp.mpf(1) / 3
    eta = 1 / (1 + (4 - mp.sqrt(8)) ** third + (4 + mp.sqrt(8)) ** third)
    closed = {
        "van der Waals": (mp.mpf(27) / 64, mp.mpf(1) / 8),
        "Redlich-Kwong": (1 / (9 * (mp.cbrt(2) - 1)), (mp.cbrt(2) - 1) / 3),
        "Peng-Robinson": ((8 + 40 * eta) / (49 - 37 * eta), eta / (eta + 3)),
    }
    found = multiprecision.critical(*multiprecision.FORMS[form])
    for got, expected in zip((found.omega_a, found.omega_b), closed[form], strict=True):
        assert abs(got / expected - 1) < mp.mpf(10) ** -100


def test_the_files_are_small():
    assert sum(module.FILE.stat().st_size for module in MODULES) < 400_000
    assert math.isclose(multiprecision.DIGITS, mp.mp.dps)

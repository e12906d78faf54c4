"""The shipped nodes against the multi-precision solver of the tests, and those solved on demand against them."""

from __future__ import annotations

from importlib.resources import files

import mpmath as mp
import numpy as np
import pytest
from multiprecision import FORMS, critical, saturated

from eosmuster.models import forms as form_module
from eosmuster.saturation import generate_nodes, nodes

EACH = pytest.mark.parametrize("form", FORMS)


def exact(form, u):
    s, m = FORMS[form]
    found = saturated(critical(s, m).q * (1 + mp.mpf(u) ** 2), s, m)
    return mp.log(found.p), mp.log(found.liquid), mp.log(found.vapor)


def test_positions_increase_and_reach_the_end():
    u = nodes.node_positions()
    assert u.size == nodes.NODES_A_PANEL * len(nodes.EDGES)
    assert (np.diff(u) > 0).all()
    assert 0.0 < u[0] < 0.03
    assert 0.99 * nodes.LARGEST_U < u[-1] < nodes.LARGEST_U
    panels = np.searchsorted(nodes.EDGES, u)
    np.testing.assert_array_equal(np.bincount(panels), nodes.NODES_A_PANEL)


def test_the_shipped_forms_are_those_of_two_parameters():
    assert set(nodes.shipped()) == {tuple(map(float, values)) for values in FORMS.values()}
    for name, values in FORMS.items():
        s, m = form_module.FORMS[name].shape(np.array(0.3), np.array(0.27))
        assert (float(s), float(m)) == values


def test_the_file_names_its_positions():
    text = files("eosmuster.saturation").joinpath("nodes.csv").read_text(encoding="utf-8")
    rows = [line.split(",") for line in text.splitlines() if not line.startswith(("#", "form"))]
    for form in FORMS:
        u = [float(row[3]) for row in rows if row[0] == form]
        np.testing.assert_array_equal(u, nodes.node_positions())


@EACH
@pytest.mark.parametrize("number", [0, 1, 21, 22, 50, 87])
def test_shipped_nodes_are_exact(form, number):
    """To the last digit of a double: the file has 20."""
    found = nodes.shipped()[tuple(map(float, FORMS[form]))]
    values = exact(form, nodes.node_positions()[number])
    columns = (found.log_pressure, found.log_liquid, found.log_vapor)
    for column, value in zip(columns, values, strict=True):
        assert column[0, number] == float(value)


@EACH
def test_nodes_solved_on_demand(form):
    """In double precision: 1e-12 near the critical point, where the two volumes are close, 1e-13 beyond."""
    s, m = FORMS[form]
    shipped, found = nodes.shipped()[float(s), float(m)], nodes.solve(np.array([float(s)]), np.array([float(m)]))
    u = nodes.node_positions()
    for name in ("log_pressure", "log_liquid", "log_vapor"):
        error = np.abs(getattr(found, name) - getattr(shipped, name))[0]
        assert error.max() < 1e-12
        assert error[u > 0.3].max() < 1e-13


def test_forms_are_solved_side_by_side():
    s, m = np.array([0.0, 2.0, 1.9, 0.4]), np.array([0.0, -1.0, -0.9, 0.6])
    together = nodes.solve(s, m)
    for i in range(s.size):
        alone = nodes.solve(s[i : i + 1], m[i : i + 1])
        # 1e-12: Newton's method stops for all at once
        np.testing.assert_allclose(together.log_liquid[i], alone.log_liquid[0], rtol=0, atol=1e-12)
        np.testing.assert_allclose(together.log_pressure[i], alone.log_pressure[0], rtol=0, atol=1e-12)


@EACH
def test_the_generator_makes_the_file(form):
    """Its solver and the tests' own agree to the printed digits, started from the double-precision solution."""
    assert generate_nodes.FORMS[form] == tuple(map(float, FORMS[form]))
    s, m = map(mp.mpf, FORMS[form])
    text = files("eosmuster.saturation").joinpath("nodes.csv").read_text(encoding="utf-8")
    rows = [line.split(",") for line in text.splitlines() if line.startswith(form)]
    with mp.workdps(90):
        q_c = generate_nodes.critical_q(s, m)
        assert abs(q_c / critical(s, m).q - 1) < mp.mpf(10) ** -60
        for row in (rows[1], rows[60]):
            guesses = (mp.mpf(round(float(value), 9)) for value in row[5:])
            values = generate_nodes.saturated(q_c * (1 + mp.mpf(float(row[3])) ** 2), s, m, *guesses)
            for printed, value in zip(row[4:], values, strict=True):
                assert abs(mp.mpf(printed) / value - 1) < mp.mpf(10) ** -19
            for own, value in zip(exact(form, float(row[3])), values, strict=True):
                assert abs(own / value - 1) < mp.mpf(10) ** -30


def test_the_generator_writes_its_columns(monkeypatch, capsys):
    monkeypatch.setattr(generate_nodes, "node_positions", lambda: nodes.node_positions()[[0, 1]])
    monkeypatch.setattr(generate_nodes, "solve", lambda s, m: nodes.CurveNodes(*_first_two(nodes.solve(s, m))))
    with mp.workdps(15):
        generate_nodes.main()
    written = capsys.readouterr().out.splitlines()
    text = files("eosmuster.saturation").joinpath("nodes.csv").read_text(encoding="utf-8").splitlines()
    expected = text[:3] + [line for i in (3, 91, 179) for line in text[i : i + 2]]
    assert written == expected


def _first_two(found):
    return (values[:, :2] for values in (found.log_pressure, found.log_liquid, found.log_vapor))

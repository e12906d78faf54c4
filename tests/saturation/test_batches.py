"""In an array of several substances a state's digits do not depend on what else is in the array.

Only then do parts of a sweep give the bytes of the whole. One substance alone may be served as its states are many.
"""

import numpy as np
import pytest

from eosmuster.components import resolve
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind
from eosmuster.saturation import prepared, solver

FIELDS = ("temperature", "pressure", "liquid_density", "vapor_density", "log_slope", "status")
COMPONENTS = resolve(["ammonia", "propane", "water", "n-decane", "helium"])


@pytest.mark.parametrize("model", ["PR", "SRK-Twu95", "PRSV", "PT", "tc-PR-2018"])
@pytest.mark.parametrize("solve", [solver.at_temperature, solver.at_pressure])
def test_states_by_themselves_and_among_others(model, solve):
    bound = bind(CATALOGUE[model], COMPONENTS).parameters
    # 200 states that lie close together, so that alone they could be served by one polynomial, and far ones near Tc
    share = np.concatenate([np.linspace(0.80, 0.801, 200), 1.0 - np.logspace(-9, -1, 80)])
    rows = np.repeat(np.arange(len(COMPONENTS)), share.size)
    critical = bound.critical_temperature if solve is solver.at_temperature else bound.critical_pressure
    values = critical[rows] * np.tile(share, len(COMPONENTS))
    among = solve(bound.take(rows), values)
    for row in range(len(COMPONENTS)):
        mine = rows == row
        alone = solve(bound.take(rows[mine]), values[mine])
        for name in FIELDS:
            a, b = getattr(alone, name), getattr(among, name)[mine]
            assert a.tobytes() == b.tobytes(), (COMPONENTS[row].name, name)


def test_the_number_of_states_of_several_substances_does_not_choose_their_tables(monkeypatch):
    monkeypatch.setattr(prepared, "_MANY", 10)
    bound = bind(CATALOGUE["PT"], COMPONENTS).parameters
    many, few = (prepared.prepare(bound.take(np.zeros(n, np.intp)), n) for n in (1000, 1))
    assert many.table is few.table
    one = bind(CATALOGUE["PT"], COMPONENTS[:1]).parameters.take(0)
    assert prepared.prepare(one, 1000).table is not prepared.prepare(one, 1).table

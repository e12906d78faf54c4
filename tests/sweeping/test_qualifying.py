"""Regions of real services against a scan of the plane that knows nothing of the search."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np
import pytest
from numpy.typing import NDArray

from eosmuster.compare.polygons import contains
from eosmuster.components import find
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind
from eosmuster.plan import builtin
from eosmuster.plan.reading import parse_plan
from eosmuster.plan.schema import Plan
from eosmuster.plan.tolerances import limit_pct
from eosmuster.record import REGION_EDGES, Record, Region
from eosmuster.singlephase import solver
from eosmuster.sources.library_states import ideal_heat_capacity, phase_boundary, single_phase
from eosmuster.sources.uncertainty import uncertainty_pct
from eosmuster.sweeping.planes import PROPERTY
from eosmuster.sweeping.run import run

Floats = NDArray[np.float64]

SERVICES = ("ammonia-compressor", "lpg-pump")
SCAN = 60
NEAR = 0.006
"""Share of the rectangle's sides: a chord or a corner that is cut off departs from the true line by 0.4 % at most."""


@dataclass(frozen=True)
class Service:
    plan: Plan
    record: Record


@pytest.fixture(scope="module", params=SERVICES)
def service(request: pytest.FixtureRequest) -> Service:
    plan = builtin.load(request.param)
    return Service(plan, run(plan))


def margin(plan: Plan, region: Region, T: Floats, p: Floats) -> Floats:
    """How far inside the acceptance limit, in percent points of the reference; NaN is not inside."""
    component, name = find(region.component), region.property
    reference = single_phase(component, T, p, region.phase, [name]).values[name]
    parameters = bind(CATALOGUE[region.candidate], [component]).parameters.take(0)
    states = solver.at_pressure(parameters, T, p, region.phase)
    predicted = PROPERTY[name](states, ideal_heat_capacity(component, T), np.array([component.molar_mass]))
    limit = limit_pct(plan.tolerances, component, name, T / component.critical_temperature, reference)
    expanded = uncertainty_pct(component, name, T, 2.0, pressure=p, remembered=False)
    return limit - np.where(np.isnan(expanded), 0.0, expanded) - np.abs(100.0 * (predicted / reference - 1.0))


def plane(plan: Plan) -> tuple[Floats, Floats]:
    grid = plan.single_phase
    assert grid is not None
    space = np.geomspace if grid.logarithmic else np.linspace
    T, p = np.meshgrid(
        np.linspace(grid.temperature[0], grid.temperature[-1], SCAN + 2)[1:-1],
        space(grid.pressure[0], grid.pressure[-1], SCAN + 2)[1:-1],
    )
    return T.ravel(), p.ravel()


def unit(plan: Plan, T: Floats, p: Floats) -> Floats:
    grid = plan.single_phase
    assert grid is not None
    scale: Callable[[Any], Floats] = np.log if grid.logarithmic else np.asarray
    low, high = scale(grid.pressure[0]), scale(grid.pressure[-1])
    span = grid.temperature[-1] - grid.temperature[0]
    return np.stack([(T - grid.temperature[0]) / span, (scale(p) - low) / (high - low)], axis=-1)


def distance(plan: Plan, region: Region, places: Floats) -> Floats:
    """Distance of places from every ring of a region, in the unit square."""
    found = np.full(len(places), np.inf)
    for ring in (region.outline, *region.holes):
        start = unit(plan, ring.temperature, ring.pressure)
        along = np.roll(start, -1, axis=0) - start
        away = places[:, None] - start
        size = np.maximum((along**2).sum(axis=-1), 1e-300)
        share = np.clip((away * along).sum(axis=-1) / size, 0.0, 1.0)
        found = np.minimum(found, np.hypot(*np.moveaxis(away - share[..., None] * along, -1, 0)).min(axis=1))
    return found


def test_a_scan_of_the_plane_finds_the_same_regions(service: Service) -> None:
    T, p = plane(service.plan)
    places = unit(service.plan, T, p)
    compared = 0
    for region in service.record.regions[:: len(service.record.regions) // 20]:
        inside = margin(service.plan, region, T, p) >= 0.0
        within = contains(region, T, p)
        clear = distance(service.plan, region, places) > NEAR
        assert inside[within & clear].all(), (region.component, region.candidate, region.property)
        if region.connected == 1:
            assert not inside[~within & clear].any(), (region.component, region.candidate, region.property)
            compared += 1
        assert region.share == pytest.approx(within.mean(), abs=2.0 / SCAN)
    assert compared >= 10


def test_where_a_limit_ends_a_region_the_deviation_is_the_limit(service: Service) -> None:
    """1e-6 of the limit, as it is located."""
    checked = 0
    for region in service.record.regions:
        ring = region.outline
        at_limit = np.array([reason == "limit" for reason in ring.reasons])
        if region.property == "density" and at_limit.any():
            T, p = ring.temperature[at_limit], ring.pressure[at_limit]
            found = margin(service.plan, region, T, p)
            known = ~np.isnan(found)  # a vertex that lies on the phase boundary as well may have lost its phase
            assert known.mean() > 0.9
            assert np.abs(found[known]).max() < 1e-6 * 3.0
            checked += int(known.sum())
    assert checked > 50


def test_edges_at_the_phase_boundary_follow_the_vapor_pressure(service: Service) -> None:
    checked = 0
    for region in service.record.regions:
        ring = region.outline
        assert set(ring.reasons) <= set(REGION_EDGES)
        at_boundary = np.array([reason == "phase_boundary" for reason in ring.reasons])
        T, p = ring.temperature[at_boundary], ring.pressure[at_boundary]
        curve = phase_boundary(find(region.component), T)
        apart = unit(service.plan, T, p)[:, 1] - unit(service.plan, T, curve)[:, 1]
        assert np.nanmax(np.abs(apart), initial=0.0) <= NEAR
        # above the critical point there is no curve: the boundary is the critical isotherm
        assert T[np.isnan(curve)] == pytest.approx(find(region.component).critical_temperature, rel=1e-4)
        checked += at_boundary.sum()
    assert checked > 50


def test_every_candidate_that_is_inside_anywhere_has_one_region(service: Service) -> None:
    keys = [(r.component, r.candidate, r.property) for r in service.record.regions]
    assert len(set(keys)) == len(keys)
    inside = {(r.component, r.candidate, r.property) for r in service.record.summary if r.inside > 3}
    assert inside <= set(keys)
    whole = [r for r in service.record.summary if r.verdict == "inside"]
    by_key = dict(zip(keys, service.record.regions, strict=True))
    for row in whole:
        reasons = set(by_key[row.component, row.candidate, row.property].outline.reasons)
        assert reasons <= {"plan_limit", "phase_boundary", "limit"}


def test_components_side_by_side_have_the_regions_that_each_has_alone(monkeypatch: pytest.MonkeyPatch) -> None:
    plan = parse_plan(
        """
        components = ["propane", "ammonia", "methane"]
        models = ["PR", "RKPR"]
        properties = ["density", "speed_of_sound"]
        [states.single_phase]
        temperature = { from = "220 K", to = "420 K", points = 5 }
        pressure = { from = "2 bar", to = "60 bar", points = 5 }
        [references]
        use = ["coolprop"]
        """,
        "x",
        "x",
    )
    together = run(plan).regions
    monkeypatch.setattr("eosmuster.sweeping.qualifying._TOGETHER", 1)
    alone = run(plan).regions
    assert len(together) > 6
    assert [numbers(r) for r in together] == [numbers(r) for r in alone]


def numbers(region: Region) -> tuple[object, ...]:
    rings = [(r.temperature.tolist(), r.pressure.tolist(), r.reasons) for r in (region.outline, *region.holes)]
    return region.component, region.candidate, region.property, region.share, region.connected, rings

"""Windows of random smooth deviations against an independent dense scan, and what they cost."""

import numpy as np
import pytest

from eosmuster.compare.axis import Axis
from eosmuster.compare.traces import Trace
from eosmuster.compare.windows import find_windows

LOW, HIGH, SCAN = 150.0, 370.0, 100_000


def random_deviation(rng):
    """A trend and a few waves, none shorter than ten states, with the pole-like rise of cubics near the end."""
    wave = rng.uniform(50.0, 400.0, 4)
    phase, size = rng.uniform(0, 2 * np.pi, 4), rng.normal(0, 1.2, 4)
    slope, shift, rise = rng.normal(0, 0.01), rng.normal(0, 1.0), rng.normal(0, 1.0)

    def f(t):
        t = np.asarray(t)[..., None]
        waves = (size * np.sin(2 * np.pi * t / wave + phase)).sum(axis=-1)
        t = t[..., 0]
        return waves + shift + slope * (t - 260.0) + rise * 10.0 / (378.0 - t)

    return f


def blocks(rng, count, candidates):
    limits = rng.uniform(0.5, 3.0, (count, 2))
    return (
        [[random_deviation(rng) for _ in range(candidates)] for _ in range(count)],
        limits,
        rng.uniform(250, 350, count),
    )


@pytest.fixture(scope="module")
def world():
    rng = np.random.default_rng(20)
    functions, limits, steps = blocks(rng, 20, 10)
    count = {"points": 0, "calls": 0}

    def limit(block, t):
        return np.where(np.asarray(t) < steps[block], limits[block, 0], limits[block, 1])

    def evaluate(block, row, t):
        count["points"] += len(t)
        count["calls"] += 1
        d = np.array([functions[b][r](x) for b, r, x in zip(block, row, t, strict=True)])
        return d, limit(block, t)

    states = np.linspace(LOW, HIGH, 45)
    traces = []
    for b, fs in enumerate(functions):
        axis = Axis.of(states, [(steps[b], "limit_step")])
        d = np.array([f(axis.temperature) for f in fs])
        names = tuple(f"m{i}" for i in range(len(fs)))
        no = np.zeros(d.shape, bool)
        traces.append(Trace(f"c{b}", "p", "own", names, axis, d, limit(b, axis.lookup), no, np.full(len(fs), np.inf)))
    rows = find_windows(traces, evaluate)
    return functions, limit, steps, rows, count


def scanned(inside, t):
    """First and last inside temperature of each run of the scan."""
    change = np.diff(np.concatenate([[0], inside.astype(int), [0]]))
    return t[np.flatnonzero(change == 1)], t[np.flatnonzero(change == -1) - 1]


def test_a_dense_scan_finds_the_same_windows(world):
    functions, limit, _, rows, _ = world
    t = np.linspace(LOW, HIGH, SCAN)
    gap = t[1] - t[0]
    total = 0
    for b, fs in enumerate(functions):
        for r, f in enumerate(fs):
            starts, stops = scanned(np.abs(f(t)) <= limit(b, t), t)
            mine = [w for w in rows if (w.component, w.candidate) == (f"c{b}", f"m{r}")]
            # a window between two scanned temperatures is real, and the scan cannot see it
            mine = [w for w in mine if np.searchsorted(t, w.from_K) < np.searchsorted(t, w.to_K, side="right")]
            assert len(mine) == len(starts), (b, r, mine, starts, stops)
            for w, start, stop in zip(mine, starts, stops, strict=True):
                assert start - gap - 1e-6 <= w.from_K <= start + 1e-9
                assert stop - 1e-9 <= w.to_K <= stop + gap + 1e-6
            total += len(mine)
    assert total > 200, total


def test_every_limit_end_is_at_the_limit(world):
    functions, limit, steps, rows, _ = world
    checked = 0
    for w in rows:
        b, r = int(w.component[1:]), int(w.candidate[1:])
        for t, kind in ((w.from_K, w.from_end), (w.to_K, w.to_end)):
            if kind == "limit":
                assert abs(functions[b][r](t)) == pytest.approx(float(limit(b, t)), rel=1e-6)
                assert abs(functions[b][r](t)) <= limit(b, t)
                checked += 1
            elif kind == "limit_step":
                assert t == steps[b]
            else:
                assert (t, kind) in {(LOW, "plan_limit"), (HIGH, "plan_limit")}
    assert checked > 300, checked


def test_ends_cost_few_evaluations_in_few_batches(world):
    *_, rows, count = world
    ends = sum((w.from_end == "limit") + (w.to_end == "limit") for w in rows)
    print(f"{count['points']} evaluations in {count['calls']} batches for {ends} ends")
    assert count["points"] < 6 * ends, (count, ends)
    assert count["calls"] < 30, count

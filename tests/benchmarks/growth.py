"""Growth of time and peak memory over four sizes, beyond start-up.

    python tests/benchmarks/growth.py [--quick]

Sweeps: the whole catalogue's plan (see catalogue.py) with 20, 50, 100 and 200 states a fluid, ten times the points
from first to last. Each size runs in a forked copy of this process, in which everything that is loaded, built or
opened once is there already: a first sweep of two states a fluid has seen to that. Taken are processor time, and how
far the memory of the copy grew beyond that of a copy that sweeps two states; with ``points.csv`` and without.

Kernel: one model, one substance, 10,000 to 10,000,000 temperatures; time a point, and the memory it takes beyond its
own results, which is to stay flat.
"""

from __future__ import annotations

import tempfile
import time
import tracemalloc
from functools import partial
from pathlib import Path
from statistics import median

import measuring
import numpy as np
import plans
from measuring import Usage, alternating, figure, ratio, seconds

from eosmuster.api import sweep
from eosmuster.components import find
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind
from eosmuster.plan.reading import parse_plan
from eosmuster.saturation import solver

SMALLEST = 2
"""States a fluid of the sweep that stands for start-up."""


def run(text: str, points: bool) -> int:
    """Sweep a plan and save; the number of points."""
    results = sweep(parse_plan(text, "growth", "growth"))
    with tempfile.TemporaryDirectory() as folder:
        results.save(Path(folder) / "out", points=points, dossier=False)
    return sum(block.verdict.size for block in results.record.blocks)


def sweeps(quick: bool) -> None:
    sizes = (3, 5, 10, 30) if quick else (20, 50, 100, 200)
    plan = plans.two_fluids if quick else plans.whole_catalogue
    for points, label in ((True, "with points.csv"), (False, "without points.csv")):
        run(plan(SMALLEST), points)
        usages: dict[int, list[Usage]] = {size: [] for size in (SMALLEST, *sizes)}

        def measure(size: int, points: bool = points, usages: dict[int, list[Usage]] = usages) -> float:
            usages[size].append(measuring.forked(lambda: run(plan(size), points)))
            return usages[size][-1].seconds

        works = {str(size): partial(measure, size) for size in usages}
        times = alternating(works, rounds=1 if quick else 5, warm=False)
        counts = {size: int(usages[size][0].output) for size in sizes}
        peaks = {size: median(usage.megabytes for usage in usages[size]) for size in usages}
        first = sizes[0]
        for size in sizes:
            memory = peaks[size] - peaks[SMALLEST]
            figure(
                f"sweep {label}, {counts[size]} points",
                f"{seconds(times[str(size)])}, {ratio(times, str(size), str(first)):.3g} x the work of the smallest",
                f"{counts[size] / counts[first]:.3g} x its points; memory grows by {memory:.0f} MB, "
                f"{memory * 1e6 / counts[size]:.0f} bytes a point",
                "10.5 x" if size == 10 * first else "",
            )


def kernel(quick: bool) -> None:
    parameters = bind(CATALOGUE["PR"], [find("propane")]).parameters.take(0)
    tc = float(parameters.critical_temperature)
    for solve in (solver.at_temperature, solver.at_pressure):
        for power in (2, 3) if quick else (4, 5, 6, 7):
            given = np.linspace(0.45, 0.98, 10**power) * tc
            if solve is solver.at_pressure:
                given = solver.at_temperature(parameters, given, slope=False).pressure
            solve(parameters, given, slope=False)
            start = time.process_time()
            solve(parameters, given, slope=False)
            taken = time.process_time() - start
            tracemalloc.start()
            found = solve(parameters, given, slope=False)
            peak = tracemalloc.get_traced_memory()[1]
            tracemalloc.stop()
            arrays = (found.temperature, found.pressure, found.liquid_density, found.vapor_density, found.tau)
            own = sum(a.nbytes for a in arrays if not np.shares_memory(a, given)) + found.status.nbytes
            figure(
                f"kernel {solve.__name__}, 10^{power} states",
                f"{taken / given.size * 1e9:.3g} ns a point",
                f"{(peak - own) / 1e6:.2f} MB of memory beyond its results of {own / 1e6:.3g} MB",
            )


def main() -> None:
    quick = measuring.asked_to_be_quick(__doc__)
    kernel(quick)
    sweeps(quick)


if __name__ == "__main__":
    main()

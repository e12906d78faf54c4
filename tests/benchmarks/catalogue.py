"""The whole catalogue in one plan: processor time, peak memory, number of points.

    python tests/benchmarks/catalogue.py [--quick]

Every pure fluid x every model x 200 temperatures x the five saturation properties, against the reference library, as
a whole command in an empty temporary folder: with ``points.csv`` (more than half a gigabyte) and without it
(`--points none`), beside the same imports as in whole_command.py. Points are counted in ``summary.csv``.
"""

from __future__ import annotations

import csv
import tempfile
from functools import partial
from pathlib import Path
from statistics import median

import measuring
import plans
from measuring import EOSMUSTER, Times, Usage, alternating, figure, ratio, seconds

TARGETS = {"all": "25 s and 1 GB", "none": "8 s"}
PAGE = {"all": (), "none": ("--dossier", "no")}
"""Everything, and the rows alone."""


def swept(text: str, points: str) -> tuple[Usage, int, float]:
    """Sweep a plan as a whole command; also the number of points, and the size of what was written in MB."""
    with tempfile.TemporaryDirectory() as folder:
        Path(folder, "plan.toml").write_text(text, encoding="utf-8")
        asked = ["--out", "out", "--points", points, *PAGE[points]]
        usage = measuring.child([*EOSMUSTER, "sweep", "plan.toml", *asked], folder)
        with Path(folder, "out", "summary.csv").open(encoding="utf-8", newline="") as file:
            count = sum(int(row["points"]) for row in csv.DictReader(file))
        return usage, count, sum(path.stat().st_size for path in Path(folder, "out").iterdir()) / 1e6


def main() -> None:
    quick = measuring.asked_to_be_quick(__doc__)
    text = plans.two_fluids(5) if quick else plans.whole_catalogue(200)
    last: dict[str, tuple[Usage, int, float]] = {}
    peaks: Times = {points: [] for points in TARGETS}

    def measure(points: str) -> float:
        last[points] = swept(text, points)
        peaks[points].append(last[points][0].megabytes)
        return last[points][0].seconds

    def imports() -> float:
        return measuring.child(plans.imports(quick)).seconds

    tasks = {points: partial(measure, points) for points in TARGETS}
    times = alternating(tasks | {"imports": imports}, rounds=1 if quick else 5, warm=False)
    for points, target in TARGETS.items():
        _, count, megabytes = last[points]
        beyond = median(a - b for a, b in zip(times[points], times["imports"], strict=True))
        figure(
            " ".join(["whole catalogue, --points", points, *PAGE[points]]),
            f"{seconds(times[points])}, {median(peaks[points]):.0f} MB at the peak",
            f"{count} points, {megabytes:.0f} MB written; {ratio(times, points, 'imports'):.3g} x the "
            f"{seconds(times['imports'])} of the imports, {beyond / count * 1e9:.0f} ns a point beyond them",
            target,
        )


if __name__ == "__main__":
    main()

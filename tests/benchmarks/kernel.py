"""Speed of the saturation kernel, side by side with what people use today.

    python tests/benchmarks/kernel.py [--quick]

Arrays of a million temperatures between 0.45 and 0.98 of the critical temperature, ordered and shuffled; pressure
and both densities; the alpha function and the allocation of the results are included, the tables of the curves are
made beforehand (what that takes is printed first). Against

- CoolProp's own cubic back end through its low-level interface, in a loop over 5,000 states: one flash, then the
  pressure and both saturated densities. Its `fast_evaluate` over arrays is not implemented for cubic back ends.
- the usual root-finder loop: scipy's brentq on equal fugacities, 200 states.
- the bare cost of one exp and one log a point, over blocks that stay in the processor's cache.

The inverse T(p) is compared with flashes at a given pressure, in the same way. All of it on one component (a line
apart shows many components in one array, as in a sweep), by the processor time of one thread; what is compared takes
turns. The last lines give the slowest and the fastest model of each kind.
"""

from __future__ import annotations

import math
import time
from collections.abc import Callable
from functools import partial

import measuring
import numpy as np
from measuring import Task, figure, interleaved, nanoseconds, ratio

from eosmuster.components import catalogue, find
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import Parameters, bind
from eosmuster.saturation import solver
from eosmuster.saturation.prepared import prepare

COMPONENT = "propane"
REDUCED = (0.45, 0.98)
BLOCK = 4096
GAS_CONSTANT = 8.31446261815324


def parameters_of(name: str) -> Parameters:
    return bind(CATALOGUE[name], [find(COMPONENT)]).parameters.take(0)


def is_two_parameter(name: str) -> bool:
    """Whether unlike components share one form."""
    p = bind(CATALOGUE[name], [find("propane"), find("water")]).parameters
    return len(set(zip(p.s.tolist(), p.m.tolist(), strict=True))) == 1


def target_of(name: str, use: str) -> str:
    if use.startswith("T(p)"):
        return "15 x"
    if "slope" in use:
        return ""
    if not is_two_parameter(name):
        return "10 x"
    return {"ordered": "40 x", "shuffled": "25 x"}[use]


def flashes(back_end: str, points: int, by_pressure: bool = False) -> Task:
    """A loop over CoolProp's cubic back end."""
    from CoolProp import CoolProp

    state = CoolProp.AbstractState(back_end, COMPONENT)
    temperature = np.random.default_rng(1).uniform(*REDUCED, points) * state.T_critical()
    update, pair, molar = state.update, CoolProp.QT_INPUTS, CoolProp.iDmolar
    first, liquid, vapor = state.p, state.saturated_liquid_keyed_output, state.saturated_vapor_keyed_output
    given = [(0.5, t) for t in temperature.tolist()]
    if by_pressure:
        first, pair = state.T, CoolProp.PQ_INPUTS
        states = solver.at_temperature(parameters_of("PR"), temperature)
        given = [(p, 0.5) for p in states.pressure.tolist()]

    def loop() -> None:
        for a, b in given:
            update(pair, a, b)
            first()
            liquid(molar)
            vapor(molar)

    return Task(loop, points)


def by_numpy(c2: float, c1: float, c0: float) -> list[float]:
    """Real roots of a monic cubic, the usual way."""
    return sorted(z.real for z in np.roots([1.0, c2, c1, c0]).tolist() if abs(z.imag) < 1e-9)


def by_formula(c2: float, c1: float, c0: float) -> list[float]:
    """Real roots of a monic cubic by Vieta's trigonometric formula, and Cardano's for a single one."""
    shift, q = c2 / 3.0, (c2 * c2 - 3.0 * c1) / 9.0
    r = (2.0 * c2**3 - 9.0 * c2 * c1 + 27.0 * c0) / 54.0
    if r * r < q**3:
        angle, size = math.acos(r / math.sqrt(q**3)) / 3.0, -2.0 * math.sqrt(q)
        return sorted(size * math.cos(angle + 2.0 * math.pi * k / 3.0) - shift for k in range(3))
    big = -math.copysign((abs(r) + math.sqrt(r * r - q**3)) ** (1.0 / 3.0), r)
    return [big + (q / big if big else 0.0) - shift]


def brentq_loop(points: int, cubic: Callable[[float, float, float], list[float]]) -> Task:
    """Peng and Robinson's equation as it is usually programmed: roots of the cubic, equal fugacities, brentq."""
    from scipy.optimize import brentq

    c = find(COMPONENT)
    tc, pc, omega = c.critical_temperature, c.critical_pressure, c.acentric_factor
    m = 0.37464 + 1.54226 * omega - 0.26992 * omega**2
    root2 = math.sqrt(2.0)

    def roots(t: float, p: float) -> tuple[float, float, float, float]:
        alpha = (1.0 + m * (1.0 - math.sqrt(t / tc))) ** 2
        a = 0.4572355289 * alpha * (tc / t) ** 2 * (p / pc)
        b = 0.0777960739 * (tc / t) * (p / pc)
        real = cubic(b - 1.0, a - 3.0 * b * b - 2.0 * b, b**3 + b * b - a * b)
        return (real[0] if real[0] > b else real[-1]), real[-1], a, b

    def log_fugacity(z: float, a: float, b: float) -> float:
        attraction = math.log((z + (1.0 + root2) * b) / (z + (1.0 - root2) * b)) / (2.0 * root2)
        return z - 1.0 - math.log(z - b) - a / b * attraction

    def difference(p: float, t: float) -> float:
        liquid, vapor, a, b = roots(t, p)
        return log_fugacity(liquid, a, b) - log_fugacity(vapor, a, b)

    def pressure(t: float) -> float:
        low = high = pc * 10.0 ** (7.0 / 3.0 * (1.0 + omega) * (1.0 - tc / t))
        while difference(low, t) <= 0.0:  # below the saturation pressure the liquid's fugacity is the larger one
            low *= 0.95
        while difference(high, t) > 0.0:
            high *= 1.05
        return float(brentq(difference, low, high, args=(t,), xtol=1e-9 * low, rtol=1e-9))

    temperature = np.random.default_rng(2).uniform(REDUCED[0], 0.95, points) * tc

    def loop() -> list[tuple[float, float, float]]:
        found = []
        for t in temperature.tolist():
            p = pressure(t)
            liquid, vapor, _, _ = roots(t, p)
            found.append((p, p / (liquid * GAS_CONSTANT * t), p / (vapor * GAS_CONSTANT * t)))
        return found

    return Task(loop, points)


def exp_and_log(points: int) -> Task:
    x = np.random.default_rng(3).uniform(0.5, 2.0, points)
    out = np.empty(BLOCK)

    def work() -> None:
        for i in range(0, points, BLOCK):
            piece = x[i : i + BLOCK]
            np.exp(piece, out=out[: piece.size])
            np.log(piece, out=out[: piece.size])

    return Task(work, points)


def kernel_tasks(parameters: Parameters, points: int) -> dict[str, Task]:
    """The five uses of the kernel that are timed."""
    tc = float(parameters.critical_temperature)
    ordered = np.linspace(*REDUCED, points) * tc
    shuffled = np.random.default_rng(4).permutation(ordered)
    pressures = {
        name: solver.at_temperature(parameters, t, slope=False).pressure
        for name, t in (("ordered", ordered), ("shuffled", shuffled))
    }

    def task(solve: Callable[..., object], given: object, slope: bool) -> Task:
        return Task(lambda: solve(parameters, given, slope=slope), points)

    return {
        "ordered": task(solver.at_temperature, ordered, False),
        "shuffled": task(solver.at_temperature, shuffled, False),
        "with slope, ordered": task(solver.at_temperature, ordered, True),
        "T(p), ordered": task(solver.at_pressure, pressures["ordered"], False),
        "T(p), shuffled": task(solver.at_pressure, pressures["shuffled"], False),
    }


def first_use(quick: bool) -> None:
    """What the first call takes: the shipped curves, and those made on demand."""
    for name in ("PR", "PT"):
        parameters = parameters_of(name)
        start = time.process_time()
        prepare(parameters, 1000 if quick else 1_000_000)
        taken = time.process_time() - start
        figure(f"curve tables of {name}, first use", f"{taken * 1e3:.3g} ms", "once a process; not in what follows")


def compared(name: str, sizes: tuple[int, int, int]) -> dict[str, float]:
    """Print a model's lines; give how many times as fast as CoolProp's Peng-Robinson back end it is."""
    points, loop_points, rounds = sizes
    parameters = parameters_of(name)
    kernel = kernel_tasks(parameters, points)
    back_ends = {"at T": flashes("PR", loop_points), "at p": flashes("PR", loop_points, by_pressure=True)}
    times = interleaved(back_ends | kernel | {"exp and log": exp_and_log(points)}, rounds)
    found = {}
    for use in kernel:
        other = "at p" if use.startswith("T(p)") else "at T"
        found[use] = ratio(times, other, use)
        bare = ratio(times, use, "exp and log")
        figure(
            f"{name}, {use}",
            f"{nanoseconds(times[use])} a point, {found[use]:.3g} x as fast",
            f"CoolProp PR {nanoseconds(times[other])}; {bare:.3g} x the cost of exp and log, "
            f"{nanoseconds(times['exp and log'])}",
            target_of(name, use),
        )
    return found


def many_components(quick: bool) -> None:
    """A model's whole catalogue of components in one array, as a sweep asks for it."""
    components, states = list(catalogue().values())[:: 40 if quick else 1], 10 if quick else 500
    for name in ("PR", "PT"):
        bound = bind(CATALOGUE[name], components).parameters
        rows = np.repeat(np.arange(len(components)), states)
        parameters = bound.take(rows)
        temperature = np.tile(np.linspace(*REDUCED, states), len(components)) * parameters.critical_temperature
        pressure = solver.at_temperature(parameters, temperature, slope=False).pressure
        tasks = {
            "p(T)": Task(partial(solver.at_temperature, parameters, temperature, slope=False), rows.size),
            "T(p)": Task(partial(solver.at_pressure, parameters, pressure, slope=False), rows.size),
            "back end": flashes("PR", 50 if quick else 5_000),
        }
        times = interleaved(tasks, 1 if quick else 7)
        for use in ("p(T)", "T(p)"):
            figure(
                f"{name}, {len(components)} components x {states} states in one array, {use}",
                f"{nanoseconds(times[use])} a point, {ratio(times, 'back end', use):.3g} x as fast",
                f"CoolProp PR {nanoseconds(times['back end'])} at given T",
            )


def usual_ways(quick: bool) -> None:
    """SRK against its own back end, and Peng-Robinson against the root-finder loop."""
    points, states, rounds = (20_000, 100, 2) if quick else (1_000_000, 5_000, 9)
    for name in ("PR", "SRK"):
        tasks = {use: task for use, task in kernel_tasks(parameters_of(name), points).items() if "slope" not in use}
        times = interleaved({"back end": flashes(name, states)} | tasks, rounds)
        for use in ("ordered", "shuffled"):
            figure(
                f"{name}, {use}, against CoolProp's {name} back end",
                f"{ratio(times, 'back end', use):.3g} x as fast",
                f"{nanoseconds(times['back end'])} beside {nanoseconds(times[use])}",
            )
    for way, cubic in (("numpy.roots", by_numpy), ("the cubic by formula", by_formula)):
        loop = brentq_loop(5 if quick else 200, cubic)
        times = interleaved({"loop": loop, "kernel": kernel_tasks(parameters_of("PR"), points)["ordered"]}, 3)
        figure(
            f"PR, ordered, against a brentq loop with {way}",
            f"{ratio(times, 'loop', 'kernel'):.4g} x as fast",
            f"{nanoseconds(times['loop'])} beside {nanoseconds(times['kernel'])}",
        )


def main() -> None:
    quick = measuring.asked_to_be_quick(__doc__)
    sizes = (20_000, 50, 1) if quick else (1_000_000, 5_000, 7)
    names = ["PR", "PT"] if quick else list(CATALOGUE)
    first_use(quick)
    found = {name: compared(name, sizes) for name in names}
    many_components(quick)
    usual_ways(quick)
    summary(found)


def summary(found: dict[str, dict[str, float]]) -> None:
    """The slowest and the fastest model of each kind."""
    for kind, wanted in (("two-parameter", True), ("three-parameter", False)):
        names = [name for name in found if is_two_parameter(name) is wanted]
        for use in ("ordered", "shuffled", "T(p), ordered", "T(p), shuffled"):
            ranked = sorted(names, key=lambda name: found[name][use])
            figure(
                f"{len(names)} {kind} models, {use}",
                f"{found[ranked[0]][use]:.3g} x to {found[ranked[-1]][use]:.3g} x as fast",
                f"{ranked[0]} and {ranked[-1]}, against CoolProp's PR back end",
                target_of(ranked[0], use),
            )


if __name__ == "__main__":
    main()

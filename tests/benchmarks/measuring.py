"""What the benchmark scripts share: one thread, interleaved timing, child processes, one line a figure.

Import it before numpy: it keeps numerical libraries to one thread, and they read that when they are loaded.
Machines are noisy, so nothing is compared across runs: tasks take turns (A B C A B C ...), every round gives its
own ratio, and the median of these is the figure.
"""

from __future__ import annotations

import argparse
import os
import platform
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from functools import partial
from importlib.metadata import version
from pathlib import Path
from statistics import median

THREADS = ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS", "VECLIB_MAXIMUM_THREADS")
# children that are whole commands run as a user's shell would run them, bytecode kept as an installation keeps it
AS_STARTED = {name: value for name, value in os.environ.items() if name != "PYTHONDONTWRITEBYTECODE"}
if "numpy" in sys.modules and any(os.environ.get(name) != "1" for name in THREADS):
    raise ImportError("import measuring before numpy: it sets the number of threads to one")
os.environ.update(dict.fromkeys(THREADS, "1"))

EOSMUSTER = (sys.executable, "-m", "eosmuster")

Times = dict[str, list[float]]


@dataclass(frozen=True)
class Task:
    """Work, and the number of points it does at a time."""

    work: Callable[[], object]
    points: int = 1


@dataclass(frozen=True)
class Usage:
    """What a child process took: processor time (user + system), peak memory, and what it printed."""

    seconds: float
    megabytes: float
    output: str


def asked_to_be_quick(about: str | None) -> bool:
    """Read the command line: `--quick` proves only that a script works."""
    parser = argparse.ArgumentParser(description=about, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--quick", action="store_true", help="a tiny run: proves that the script works, no more")
    return bool(parser.parse_args().quick)


def alternating(measurements: Mapping[str, Callable[[], float]], rounds: int, *, warm: bool = True) -> Times:
    """Take measurements in turns, round by round; a first round warms up and is not counted."""
    if warm:
        for measure in measurements.values():
            measure()
    times: Times = {name: [] for name in measurements}
    for _ in range(rounds):
        for name, measure in measurements.items():
            times[name].append(measure())
    return times


def interleaved(tasks: Mapping[str, Task], rounds: int) -> Times:
    """Processor seconds a point of each task, in turns."""

    def timed(task: Task) -> float:
        start = time.process_time()
        task.work()
        return (time.process_time() - start) / task.points

    return alternating({name: partial(timed, task) for name, task in tasks.items()}, rounds)


def ratio(times: Mapping[str, Sequence[float]], above: str, below: str) -> float:
    """Median of the ratios of the rounds: how many times as much `above` takes as `below`."""
    return median(a / b for a, b in zip(times[above], times[below], strict=True))


def seconds(times: Sequence[float]) -> str:
    """Median, in s."""
    return f"{median(times):.3g} s"


def nanoseconds(times: Sequence[float]) -> str:
    """Median, in ns."""
    return f"{median(times) * 1e9:.4g} ns"


def figure(name: str, value: str, against: str = "", target: str = "") -> None:
    """Print one line: the figure, what it is compared with, and the target of the issue for the reader."""
    line = f"{name}: {value}"
    if against:
        line += f" ({against})"
    if target:
        line += f" [target: {target}]"
    print(line, flush=True)


def child(command: Sequence[str], folder: str | Path | None = None, *, statuses: Sequence[int] = (0,)) -> Usage:
    """Run a command to its end, with the environment this process was started in."""
    with tempfile.TemporaryFile() as said:
        process = subprocess.Popen(command, cwd=folder, env=AS_STARTED, stdout=said, stderr=subprocess.STDOUT)
        _, status, used = os.wait4(process.pid, 0)
        process.returncode = os.waitstatus_to_exitcode(status)
        said.seek(0)
        output = said.read().decode(errors="replace")
    if process.returncode not in statuses:
        raise SystemExit(f"{' '.join(command)} ended with {process.returncode}:\n{output}")
    return Usage(used.ru_utime + used.ru_stime, _megabytes(used.ru_maxrss), output)


def forked(work: Callable[[], object]) -> Usage:
    """Run work in a copy of this process: its processor time, the copy's peak memory, and what the work returns."""
    sys.stdout.flush()
    reader, writer = os.pipe()
    pid = os.fork()
    if pid == 0:
        try:
            os.write(writer, str(work()).encode())
        except BaseException as error:
            print(f"{type(error).__name__}: {error}", file=sys.stderr, flush=True)
            os._exit(1)
        os._exit(0)
    os.close(writer)
    with os.fdopen(reader) as answer:
        returned = answer.read()
    _, status, used = os.wait4(pid, 0)
    if status:
        raise SystemExit("the work in a forked process failed; see above")
    return Usage(used.ru_utime + used.ru_stime, _megabytes(used.ru_maxrss), returned)


def _megabytes(maxrss: int) -> float:
    return maxrss / (1024.0**2 if sys.platform == "darwin" else 1024.0)


def machine() -> list[str]:
    """Describe where the figures come from, for those who read them elsewhere."""
    packages = ", ".join(f"{name} {version(name)}" for name in ("numpy", "scipy", "pandas", "CoolProp"))
    return [
        f"processor: {_processor()}, {os.cpu_count()} cores; one thread is used",
        f"system: {platform.system()} {platform.release()} {platform.machine()}, {_memory()} of memory",
        f"Python {platform.python_version()}, {packages}",
    ]


def _processor() -> str:
    try:
        lines = Path("/proc/cpuinfo").read_text().splitlines()
    except OSError:
        return platform.processor() or platform.machine()
    parts = (line.partition(":") for line in lines)
    about = {key.strip(): value.strip() for key, _, value in parts}
    name, family, model = (about.get(key, "?") for key in ("model name", "cpu family", "model"))
    return f"{name} (family {family}, model {model})"


def _memory() -> str:
    try:
        return f"{os.sysconf('SC_PAGE_SIZE') * os.sysconf('SC_PHYS_PAGES') / 1e9:.0f} GB"
    except (ValueError, OSError):
        return "an unknown amount"

"""Mutated files for the readers of measured data: no crash, no hang, no point that does not stand in the file.

    python tests/fuzz/fuzz_readers.py [--inputs 20000] [--seed 1]

Half of the inputs are ThermoML, half laboratory CSV, each an invented file changed in one to six places. Every point
that comes out is held against a second, simple reading of the same bytes (oracle.py). The test run does some
hundreds of the same with hypothesis (test_readers.py).
"""

from __future__ import annotations

import argparse
import io
import random
import re
from collections import Counter
from pathlib import Path
from time import process_time

import oracle

from eosmuster.errors import InputError
from eosmuster.sources.laboratory import reader as laboratory
from eosmuster.sources.measured.repeats import combined
from eosmuster.sources.measured.table import Reading
from eosmuster.sources.thermoml import reader as thermoml
from eosmuster.sources.thermoml.shape import BLOCK, ROW, Shape, nodes
from eosmuster.sources.thermoml.stream import read_parts

FIXTURES = Path(__file__).resolve().parents[1] / "sources" / "fixtures" / "thermoml"
THERMOML = [path.read_bytes() for path in sorted(FIXTURES.glob("*.xml"))]
LABORATORY = [
    b"component,temperature [degC],saturation_pressure [kPa],u(saturation_pressure) [kPa],method\n"
    b"propane,20.00,836.4,0.3,cell\nR290,40.00,1369.4,0.3,cell\nbutane,20.00,208.1,0.2,\npropane,60.00,2116.8,0.5,cell\n",
    b"# invented\ncomponent;phase;temperature [K];pressure [MPa];density [kg/m3];U(density, k=2) [%]\n"
    b"water;liquid;300;0.1;996.6;0.01\nwater;vapor;500;1.0;4.53;0.1\n\nmethane;fluid;250;5;47.0;0.05\n",
    b"fluid\ttemperature [K]\tpressure [bar]\tliquid_density [mol/m3]\tvapour density [kg/m3]\t"
    b"boiling temperature [K]\n"
    b"ethane\t250\t13.0\t15500\t\t250.0\nethane\t270\t\t14100\t41.2\t\n74-84-0\t290\t\t12000\t77.1\t\n",
]
SLOWEST = 5.0
"""Seconds of processor time that no input may take."""

PIECES = (
    *(
        b"",
        b" ",
        b"\n",
        b"0",
        b"-1",
        b"1e999",
        b"nan",
        b"12,5",
        b"1.234.567",
        b"1'000",
        b"1_0",
        b"\xff",
        b"\0",
        b"\xef\xbb\xbf",
    ),
    *(
        b"<",
        b">",
        b"&",
        b"&amp;",
        b"&lol;",
        b"<!-- -->",
        b"<![CDATA[5]]>",
        b"<!DOCTYPE x>",
        b"<x>",
        b"</x>",
        b"<x/>",
        b"<?p?>",
    ),
    *(
        b",",
        b";",
        b"\t",
        b"|",
        b'"',
        b"'",
        b"#",
        b"[",
        b"]",
        b"[K]",
        b"[psi]",
        b"[barg]",
        b"k=2",
        b"propane",
        b"Liquid",
        b"Gas",
    ),
    *(
        b"Crystal",
        b"Upper temperature, K",
        b"Mole fraction",
        b"Mass density, kg/m3",
        b"\xc2\xb0C",
        b"\xd9\xa3",
        b"5" * 400,
    ),
)
BYTES = ("insert", "replace", "delete", "double", "swap", "cut", "line")
TOKENS = ("number", "element", "part")
OPERATIONS = (*BYTES, *TOKENS)
"""Operations on bytes mostly break a file's form, those on tokens mostly keep it."""

Mutation = tuple[str, float, float, int]
"""What is done, where (two places as shares of the length), and with which piece."""


def mutated(data: bytes, mutations: list[Mutation]) -> bytes:
    """Change bytes in a few places."""
    for operation, first, second, piece in mutations:
        data = _changed(data, operation, first, second, PIECES[piece % len(PIECES)])
    return data


def _changed(data: bytes, operation: str, first: float, second: float, piece: bytes) -> bytes:
    a, length = int(first * len(data)), int(second * 60)
    b = min(a + length, len(data))
    if operation in PATTERNS:
        return _token_changed(data, operation, first, second, piece)
    return {
        "insert": lambda: data[:a] + piece + data[a:],
        "replace": lambda: data[:a] + piece + data[b:],
        "delete": lambda: data[:a] + data[b:],
        "double": lambda: data[:b] + data[a:],
        "swap": lambda: data[:a] + data[b : b + length] + data[a:b] + data[b + length :],
        "cut": lambda: data[:a] if second < 0.2 else data,
    }[operation]()


PATTERNS = {
    "number": rb"(?<=>)[\d.eE+-]+(?=<)|(?<=[,;\t])[\d.]+(?=[,;\t\r\n])",
    "element": rb"<(\w+)>[^<]*</\1>",
    "part": rb"(?s)<(NumValues|Property|Variable|Constraint|PhaseID|Comp\w+|\w+Value|\w+Uncertainty)>.*?</\1>",
    "line": rb"[^\n]*\n",
}


def _token_changed(data: bytes, kind: str, first: float, second: float, piece: bytes) -> bytes:
    """Change a whole number, element, part or line: to the piece, to another one of the file, or to nothing."""
    found = list(re.finditer(PATTERNS[kind], data))
    if not found:
        return data
    one = found[int(first * len(found)) % len(found)]
    other = found[int(second * len(found)) % len(found)][0]
    new = (piece, other, b"", one[0] + other)[int(second * 1e6) % 4]
    return data[: one.start()] + new + data[one.end() :]


def check(kind: str, data: bytes) -> Reading:
    """Read mutated bytes, and hold what comes out against them; raises `AssertionError` for what is wrong."""
    began = process_time()
    if kind == "thermoml":
        reading = thermoml.read_stream(io.BytesIO(data), "fuzzed.xml")
        assert parts_of(data, shortcut=True) == parts_of(data, shortcut=False)
        oracle.check_thermoml(data, reading)
    else:
        reading = laboratory.read_text(data, "fuzzed.csv")
        if not data.startswith((b"\xff\xfe", b"\xfe\xff")) and _is_utf8(data):
            oracle.check_laboratory(data, reading)
    combined([reading])
    oracle.check_account(reading)
    assert process_time() - began < SLOWEST, "too slow"
    return reading


def parts_of(data: bytes, shortcut: bool) -> list[object]:
    """Everything the parser hands out, and how it ends; every third block is skipped."""
    parts: list[object] = []
    blocks = 0

    def take(name: str, shape: Shape, texts: list[str], skipped: int) -> bool:
        nonlocal blocks
        parts.append((name, nodes(shape, texts) if shape else [], skipped))
        blocks += name == BLOCK
        return name != ROW or blocks % 3 != 2

    try:
        read_parts(io.BytesIO(data), take, shortcut=shortcut)
    except InputError as error:
        parts.append(str(error))
    return parts


def _is_utf8(data: bytes) -> bool:
    try:
        data.decode("utf-8-sig")
    except UnicodeDecodeError:
        return False
    return True


def drawn(rng: random.Random) -> tuple[str, bytes]:
    """Draw one mutated file."""
    kind = rng.choice(("thermoml", "laboratory"))
    data = rng.choice(THERMOML if kind == "thermoml" else LABORATORY)
    operations = rng.choice((OPERATIONS, TOKENS, TOKENS))
    mutations = [
        (rng.choice(operations), rng.random(), rng.random(), rng.randrange(len(PIECES)))
        for _ in range(rng.randint(1, 6))
    ]
    return kind, mutated(data, mutations)


def main() -> None:
    """Run the inputs, and say what came of them."""
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--inputs", type=int, default=20_000)
    parser.add_argument("--seed", type=int, default=1)
    asked = parser.parse_args()
    rng, tally = random.Random(asked.seed), Counter[str]()
    for i in range(asked.inputs):
        kind, data = drawn(rng)
        try:
            reading = check(kind, data)
        except BaseException:
            Path(f"fuzzed-{asked.seed}-{i}.{kind}").write_bytes(data)
            raise
        tally[f"{kind}: files"] += 1
        tally[f"{kind}: points"] += sum(map(len, reading.sets))
        tally[f"{kind}: diagnostics"] += len(reading.diagnostics)
        tally[f"{kind}: files refused"] += any(d.code == "file" for d in reading.diagnostics)
    for name, count in sorted(tally.items()):
        print(f"{name}: {count}")


if __name__ == "__main__":
    main()

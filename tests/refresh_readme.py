"""Run README's console blocks again and write what they print: ``python tests/refresh_readme.py``.

Of a sweep's tables only the first is kept; a line of three dots stands for the others.
"""

import contextlib
import io
import os
import re
import shlex
import tempfile
from pathlib import Path

from eosmuster.cli import main

README = Path(__file__).parents[1] / "README.md"


def printed(command: str) -> list[str]:
    out = io.StringIO()
    with contextlib.redirect_stdout(out):
        main(shlex.split(command)[1:])
    return [line.rstrip() for line in out.getvalue().strip().splitlines()]


def shortened(lines: list[str]) -> list[str]:
    tables = [i for i, line in enumerate(lines) if line.endswith(": candidates, worst first")]
    if len(tables) < 2:
        return lines
    legend = next(i for i, line in enumerate(lines) if line.startswith("held: "))
    return [*lines[: tables[1] - 1], "...", *lines[legend:]]


def refreshed(match: re.Match[str]) -> str:
    command = match[1]
    return "\n".join(["```console", f"$ {command}", *shortened(printed(command)), "```\n"])


if __name__ == "__main__":
    text = README.read_text(encoding="utf-8")
    with tempfile.TemporaryDirectory() as folder:
        os.chdir(folder)
        text = re.sub(r"```console\n\$ (.*?)\n.*?```\n", refreshed, text, flags=re.DOTALL)
    README.write_text(text, encoding="utf-8")

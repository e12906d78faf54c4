"""The worked examples of ``worked_examples.csv``, and the package's model of the fluid of each."""

from __future__ import annotations

import csv
from pathlib import Path

from eosmuster.components import Component
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind

FILE = Path(__file__).with_name("worked_examples.csv")


def rows():
    with FILE.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(line for line in file if not line.startswith("#")))


def ids(row):
    return f"{row['source'].split(',')[0]}-{row['source'].split()[-1]}-{row['model']}-{row['quantity']}"


def parameters(row):
    component = Component(
        "example",
        critical_temperature=float(row["critical_temperature_K"]),
        critical_pressure=float(row["critical_pressure_Pa"]),
        acentric_factor=float(row["acentric_factor"]),
        cas=row["cas"],
    )
    return bind(CATALOGUE[row["model"]], [component]).parameters.take(0)


def half_a_unit(text):
    """Half a unit of the last printed digit, relative."""
    mantissa, _, exponent = text.partition("e")
    digits = len(mantissa.partition(".")[2])
    return 0.5 * 10.0 ** (int(exponent or 0) - digits) / abs(float(text))

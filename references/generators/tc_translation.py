"""Make ``references/parameters/tc_translation.csv`` again: ``python references/generators/tc_translation.py``.

The translated-consistent models define their volume translation by the liquid volume at Tr = 0.8:
c = v_EOS(0.8 Tc) - v_ref(0.8 Tc) (Le Guennec, Privat and Jaubert, Fluid Phase Equilib. 429 (2016) 301). Here
v_ref is the reference library's; own calculation, not published.
"""

from __future__ import annotations

import csv
import dataclasses
import sys

import numpy as np

from eosmuster.components import catalogue
from eosmuster.models.catalogue import CATALOGUE
from eosmuster.models.model import bind
from eosmuster.saturation.solver import at_temperature
from eosmuster.sources import library

MODELS = ("tc-PR-2018", "tc-RK-2018")
REDUCED_TEMPERATURE = 0.8


def main() -> None:
    """Write the file to standard output."""
    out = csv.writer(sys.stdout, lineterminator="\n")
    out.writerow(["name", "cas", *MODELS, "unit", "source"])
    for component in catalogue().values():
        temperature = REDUCED_TEMPERATURE * component.critical_temperature
        answer = library.saturation(component, [temperature], ["liquid_density"])
        volume = 1.0 / answer.values["liquid_density"][0]
        if not component.cas or not np.isfinite(volume):
            continue
        shifts = []
        for name in MODELS:
            bare = dataclasses.replace(CATALOGUE[name], translation=None)
            parameters = bind(bare, [component]).parameters.take(0)
            shifts.append(1.0 / float(at_temperature(parameters, temperature).liquid_density) - volume)
        source = f"own calculation from CoolProp {library.version()} at 0.8 Tc"
        out.writerow([component.name, component.cas, *(f"{s:.6e}" for s in shifts), "m3/mol", source])


if __name__ == "__main__":
    main()

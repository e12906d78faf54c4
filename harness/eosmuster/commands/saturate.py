"""``eosmuster saturate``: one substance at one temperature or pressure."""

from __future__ import annotations

import argparse

from eosmuster.commands.exits import NOTHING_JUDGED, complain, show, width
from eosmuster.errors import InputError

HELP = "one substance at one temperature or pressure, all models"

_PHASE_RULE = (
    "give exactly one of --temperature and --pressure: by the phase rule a saturated pure substance has one "
    "degree of freedom, so the other follows from it"
)


def add(parser: argparse.ArgumentParser) -> None:
    """Add the options."""
    parser.add_argument("substance", help="a name, alias or CAS number")
    parser.add_argument("--temperature", "-T", metavar="T", help='e.g. "25 degC"; a bare number is in K')
    parser.add_argument("--pressure", "-p", metavar="P", help='e.g. "1 atm"; a bare number is in Pa')
    parser.add_argument("--model", "-m", metavar="M", action="append", help="a model (again for more; default: all)")


def run(options: argparse.Namespace) -> int:
    """Ask every model and every reference."""
    from eosmuster.components import find
    from eosmuster.inquiry import ask
    from eosmuster.listing import chosen_models, positive, saturation_text

    if (options.temperature is None) == (options.pressure is None):
        raise InputError(_PHASE_RULE)
    component = find(options.substance)
    models = chosen_models(options.model)
    temperature = positive(options.temperature, "temperature", "--temperature")
    pressure = positive(options.pressure, "pressure", "--pressure")
    answers = ask(component, models, temperature=temperature, pressure=pressure)
    show(saturation_text(component, answers, temperature, pressure, width()))
    if not any(answer.status == "solved" for answer in answers):
        complain("no model has a saturated state there")
        return NOTHING_JUDGED
    return 0

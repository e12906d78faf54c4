"""``eosmuster list``: what is there."""

from __future__ import annotations

import argparse

from eosmuster.commands.exits import show, width
from eosmuster.errors import InputError

HELP = "what is there: models, components, references, properties, plans"

TOPICS = {
    "models": "the equations of state",
    "components": "the fluids, and what is left out",
    "references": "the sources, with --component those of one fluid",
    "properties": "what can be judged",
    "plans": "those that are built in",
}


def add(parser: argparse.ArgumentParser) -> None:
    """Add the options."""
    topics = "; ".join(f"{topic}: {what}" for topic, what in TOPICS.items())
    parser.add_argument("topic", choices=tuple(TOPICS), help=topics)
    parser.add_argument(
        "--component", metavar="NAME", help="with references: all there is of one fluid, by name, alias or CAS number"
    )


def run(options: argparse.Namespace) -> int:
    """Show one list."""
    if options.component is not None:
        from eosmuster.listing_references import component_references_text

        if options.topic != "references":
            raise InputError("--component goes with 'list references' only")
        show(component_references_text(options.component, width()))
    else:
        from eosmuster import listing

        show(listing.LISTS[options.topic](width()))
    return 0

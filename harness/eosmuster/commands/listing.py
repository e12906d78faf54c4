"""``eosmuster list``: what is there."""

from __future__ import annotations

import argparse

from eosmuster.commands.exits import show, width
from eosmuster.errors import InputError

HELP = "what is there: models, components, references, properties, plans"

TOPICS = ("models", "components", "references", "properties", "plans")


def add(parser: argparse.ArgumentParser) -> None:
    """Add the options."""
    parser.add_argument("topic", choices=TOPICS)
    parser.add_argument("--component", metavar="NAME", help="with references: all there is of one fluid")


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

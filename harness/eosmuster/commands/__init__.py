"""The commands: one module each, with its help, its options and what it does. Heavy rooms are entered in `run`."""

COMMANDS = {
    "sweep": "sweep",
    "combine": "combine",
    "saturate": "saturate",
    "precheck": "precheck",
    "drift": "drift",
    "replay": "replay",
    "list": "listing",
}
"""Command -> module, in the order in which the help shows them."""

"""Headless commands: one file each, with ``arguments(parser)`` and ``run(asked)``, which returns the exit status."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from importlib import import_module
from typing import Protocol, cast

COMMANDS = {
    "demo": ("demo", "put the demo designs on the shelf and open it"),
    "list": ("shelf", "the designs on the shelf"),
    "margins": ("margins", "recompute every margin of a design"),
    "waves": ("waves", "voltages of the nominal run over time, to a CSV file"),
    "faults": ("faults", "what the unit does with each part failed, silent failures first"),
    "immunity": ("immunity", "the least charge that trips an alarm, net by net, and the slew of the supply"),
    "compare": ("compare", "the stored margins of several revisions, what got worse first"),
    "causes": ("causes", "what each changed part did to each margin"),
    "drawer": ("drawer", "the parts made of datasheet points"),
    "import": ("take_in", "put a design document on the shelf"),
    "export": ("hand_out", "write a design document to a file"),
    "backup": ("backup", "write a consistent copy of the store, also while it is in use"),
    "inspect": ("inspection", "check that the store is what was saved in it"),
    "schema": ("schema", "the JSON Schema of the design document"),
}
"""Every command, in the order of the help, with the file that holds it and its help line."""


class Command(Protocol):
    """What the file of a command holds."""

    def arguments(self, parser: ArgumentParser) -> None:
        """Declare what the command line may say."""

    def run(self, asked: Namespace) -> int:
        """Do it. Returns the exit status; refusals are raised in one line."""


def command(name: str) -> Command:
    """The command of this name. Only the one that is used is loaded, which keeps start-up quick."""
    return cast(Command, import_module(f".{COMMANDS[name][0]}", __name__))

"""``stagebook schema``: the JSON Schema of the design document."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace

from ...engine.design.schema import schema
from .printing import print_json


def arguments(parser: ArgumentParser) -> None:
    """Nothing to declare."""


def run(asked: Namespace) -> int:
    """Print the schema."""
    print_json(schema())
    return 0

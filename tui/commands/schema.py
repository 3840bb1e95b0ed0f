"""``stagebook schema``: the JSON Schema of the design document."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace

from ...engine.design.document import Design
from .printing import print_json


def arguments(parser: ArgumentParser) -> None:
    """Nothing to declare."""


def run(asked: Namespace) -> int:
    """Print the schema."""
    schema = {"$schema": "https://json-schema.org/draft/2020-12/schema", **Design.model_json_schema()}
    print_json(schema)
    return 0

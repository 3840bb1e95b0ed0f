"""Compute the margins of the demos anew: ``python -m stagebook.tui.demo.recompute FOLDER [NAME ...]``.

To be run when a law, a formula or a demo changes; a test compares the shipped margins with what the engine makes.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path

from ...engine.studies.margins import study
from . import DEMOS


def main(folder: str, *names: str) -> None:
    """Write ``NAME_margins.json`` of the demos of these names, of all where there is none, into a folder."""
    for demo in (demo for demo in DEMOS if demo.name in names or not names):
        sheets = [study(design, lanes=demo.lanes).as_json() for design in demo.designs()]
        Path(folder, f"{demo.name}_margins.json").write_text(json.dumps(sheets, separators=(",", ":")) + "\n", "utf-8")


if __name__ == "__main__":
    main(*sys.argv[1:])

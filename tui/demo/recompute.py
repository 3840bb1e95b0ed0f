"""Compute the margins of the demos anew: ``python -m stagebook.tui.demo.recompute FOLDER`` writes the shipped files.

To be run when a law, a formula or a demo changes; a test compares the shipped margins with what the engine makes.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path

from ...engine.studies.margins import study
from . import DEMOS

LANES = 1000


def main(folder: str) -> None:
    """Write ``NAME_margins.json`` of every demo into a folder."""
    for demo in DEMOS:
        sheets = [study(design, lanes=LANES).as_json() for design in demo.designs()]
        Path(folder, f"{demo.name}_margins.json").write_text(json.dumps(sheets, separators=(",", ":")) + "\n", "utf-8")


if __name__ == "__main__":
    main(sys.argv[1])

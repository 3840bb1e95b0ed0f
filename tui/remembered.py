"""What a sitting knows and the store does not keep: figures of drafts, notes without a revision yet, what was told."""

from __future__ import annotations

from collections import OrderedDict

from ..engine.results import Depth, MarginSheet

MOST_SHEETS = 64
"""States of drafts whose figures are remembered: some 20 kB each; those looked at longest ago give way."""


class Remembered:
    """Lives as long as the program runs. One solver, so one seed and one number of lanes, stands behind all figures.

    ``told`` are the cautions told already; ``notes`` what was written for a revision that was not saved, by design;
    ``frozen`` the designs whose figures are held back until a prediction is written; ``hands`` where the hand lay:
    the place of the stage, and the part.
    """

    def __init__(self) -> None:
        self.told: set[str] = set()
        self.notes: dict[str, dict[str, str]] = {}
        self.frozen: set[str] = set()
        self.hands: dict[str, tuple[int, str | None]] = {}
        self._sheets: OrderedDict[str, MarginSheet] = OrderedDict()

    def keep(self, sheet: MarginSheet) -> None:
        """Remembers worst corners, with the spread as soon as that is known; a nominal sheet is computed in no time."""
        if sheet.depth is Depth.NOMINAL:
            return
        self._sheets[sheet.content] = sheet
        self._sheets.move_to_end(sheet.content)
        while len(self._sheets) > MOST_SHEETS:
            self._sheets.popitem(last=False)

    def sheet(self, content: str) -> MarginSheet | None:
        """The deepest figures of a document, if they were computed in this sitting."""
        found = self._sheets.get(content)
        if found is not None:
            self._sheets.move_to_end(content)
        return found

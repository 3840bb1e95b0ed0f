"""What a sitting knows beside the store: figures of drafts, notes without a revision yet, what was told."""

from __future__ import annotations

from collections import OrderedDict
from collections.abc import Callable, Mapping

from ..engine.design.document import Design
from ..engine.results import Depth, MarginSheet
from .note_keeping import NoteKeeping

MOST_SHEETS = 64
"""States of drafts whose figures are remembered: some 20 kB each; those looked at longest ago give way."""


class Remembered:
    """Lives as long as the program runs. One solver, so one seed and one number of lanes, stands behind all figures.

    ``told`` are the cautions told already; ``notes`` what was written for a revision that was not saved, by design,
    which ``keeping`` keeps on the disk too;
    ``frozen`` the designs whose figures are held back until a prediction is written; ``hands`` where the hand lay:
    the place of the stage, and the part; ``begun`` what a design without a revision was when its worst corners were
    first known.
    """

    def __init__(self, keep: Callable[[str, Mapping[str, str]], None] | None = None) -> None:
        """``keep`` puts a note that is being written on the disk."""
        self.told: set[str] = set()
        self.notes: dict[str, dict[str, str]] = {}
        self.keeping = NoteKeeping(keep or (lambda design, written: None))
        self.frozen: set[str] = set()
        self.hands: dict[str, tuple[int, str | None]] = {}
        self.begun: dict[str, tuple[Design, MarginSheet]] = {}
        self._sheets: OrderedDict[str, MarginSheet] = OrderedDict()

    def notes_of(self, design: str, kept: Callable[[], dict[str, str]]) -> dict[str, str]:
        """What is written for the next revision of a design; of an earlier sitting at first, which ``kept`` reads."""
        if design not in self.notes:
            self.notes[design] = kept()
            self.keeping.kept[design] = dict(self.notes[design])
        return self.notes[design]

    @property
    def kept_nowhere(self) -> list[str]:
        """The designs for whose next revision a note is begun that would be lost by leaving."""
        self.keeping.now()
        lost = [name for name, written in self.notes.items() if written != self.keeping.kept.get(name)]
        return [name for name in lost if any(self.notes[name].values())]

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

"""A terminal of 80x24 as far as the program uses one: every line that a drawing changed, as it then stands.

Only what changed is drawn, from where to where. Control functions: ECMA-48; the mark at the end of a drawing is
the synchronized output that terminals share (private mode 2026).
"""

from __future__ import annotations

import re

COLUMNS, ROWS = 80, 24
_DRAWN = "\x1b[?2026l"
_WHOLE = re.compile(
    r"\x1b\[(?P<numbers>[0-?]*)[ -/]*(?P<command>[@-~])"
    r"|\x1b\][^\x07\x1b]*(?:\x07|\x1b\\)"
    r"|\x1b[P_^X][^\x1b]*\x1b\\"
    r"|\x1b[ -/]*[0-OQ-WYZ\\`-~]"
    r"|(?P<steering>[\x00-\x1a\x1c-\x1f])"
    r"|(?P<text>[^\x00-\x1f]+)"
)


class TerminalLines:
    """Takes in what a program writes; ``feed`` gives the lines that stood there after each drawing, in order."""

    def __init__(self) -> None:
        self._cells = [[" "] * COLUMNS for _ in range(ROWS)]
        self._row = self._column = 0
        self._changed: dict[int, None] = {}
        self._rest = ""

    def feed(self, data: str) -> str:
        """What became of the screen; a control function that is cut off waits for its end."""
        *drawings, last = (self._rest + data).split(_DRAWN)
        self._rest = ""
        found = [self._drawing(each, whole=True) for each in drawings]
        return "".join([*found, self._drawing(last, whole=False)])

    def _drawing(self, data: str, *, whole: bool) -> str:
        at = 0
        while at < len(data):
            piece = _WHOLE.match(data, at)
            if piece is None:
                if not whole:
                    self._rest = data[at:]
                    break
                at += 1  # cut off for good
                continue
            at = piece.end()
            if piece["text"] is not None:
                self._write(piece["text"])
            elif piece["steering"] is not None:
                self._steer(piece["steering"])
            elif piece["command"] is not None:
                self._obey(piece["command"], piece["numbers"])
        lines = ["".join(self._cells[row]) + "\n" for row in self._changed]
        self._changed.clear()
        return "".join(lines)

    def _write(self, text: str) -> None:
        for character in text:
            if self._column == COLUMNS:
                self._steer("\n")
            self._cells[self._row][self._column] = character
            self._changed[self._row] = None
            self._column += 1

    def _steer(self, character: str) -> None:
        if character == "\r":
            self._column = 0
        elif character == "\b":
            self._column = max(0, self._column - 1)
        elif character == "\n":
            self._column = 0
            self._row += 1
            if self._row == ROWS:
                self._row = ROWS - 1
                self._cells = [*self._cells[1:], [" "] * COLUMNS]

    def _obey(self, command: str, numbers: str) -> None:
        given = [int(number) if number.isdigit() else 0 for number in numbers.split(";")]
        first = max(1, given[0])
        if command in "Hf":
            self._row = min(ROWS, first) - 1
            self._column = min(COLUMNS, max(1, given[1]) if len(given) > 1 else 1) - 1
        elif command == "J" and given[0] == 2:
            self._cells = [[" "] * COLUMNS for _ in range(ROWS)]
        elif command == "K" and given[0] == 0:
            self._cells[self._row][self._column :] = [" "] * (COLUMNS - self._column)
            self._changed[self._row] = None
        elif command in "ABCD":
            down, right = {"A": (-1, 0), "B": (1, 0), "C": (0, 1), "D": (0, -1)}[command]
            self._row = min(ROWS - 1, max(0, self._row + first * down))
            self._column = min(COLUMNS - 1, max(0, self._column + first * right))

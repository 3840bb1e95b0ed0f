"""How commands print: one JSON object, or plain tables for eighty columns."""

from __future__ import annotations

import codecs
import re
import shutil
import sys
from argparse import ArgumentParser
from collections.abc import Mapping, Sequence
from textwrap import TextWrapper, wrap
from typing import Any

from ..shown import json_text, visible

WIDTH = 80
_LONGEST = 40  # characters of one piece of an id or one word; longer ones are broken


def json_argument(parser: ArgumentParser) -> None:
    """Declare ``--json``."""
    parser.add_argument("--json", action="store_true", help="one JSON object instead of a table")


def print_json(value: Mapping[str, Any]) -> None:
    """One JSON object on standard output; what could steer the terminal is escaped, all but ASCII if not in UTF-8."""
    plain = codecs.lookup(sys.stdout.encoding or "ascii").name != "utf-8"
    print(json_text(value, ascii_only=plain))


def print_table(heads: Sequence[str], rows: Sequence[Sequence[str]], *, right: frozenset[int] = frozenset()) -> None:
    """Rows in columns; the last column takes what is left of the line and goes on below where it is longer.

    The line is the terminal's where there is one, else of eighty columns. Ids are broken at their colons only.

    ``right`` are the columns of figures, which end in line. The last column may hold line breaks of its own. Text of
    the user's cannot steer the terminal.
    """
    rows = [(*map(visible, row[:-1]), row[-1]) for row in rows]
    widths = [max(map(len, column)) for column in zip(heads, *rows, strict=True)][:-1]
    indent = sum(widths) + 2 * len(widths)
    line_of = _Pieces(max(line_width() - indent, 16))
    for row in (heads, *rows):
        cells = [
            text.rjust(width) if column in right else text.ljust(width)
            for column, (text, width) in enumerate(zip(row, widths, strict=False))
        ]
        first, *more = [line for part in row[-1].split("\n") for line in line_of.wrap(visible(part))] or [""]
        print("  ".join((*cells, first)).rstrip())
        for line in more:
            print(" " * indent + line)


class _Pieces(TextWrapper):
    """Breaks at spaces and behind colons; only what is no name any more is broken anywhere."""

    def __init__(self, width: int) -> None:
        super().__init__(width, break_on_hyphens=False, break_long_words=False)

    def _split(self, text: str) -> list[str]:
        chunks = super()._split(text)
        return [piece for chunk in chunks for piece in re.findall(rf"[^:]{{1,{_LONGEST}}}:*|:+", chunk)]


def line_width() -> int:
    """Characters of a line: the terminal's where standard output is one, else eighty."""
    return shutil.get_terminal_size((WIDTH, 24)).columns if sys.stdout.isatty() else WIDTH


def print_pairs(pairs: Sequence[tuple[str, str]]) -> None:
    """Names and texts side by side; a text that is longer than the line goes on below."""
    indent = max((len(visible(name)) for name, _ in pairs), default=0) + 2
    for name, text in pairs:
        first, *more = wrap(visible(text), WIDTH - indent) or [""]
        print(f"{visible(name).ljust(indent)}{first}".rstrip())
        for line in more:
            print(" " * indent + line)


def print_words(words: str, hanging: int = 0) -> None:
    """A sentence, broken into lines; all but the first are indented by ``hanging``."""
    for line in wrap(visible(words), WIDTH, subsequent_indent=" " * hanging):
        print(line)

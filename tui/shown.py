"""How figures, verdicts and foreign text are written on a screen: pure functions, no widgets."""

from __future__ import annotations

import json
import re
import unicodedata
from collections.abc import Sequence
from dataclasses import dataclass
from math import floor
from typing import Any

from rich.cells import cell_len, set_cell_size

from ..engine.results import CheckResult, Verdict

MARKS = {Verdict.FAIL: "X", Verdict.THIN: "!", Verdict.PASS: "=", Verdict.UNKNOWN: "?"}
WORDS = {Verdict.FAIL: "FAIL", Verdict.THIN: "thin", Verdict.PASS: "pass", Verdict.UNKNOWN: "unknown"}
TONES = {Verdict.FAIL: "fail", Verdict.THIN: "thin", Verdict.PASS: "pass", Verdict.UNKNOWN: "unknown"}

_LEAST_WORDS = 5  # cells
_HANGING = {"a", "an", "any", "at", "by", "did", "do", "does", "is", "it", "no", "not"} | {
    "of",
    "one",
    "or",
    "that",
    "the",
    "there",
    "to",
    "was",
}
"""Words that say nothing where the rest is cut away."""


@dataclass(frozen=True, slots=True)
class Span:
    """A run of text in one tone. ``TONES`` of widgets/lines.py styles them; "" is plain text."""

    text: str
    tone: str = ""


Line = tuple[Span, ...]


def line(*pieces: str | Span) -> Line:
    """A line from plain texts and spans."""
    return tuple(Span(piece) if isinstance(piece, str) else piece for piece in pieces)


def toned(spans: Line, tone: str) -> Line:
    """The same text, all of it in one tone."""
    return tuple(Span(span.text, tone) for span in spans)


def plain(spans: Line) -> str:
    """The text of a line without its tones."""
    return "".join(span.text for span in spans)


def visible(text: str) -> str:
    """The text with every character that moves the cursor or hides itself written out.

    Control characters become their Unicode pictures, format characters (direction overrides, zero widths),
    line separators and lone surrogates become ``<U+202E>``, so that stored text can never steer the terminal.
    """
    if text.isprintable() and text.isascii():
        return text
    return "".join(map(_visible_character, text))


def json_text(value: Any, *, ascii_only: bool = False) -> str:
    """The value as indented JSON in which every character that :func:`visible` would write out is an escape.

    Control characters beyond those that JSON itself forbids (DEL, the C1 set) steer terminals too. Numbers are finite.
    """
    return _NOT_PLAIN.sub(_escaped, json.dumps(value, indent=2, ensure_ascii=ascii_only, allow_nan=False))


_NOT_PLAIN = re.compile(r"[^\n -~]")


def _escaped(found: re.Match[str]) -> str:
    character = found[0]
    if _visible_character(character) == character:
        return character
    # JSON writes a character beyond the first 65,536 as its two halves in UTF-16 (RFC 8259, section 7).
    halves = character.encode("utf-16-be", "surrogatepass").hex()
    return "".join(f"\\u{halves[at : at + 4]}" for at in range(0, len(halves), 4))


def _visible_character(character: str) -> str:
    code = ord(character)
    if code < 0x20:
        return chr(0x2400 + code)
    if code == 0x7F:
        return "\u2421"
    if unicodedata.category(character) in {"Cc", "Cf", "Cs", "Cn", "Co", "Zl", "Zp"}:
        return f"<U+{code:04X}>"
    return character


def fit(text: str, width: int) -> str:
    """The visible text in exactly ``width`` cells: padded with spaces, or cut and closed with a full stop."""
    if width <= 0:
        return ""
    shown = visible(text)
    if cell_len(shown) <= width:
        return shown + " " * (width - cell_len(shown))
    return set_cell_size(shown, width - 1) + "." if width > 1 else set_cell_size(shown, 1)


def fit_right(text: str, width: int) -> str:
    """As :func:`fit`, but short texts stand at the right end."""
    shown = visible(text)
    return " " * (width - cell_len(shown)) + shown if cell_len(shown) < width else fit(text, width)


def counted(number: int, word: str) -> str:
    """A number with what it counts: ``1 edit``, ``2 edits``."""
    return f"{number} {word}{'s' * (number != 1)}"


def percent(margin: float | None) -> str:
    """A margin in whole percent with its sign, ``<-999`` below that; a question mark when there is none.

    Rounds towards minus infinity, so that a figure on screen is never better than the margin behind it.
    """
    return "?" if margin is None else _signed(floor(margin * 100 + 1e-9))


def points(change: float) -> str:
    """A difference of margins in whole percent with its sign, ``<-999`` or ``>+999`` beyond that."""
    return _signed(round(change * 100))


def _signed(whole: int) -> str:
    # A part that is asked for a hundred times what it can do does not need its digits, the columns need their room.
    if abs(whole) < 1000:
        return f"{whole:+d}"
    return ">+999" if whole > 0 else "<-999"


def figure(margin: float | None, outcome: str | None, width: int) -> str:
    """A margin for a narrow column: as many first words of the outcome as fit, ``fails`` or percent where they say
    nothing (``the``, ``did not``)."""
    if not outcome:
        return percent(margin)
    taken = ""
    for word in visible(outcome).split():
        longer = f"{taken} {word}".strip()
        if cell_len(longer) > width:
            break
        taken = longer
    if taken != visible(outcome):
        kept = taken.split()
        while kept and kept[-1] in _HANGING:
            kept.pop()
        taken = " ".join(kept)
    if cell_len(taken) >= _LEAST_WORDS:
        return taken
    return percent(margin) if margin is not None and margin > 0.0 else "fails"


def verdict_words(check: CheckResult) -> str:
    """Mark, figure and word of one check: ``X -36 FAIL``."""
    shown = check.outcome if check.outcome else percent(check.margin)
    return f"{MARKS[check.verdict]} {visible(shown)} {WORDS[check.verdict]}"


def columns(widths: Sequence[int], texts: Sequence[str], *, right: frozenset[int] = frozenset()) -> str:
    """Texts side by side in columns of these widths, one space between them."""
    return " ".join(
        fit_right(text, width) if index in right else fit(text, width)
        for index, (width, text) in enumerate(zip(widths, texts, strict=True))
    )

"""What a generic class says about one figure: a spread between parts, a limit on one side, or a test condition."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

SOURCE = "memory"
"""Who says the figures of every class."""


@dataclass(frozen=True, slots=True)
class ClassFigure:
    """Min, typical and max as texts with the test condition ``at``; a limit has one end only and no typical value.

    ``of`` names the figure whose test condition this is: it is no figure of its own. ``held`` says why corners and
    random units keep the typical value of a figure that spreads.
    """

    minimum: str | None
    typical: str | None
    maximum: str | None
    at: str
    of: str | None = None
    held: str = ""
    source: str = SOURCE

    @property
    def texts(self) -> tuple[str, str, str]:
        """(min, typical, max) as a law reads them: what is not given is what is."""
        given = next(text for text in (self.typical, self.maximum, self.minimum) if text is not None)
        return self.minimum or given, given, self.maximum or given


Figures = Mapping[str, ClassFigure]


def spread(minimum: str, typical: str, maximum: str, at: str, *, held: str = "") -> ClassFigure:
    """A figure that differs from part to part. Where a law reads it, corners take both ends, unless it is ``held``."""
    return ClassFigure(minimum, typical, maximum, at, held=held)


def at_most(limit: str, at: str) -> ClassFigure:
    """A rating that must not be passed, or a figure that no part exceeds: computed with as it stands."""
    return ClassFigure(None, None, limit, at)


def at_least(limit: str, at: str) -> ClassFigure:
    """A figure that every part reaches: computed with as it stands."""
    return ClassFigure(limit, None, None, at)


def where(of: str, value: str) -> ClassFigure:
    """The test condition of another figure, as a number that a law reads."""
    return ClassFigure(None, value, None, "", of=of)


@dataclass(frozen=True, slots=True)
class ClassPoints:
    """What a class gives at several points, with their test condition."""

    points: tuple[tuple[str, str], ...]
    at: str
    source: str = SOURCE

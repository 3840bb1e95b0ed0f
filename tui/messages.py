"""What background threads tell the interface. ``request`` says which question is answered; old answers are ignored."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

from textual.message import Message

from ..engine.results import MarginSheet

if TYPE_CHECKING:
    from ..engine.studies.causes import CausesSheet


@dataclass
class SheetArrived(Message):
    """A study has come to another depth."""

    request: int
    sheet: MarginSheet


@dataclass
class StudyProgress(Message):
    """How many lanes of the spread are done."""

    request: int
    done: int
    total: int


@dataclass
class StudyRefused(Message):
    """The study cannot be made: one line saying why and what to write instead."""

    request: int
    reason: str


@dataclass
class SolverPreparing(Message):
    """The solver is being prepared on this machine (True), or is ready (False) with a word if something is wrong."""

    busy: bool
    trouble: str = ""


@dataclass
class CausesProgress(Message):
    """How many combinations of changes are done."""

    request: int
    done: int
    total: int


@dataclass
class CausesArrived(Message):
    """What caused every change of margin."""

    request: int
    causes: CausesSheet


@dataclass
class CausesRefused(Message):
    """The causes cannot be computed: one line saying why."""

    request: int
    reason: str


@dataclass
class Answered(Message):
    """What was asked aside of the margins: the whole answer, or as much as is known so far."""

    request: int
    found: object
    whole: bool


@dataclass
class AnswerProgress(Message):
    """How much of an answer is done."""

    request: int
    done: int
    total: int


@dataclass
class AnswerRefused(Message):
    """There is no answer: one line saying why and what to write instead."""

    request: int
    reason: str

"""What the screens ask of the engine, as values handed in, so that a test can hand in something quicker."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Protocol

from ..engine.design.document import Design
from ..engine.results import CheckResult, MarginSheet

if TYPE_CHECKING:
    from ..engine.studies.causes import CausesSheet
    from ..engine.studies.explanation import Explanation
    from ..engine.studies.fault_outcomes import FaultSheet
    from ..engine.studies.immunity_sheet import ImmunitySheet
    from ..engine.studies.waves import Waves

Cancelled = Callable[[], bool]
Progress = Callable[[int, int], None]


class Study(Protocol):
    """All margins of a design; reports a sheet for every depth it comes to."""

    def __call__(
        self,
        design: Design,
        *,
        lanes: int,
        report: Callable[[MarginSheet], None],
        progress: Progress,
        cancelled: Cancelled,
    ) -> MarginSheet:
        """The deepest sheet. Raises EngineError with one line, Cancelled when asked to stop."""


class Causes(Protocol):
    """What caused every change of margin between two designs."""

    def __call__(
        self,
        old: Design,
        new: Design,
        *,
        stored: MarginSheet,
        stored_new: MarginSheet,
        progress: Progress,
        cancelled: Cancelled,
    ) -> CausesSheet:
        """The shares; ``stored`` and ``stored_new`` are the margins kept. Raises EngineError or Cancelled."""


class Faults(Protocol):
    """What a design does with each single fault; reports the sheet so far."""

    def __call__(
        self, design: Design, *, report: Callable[[FaultSheet], None], progress: Progress, cancelled: Cancelled
    ) -> FaultSheet:
        """The whole sheet. Raises EngineError with one line, Cancelled when asked to stop."""


class WavesOf(Protocol):
    """The nominal run of a sequence as voltages over time."""

    def __call__(self, design: Design, sequence: str, *, cancelled: Cancelled) -> Waves:
        """All nets at every step. Raises EngineError with one line, Cancelled when asked to stop."""


class Immunity(Protocol):
    """How little charge trips an alarm of a design, net by net; reports the sheet so far."""

    def __call__(
        self, design: Design, *, report: Callable[[ImmunitySheet], None], progress: Progress, cancelled: Cancelled
    ) -> ImmunitySheet:
        """The whole sheet. Raises EngineError with one line, Cancelled when asked to stop."""


class Explain(Protocol):
    """Where one margin comes from."""

    def __call__(self, design: Design, result: CheckResult, *, cancelled: Cancelled) -> Explanation:
        """What was observed and with which data. Raises EngineError or Cancelled."""


class Preparation(Protocol):
    """A child process that compiles the solver once for this machine."""

    def poll(self) -> int | None:
        """Its exit status, None while it runs."""


def _study(design: Design, **how: Any) -> MarginSheet:
    # Imported here, in the background thread and after the first paint: it loads the compiler.
    from ..engine.studies.margins import study

    return study(design, **how)


def _causes(old: Design, new: Design, **how: Any) -> CausesSheet:
    from ..engine.studies.causes import causes

    return causes(old, new, **how)


def _faults(design: Design, **how: Any) -> FaultSheet:
    from ..engine.studies.faults import study

    return study(design, **how)


def _waves(design: Design, sequence: str, **how: Any) -> Waves:
    from ..engine.studies.waves import waves

    return waves(design, sequence, **how)


def _immunity(design: Design, **how: Any) -> ImmunitySheet:
    from ..engine.studies.immunity import study

    return study(design, **how)


def _explain(design: Design, result: CheckResult, **how: Any) -> Explanation:
    from ..engine.studies.explanation import explain

    return explain(design, result, **how)


@dataclass(frozen=True)
class Solver:
    """The engine's studies, the number of lanes of a spread, and how the compiled solver is prepared."""

    study: Study
    causes: Causes
    ready: Callable[[], bool]
    prepare: Callable[[], Preparation]
    lanes: int = 1000
    faults: Faults = _faults
    waves: WavesOf = _waves
    immunity: Immunity = _immunity
    explain: Explain = _explain


def own_solver() -> Solver:
    """The program's own solver, whose compiled code lies in the user's cache folder."""
    from .solver_cache import prepare, ready

    return Solver(study=_study, causes=_causes, ready=ready, prepare=prepare)

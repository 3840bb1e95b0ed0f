"""Studies in the background: one thread for margins, one for causes, one for what a screen of its own asks.

Everything they find is posted as a message.
"""

from __future__ import annotations

import threading
import time
from collections.abc import Callable

from textual.message import Message

from ..engine.design.document import Design
from ..engine.errors import Cancelled, EngineError
from ..engine.results import CheckResult, MarginSheet
from ..engine.studies.comparison import Side
from .background import LatestOnly
from .messages import (
    Answered,
    AnswerProgress,
    AnswerRefused,
    CausesArrived,
    CausesProgress,
    CausesRefused,
    SheetArrived,
    SolverPreparing,
    StudyProgress,
    StudyRefused,
)
from .solver import Cancelled as CancelledYet
from .solver import Preparation, Progress, Solver

Post = Callable[[Message], object]
Question = Callable[[Callable[[object], None], Progress, CancelledYet], object]
"""Gets where to report what is known so far, where to tell progress, and whether it is stale; returns the answer."""

_MESSAGES_A_SECOND = 10
_LOOK_EVERY = 0.05
_UNPREPARED = "the solver could not be prepared beforehand; the first figures take longer"


class Computing:
    """Asks the solver and posts what it answers to whoever asked. All methods return at once."""

    def __init__(self, solver: Solver) -> None:
        self._solver = solver
        self._margins = LatestOnly("margins")
        self._causes = LatestOnly("causes")
        self._aside = LatestOnly("aside")
        self._requests = 0
        self._preparing = threading.Lock()
        self._preparation: Preparation | None = None
        self._is_prepared = False

    @property
    def lanes(self) -> int:
        """Number of lanes of a spread."""
        return self._solver.lanes

    @property
    def idle(self) -> bool:
        """Whether nothing is computed and nothing waits."""
        return all(each.idle.is_set() for each in (self._margins, self._causes, self._aside))

    def prepare(self, post: Post) -> None:
        """Begins preparing the solver, if this machine has not done so yet."""

        def job(stale: Callable[[], bool]) -> None:
            try:
                self._prepared(stale, post)
            except Exception as error:
                post(SolverPreparing(False, f"{_UNPREPARED} ({_reason(error)})"))

        if not self._is_prepared:
            self._margins.submit(job)

    def study(self, design: Design, post: Post) -> int:
        """Begins the study of a design; an older one stops. Returns the number its messages will carry."""
        self._requests += 1
        request = self._requests

        def job(stale: Callable[[], bool]) -> None:
            def report(sheet: MarginSheet) -> None:
                if not stale():
                    post(SheetArrived(request, sheet))

            progress = self._throttled(lambda done, total: StudyProgress(request, done, total), stale, post)
            try:
                if self._prepared(stale, post):
                    self._solver.study(
                        design, lanes=self._solver.lanes, report=report, progress=progress, cancelled=stale
                    )
            except Cancelled:
                return
            except Exception as error:
                if not stale():
                    post(StudyRefused(request, _reason(error)))

        self._margins.submit(job)
        return request

    def causes(self, old: Side, new: Side, post: Post) -> int:
        """Begins computing what caused the changes between two sides; an older such question stops."""
        self._requests += 1
        request = self._requests

        def job(stale: Callable[[], bool]) -> None:
            progress = self._throttled(lambda done, total: CausesProgress(request, done, total), stale, post)
            try:
                if self._prepared(stale, post):
                    found = self._solver.causes(
                        old.design,
                        new.design,
                        stored=old.sheet,
                        stored_new=new.sheet,
                        progress=progress,
                        cancelled=stale,
                    )
                    post(CausesArrived(request, found))
            except Cancelled:
                return
            except Exception as error:
                if not stale():
                    post(CausesRefused(request, _reason(error)))

        self._causes.submit(job)
        return request

    def faults(self, design: Design, post: Post) -> int:
        """Begins computing what each single fault does; the sheet so far is an answer that is not whole."""

        def question(report: Callable[[object], None], progress: Progress, stale: CancelledYet) -> object:
            return self._solver.faults(design, report=report, progress=progress, cancelled=stale)

        return self._ask(question, post)

    def waves(self, design: Design, sequence: str, post: Post) -> int:
        """Begins the nominal run of a sequence."""

        def question(report: Callable[[object], None], progress: Progress, stale: CancelledYet) -> object:
            return self._solver.waves(design, sequence, cancelled=stale)

        return self._ask(question, post)

    def immunity(self, design: Design, post: Post) -> int:
        """Begins computing how little charge trips an alarm; the sheet so far is an answer that is not whole."""

        def question(report: Callable[[object], None], progress: Progress, stale: CancelledYet) -> object:
            return self._solver.immunity(design, report=report, progress=progress, cancelled=stale)

        return self._ask(question, post)

    def explain(self, design: Design, check: CheckResult, post: Post) -> int:
        """Begins computing where a margin comes from."""

        def question(report: Callable[[object], None], progress: Progress, stale: CancelledYet) -> object:
            return self._solver.explain(design, check, cancelled=stale)

        return self._ask(question, post)

    def _ask(self, question: Question, post: Post) -> int:
        """Asks one thing aside of margins and causes; an older such question stops."""
        self._requests += 1
        request = self._requests

        def job(stale: Callable[[], bool]) -> None:
            def report(found: object) -> None:
                if not stale():
                    post(Answered(request, found, False))

            progress = self._throttled(lambda done, total: AnswerProgress(request, done, total), stale, post)
            try:
                if self._prepared(stale, post):
                    found = question(report, progress, stale)
                    if not stale():
                        post(Answered(request, found, True))
            except Cancelled:
                return
            except Exception as error:
                if not stale():
                    post(AnswerRefused(request, _reason(error)))

        self._aside.submit(job)
        return request

    def cancel_aside(self) -> None:
        """Nobody looks at that answer any more."""
        self._aside.cancel()

    def cancel_causes(self) -> None:
        """Nobody looks at the causes any more."""
        self._causes.cancel()

    def cancel_study(self) -> None:
        """Nobody looks at the margins any more."""
        self._margins.cancel()

    def close(self) -> None:
        """Stops everything, without waiting for it."""
        self._margins.close()
        self._causes.close()
        self._aside.close()

    def _prepared(self, stale: Callable[[], bool], post: Post) -> bool:
        """Waits until the compiled solver lies ready; False when the question became stale meanwhile."""
        with self._preparing:
            if self._is_prepared or (self._preparation is None and self._solver.ready()):
                self._is_prepared = True
                return not stale()
            if self._preparation is None:
                self._preparation = self._solver.prepare()
            running = self._preparation
        post(SolverPreparing(True))
        while running.poll() is None:
            if stale():
                return False
            time.sleep(_LOOK_EVERY)
        self._solver.ready()
        self._is_prepared = True
        post(SolverPreparing(False, _UNPREPARED if running.poll() else ""))
        return not stale()

    def _throttled(
        self, message: Callable[[int, int], Message], stale: Callable[[], bool], post: Post
    ) -> Callable[[int, int], None]:
        """A progress callback that posts at most ten messages a second; it may be called from several threads."""
        lock = threading.Lock()
        last = float("-inf")

        def progress(done: int, total: int) -> None:
            nonlocal last
            with lock:
                now = time.monotonic()
                if stale() or (now - last < 1 / _MESSAGES_A_SECOND and done < total):
                    return
                last = now
            post(message(done, total))

        return progress


def _reason(error: Exception) -> str:
    """One line for the status line: the engine's own words, or what broke."""
    if isinstance(error, EngineError):
        return str(error).splitlines()[0] if str(error) else "the engine refused without a reason"
    return f"could not be computed ({type(error).__name__}: {str(error).splitlines()[0] if str(error) else '-'})"

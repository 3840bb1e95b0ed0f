"""What every command that computes does first: choose where compiled code is kept, and say what takes long."""

from __future__ import annotations

import sys
from collections.abc import Callable, Iterator
from contextlib import contextmanager
from time import monotonic

from ...engine.design.document import Design
from ..shown import visible
from .refusal import CommandRefused

_SECONDS_BETWEEN = 0.5


def prepare_solver(suits: Callable[[], object]) -> None:
    """Make the solver ready, and say so on standard error where that takes long.

    ``suits`` raises what would be refused anyway: it is asked before anybody is made to wait, and after compiled code
    is looked for, so that it may load the engine.
    """
    from ..solver_cache import choose_cache_folder, prepare_here, ready

    folder = choose_cache_folder()
    compiled = ready()
    suits()
    if compiled:
        if folder.words:
            _say(folder.words)
        return
    _say(f"{folder.words or 'preparing the solver, once on this machine'}: about 20 s")
    try:
        prepare_here()
    except OSError as error:
        raise CommandRefused(
            f"the compiled solver cannot be kept in {folder.path} ({error.strerror or error}); make room there, or name"
            " another folder with XDG_CACHE_HOME"
        ) from error


def computable(*designs: Design) -> None:
    """Refuse designs whose margins cannot be computed, before anything is. Raises CircuitError."""
    from ...engine.circuit.circuit import build
    from ...engine.studies.evaluate import asks_of

    for design in designs:
        asks_of(build(design))


@contextmanager
def progress(words: str) -> Iterator[Callable[[int, int], None]]:
    """A progress callback that keeps one line on the terminal up to date while it is in use; silent elsewhere."""
    last = monotonic()
    written = False

    def show(done: int, total: int) -> None:
        nonlocal last, written
        if sys.stderr.isatty() and monotonic() - last > _SECONDS_BETWEEN:
            last, written = monotonic(), True
            sys.stderr.write(f"\r\x1b[K{words} {done} of {total}")
            sys.stderr.flush()

    try:
        yield show
    finally:
        if written:
            sys.stderr.write("\r\x1b[K")
            sys.stderr.flush()


def _say(words: str) -> None:
    print(f"stagebook: {visible(words)}", file=sys.stderr, flush=True)

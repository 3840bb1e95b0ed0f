"""What becomes of units made at random; as a script, of a range of them: run, counted, and kept so that it goes on.

    python -m tests.engine.unit_outcomes 0 500 --keep units.jsonl --further 5

runs the units 0 to 499 in a child process of its own, skips those that ``units.jsonl`` holds for this solver already,
and prints one line with all counts. With ``--further`` a unit that the bound of work ended is run once more with so
many times that work, to see whether it then comes to its end. A child that dies is a crash of its unit, one that says
nothing for ten minutes hangs; the next child goes on behind it.
"""

from __future__ import annotations

import argparse
import json
import queue
import subprocess
import sys
import threading
import time
from collections import Counter
from collections.abc import Callable, Iterable, Iterator, Sequence
from dataclasses import asdict, dataclass
from pathlib import Path

TREE = Path(__file__).parents[2]
SOLVED, OSCILLATES, UNSOLVED, CRASHED, HUNG = "solved", "oscillates", "unsolved", "crashed", "hung"
WORSE = (SOLVED, OSCILLATES, UNSOLVED)  # what becomes of a unit is the worst of its lanes
QUIET = 600.0  # s; the first unit may have to wait until the solver is compiled


@dataclass(frozen=True)
class Outcome:
    """What became of one unit, and the ``words`` that told: None where both of its lanes came to their end.

    ``OSCILLATES``: solved up to the bound of a lane's work, and told in words that it oscillates, where and how fast.
    """

    seed: int
    became: str
    words: str | None = None
    seconds: float = 0.0
    solver: str = ""
    further: str | None = None  # what became of it with more work, where that was tried


def outcome(seed: int, further: float = 1.0) -> Outcome:
    """Run the nominal lane and a random one of a unit; with ``further`` times the work too, where that is needed."""
    begin = time.perf_counter()
    became, words = _became(seed)
    more = None
    if became == OSCILLATES and further > 1.0:
        from stagebook.engine import run as bounds

        usual = bounds.MOST_STEPS, bounds.MOST_SECONDS
        try:
            bounds.MOST_STEPS, bounds.MOST_SECONDS = int(usual[0] * further), usual[1] * further
            more, _ = _became(seed)
        finally:
            bounds.MOST_STEPS, bounds.MOST_SECONDS = usual
    return Outcome(seed, became, words, time.perf_counter() - begin, further=more)


def _became(seed: int) -> tuple[str, str | None]:
    # Loaded here: whoever only counts has no use for the solver.
    import numpy as np

    from stagebook.engine.circuit.circuit import build
    from stagebook.engine.design.document import Design
    from stagebook.engine.primitives.columns import Lanes
    from stagebook.engine.quantity import read
    from stagebook.engine.run import run
    from stagebook.engine.studies.diagnosis import diagnosed
    from stagebook.engine.studies.lanes import random_lanes
    from stagebook.engine.studies.sequences import program_of

    from .random_stages import unit

    circuit = build(Design.load(unit(seed)))
    drawn = random_lanes(circuit.columns, 1, seed)
    lanes = Lanes(circuit.columns, np.concatenate([circuit.nominal().values, drawn.values], axis=1))
    line, _ = program_of(circuit, lanes, "alarm")
    seen = run(circuit, lanes, line.program(read(circuit.design.sequences["alarm"].ends, "s")), ())
    found: list[tuple[int, str | None]] = []
    for lane in range(lanes.count):
        words = diagnosed(seen, lanes, "alarm", lane)
        if words is None and not np.isfinite(seen.final[lane]).all():
            words = "not finite"
        oscillates = words is not None and "goes on oscillating near net" in words and "Hz" in words
        found.append((0 if words is None else 1 if oscillates else 2, words))
    worst, words = max(found, key=lambda each: each[0])
    return WORSE[worst], words


def told(outcomes: Sequence[Outcome]) -> str:
    """One line with all counts, then one for every unit that did not come to its end."""
    counts = Counter(each.became for each in outcomes)
    steadily = sum("steadily" in str(each.words) for each in outcomes if each.became == OSCILLATES)
    seeds = [each.seed for each in outcomes]
    solver = ", ".join(dict.fromkeys(each.solver for each in outcomes if each.solver))
    more = ""
    if any(each.further for each in outcomes):
        more = f"; {sum(each.further == SOLVED for each in outcomes)} come to their end with more"
    first = (
        f"{len(outcomes)} units, {min(seeds)} to {max(seeds)}: {counts[SOLVED]} solved to the end of their sequence, "
        f"{counts[OSCILLATES]} ended by the bound of work while they oscillate, net and frequency told ({steadily} of "
        f"them steadily{more}), {counts[UNSOLVED]} unsolved with a reason, {counts[CRASHED]} crashed, {counts[HUNG]} "
        f"hung; {sum(each.seconds for each in outcomes):.0f} s{f'; solver {solver}' if solver else ''}"
    )
    return "\n".join([first, *(f"unit {o.seed}: {o.became}: {o.words}" for o in outcomes if o.became != SOLVED)])


Command = Callable[[Sequence[int]], list[str]]


def child(further: float) -> Command:
    """What makes the command line of the child that runs units."""
    return lambda seeds: [sys.executable, "-m", "tests.engine.unit_outcomes", "--child", str(further), *map(str, seeds)]


def outcomes(seeds: Iterable[int], command: Command, quiet: float = QUIET) -> Iterator[Outcome]:
    """What becomes of every unit, each told as soon as it is known; a child that dies or hangs is followed by another.

    ``command`` makes the child's command line; it prints one JSON object a unit. ``quiet`` is in s.
    """
    waiting = list(seeds)
    while waiting:
        child = subprocess.Popen(command(waiting), stdout=subprocess.PIPE, text=True, cwd=TREE)
        lines: queue.Queue[str | None] = queue.Queue()

        def listen(child: subprocess.Popen[str] = child, lines: queue.Queue[str | None] = lines) -> None:
            assert child.stdout is not None
            for line in child.stdout:
                lines.put(line)
            lines.put(None)

        threading.Thread(target=listen, daemon=True).start()
        try:
            while waiting:
                begin = time.perf_counter()
                try:
                    line = lines.get(timeout=quiet)
                except queue.Empty:
                    yield Outcome(waiting.pop(0), HUNG, f"nothing for {quiet:g} s", quiet)
                    break
                if line is None:
                    status = child.wait()
                    seconds = time.perf_counter() - begin
                    yield Outcome(waiting.pop(0), CRASHED, f"its process ended with status {status}", seconds)
                    break
                found = _read(line)
                waiting.remove(found.seed)
                yield found
        finally:
            child.kill()
            child.wait()


def _read(line: str) -> Outcome:
    return Outcome(**json.loads(line))


def _tell(seeds: Sequence[int], further: float) -> None:
    """The child: one JSON object a unit."""
    for seed in seeds:
        try:
            found = outcome(seed, further)
        except Exception as error:
            found = Outcome(seed, CRASHED, f"{type(error).__name__}: {error}")
        print(json.dumps(asdict(found)), flush=True)


def counted(low: int, high: int, keep: Path | None = None, further: float = 1.0) -> list[Outcome]:
    """What becomes of the units ``low`` to ``high`` - 1; ``keep`` holds what is known already, and is added to."""
    from importlib.metadata import version

    from stagebook.tui.solver_cache import _KERNEL, solver_key

    solver = solver_key(_KERNEL, f"numba {version('numba')}")
    known: dict[int, Outcome] = {}
    if keep is not None and keep.exists():
        text = keep.read_text()
        whole = text[: text.rfind("\n") + 1]
        if whole != text:  # what wrote the last line was stopped in the middle of it
            keep.write_text(whole)
        known = {each.seed: each for each in map(_read, whole.splitlines()) if each.solver == solver}
    for found in outcomes((seed for seed in range(low, high) if seed not in known), child(further)):
        one = Outcome(**{**asdict(found), "solver": solver})
        known[one.seed] = one
        if keep is not None:
            with keep.open("a") as file:
                file.write(json.dumps(asdict(one)) + "\n")
    return [known[seed] for seed in range(low, high)]


def main() -> None:
    """Read the command line: a range of seeds and where to keep what became of them, or the child's list of seeds."""
    parser = argparse.ArgumentParser(description="Run units made at random and count what becomes of them.")
    parser.add_argument("low", type=int)
    parser.add_argument("high", type=int)
    parser.add_argument("--keep", type=Path)
    parser.add_argument("--further", type=float, default=1.0)
    if sys.argv[1:2] == ["--child"]:
        _tell([int(text) for text in sys.argv[3:]], float(sys.argv[2]))
        return
    asked = parser.parse_args()
    print(told(counted(asked.low, asked.high, asked.keep, asked.further)))


if __name__ == "__main__":
    main()

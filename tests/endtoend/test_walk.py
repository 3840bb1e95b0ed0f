"""The installed program in tmux, from the shelf to a saved and compared revision, and through a crash.

What must hold is this project's own: nothing acknowledged is lost, the screen answers while the solver is prepared, and
a changed part with its moved margin is fewer than ten keystrokes away. Deadlines are wide: the machine may be busy.
"""

from __future__ import annotations

import json
import re
import signal
import subprocess
from pathlib import Path
from typing import Any

from platformdirs import user_cache_path

from .conftest import Open
from .terminal import Terminal

COMPUTING = 600.0  # s, a compiled solver and all corners on a slow and busy machine
PREPARING = "preparing the solver"
NOTE = "R10 1M: a tenth of the latch current"


def to_r10(terminal: Terminal) -> str:
    """From the shelf to the resistor that feeds the latch: six keystrokes."""
    terminal.until(r"> flood")
    terminal.press("Enter")
    terminal.until(r"\[probe\]")
    terminal.press("Right", "Right", "Right")
    terminal.until(r"\[latch\]")
    terminal.press("Down", "Down")
    return terminal.until(r"(?m)^>[ *]+R10 ")


def latch_hold(screen: str) -> tuple[str, str, str]:
    """Mark, nominal and worst margin of the check ``latch hold`` as they stand on the bench; old ones end in ``~``."""
    found = re.search(r"(\S)[ <]latch hold Q4 +(\S+) +(\S+)", screen)
    assert found is not None, screen
    return found[1], found[2], found[3]


def points(text: str) -> int:
    return int(text.rstrip("~"))


def said(program: Path, home: dict[str, str], *arguments: str) -> Any:
    done = subprocess.run([program, *arguments], env=home, capture_output=True, text=True, check=True, timeout=600)
    return json.loads(done.stdout)


def test_a_walk_through_the_demo(installed: Path, home: dict[str, str], open_terminal: Open) -> None:
    terminal = open_terminal(home, installed, "demo")
    terminal.until(f"{PREPARING}, once on this machine")
    before = points(latch_hold(to_r10(terminal))[1])
    terminal.write("1M")
    terminal.until(r"R10, value: +1M")
    terminal.press("Enter")
    assert terminal.keys < 10

    # The first start on this machine: the solver is being compiled, and every key is answered all the same.
    bench = terminal.until(lambda screen: PREPARING in screen and "draft on r5, 1 edit" in screen)
    assert "~" in latch_hold(bench)[1]
    terminal.press("Down")
    assert PREPARING in terminal.until(r"(?m)^> +R11 ")
    terminal.press("Up")
    assert PREPARING in terminal.until(r"(?m)^> \*R10 ")

    bench = terminal.until(lambda screen: "~" not in latch_hold(screen)[1], COMPUTING)
    assert points(latch_hold(bench)[1]) < before - 50
    bench = terminal.until(lambda screen: "~" not in latch_hold(screen)[2], COMPUTING)
    assert latch_hold(bench)[0] == "X"
    assert "worse than r5" in bench
    assert re.search(r"\*R10 +1M", bench)

    terminal.press("s")
    assert "R10 100k > 1M" in terminal.until(r"Why does this revision exist\?")
    terminal.write(NOTE)
    terminal.press("Enter")
    assert "on r6, no edits" in terminal.until("saved as r6")

    terminal.press("h")
    assert NOTE in terminal.until(r"(?m)^> +r6 ")
    terminal.press("c")
    assert "R10 100k > 1M" in terminal.until(r"latch hold Q4 \(latch\) +=.*X")
    terminal.until(r"causes: R10 [+-]\d", COMPUTING)

    terminal.press("b", "b", "b")
    terminal.until(r"> flood +r6")
    terminal.press("q")
    assert terminal.ended() == 0

    shelf = said(installed, home, "list", "--json")["designs"]
    assert (shelf[0]["name"], shelf[0]["revisions"]) == ("flood", 6)
    assert shelf[0]["worst"]["verdict"] == "FAIL"
    sides = said(installed, home, "compare", "flood", "5", "6", "--json")
    assert "R10" in json.dumps(sides["changed"])


def test_a_kill_loses_no_edit(installed: Path, home: dict[str, str], open_terminal: Open) -> None:
    # The cache of whoever runs the tests: what is looked at is not the solver.
    home |= {"XDG_CACHE_HOME": str(user_cache_path())}
    terminal = open_terminal(home, installed, "demo")
    to_r10(terminal)
    terminal.write("1M")
    terminal.press("Enter")
    terminal.until("draft on r5, 1 edit")
    terminal.kill()
    assert terminal.ended() == 128 + signal.SIGKILL

    terminal = open_terminal(home, installed, "demo")
    assert re.search(r"> flood +r5 .* 1 edit ", terminal.until("> flood"))
    bench = to_r10(terminal)
    assert "draft on r5, 1 edit" in bench
    assert re.search(r"\*R10 +1M", bench)
    terminal.press("u")
    assert re.search(r"(?m)^>  R10 +100k", terminal.until("taken back: R10 1M"))
    terminal.press("C-q")
    assert terminal.ended() == 0

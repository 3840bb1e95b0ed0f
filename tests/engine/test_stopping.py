"""A run that is stopped leaves no work going on behind. The rule is the project's own."""

from __future__ import annotations

import time
from collections.abc import Callable
from typing import Any

import pytest

from stagebook.engine import run as running
from stagebook.engine.errors import Cancelled

from .circuits import capacitor, resistor, setup

BLOCKS = 200


@pytest.fixture
def marched(monkeypatch: pytest.MonkeyPatch) -> list[int]:
    """The first lane of every block that was computed, each in 10 ms."""
    blocks: list[int] = []

    def march(*arguments: Any, **_: Any) -> None:
        *_, low, _, cancel = arguments
        if not cancel[0]:
            blocks.append(low)
        time.sleep(0.01)

    monkeypatch.setattr(running, "march", march)
    return blocks


def interrupted(done: int, total: int) -> None:
    raise KeyboardInterrupt


@pytest.mark.parametrize(
    ("how", "raised"),
    [({"progress": interrupted}, KeyboardInterrupt), ({"cancelled": lambda: True}, Cancelled)],
)
def test_an_interrupt_or_a_cancel_ends_the_work(
    marched: list[int], how: dict[str, Callable[..., Any]], raised: type[BaseException]
) -> None:
    made = setup(resistor("R1", "supply", "a", 1e3), capacitor("C1", "a", "0V", 1e-6), ends=1.0)
    lanes = made.lanes(count=BLOCKS * running.BLOCK)
    with pytest.raises(raised):
        running.run(made.circuit, lanes, made.program(lanes), (), threads=2, **how)
    begun = len(marched)
    assert begun < BLOCKS / 2
    time.sleep(0.05)
    assert len(marched) == begun


def test_a_run_that_nobody_stops_computes_every_block(marched: list[int]) -> None:
    made = setup(resistor("R1", "supply", "a", 1e3), capacitor("C1", "a", "0V", 1e-6), ends=1.0)
    lanes = made.lanes(count=20 * running.BLOCK)
    running.run(made.circuit, lanes, made.program(lanes), (), threads=2)
    assert sorted(marched) == [block * running.BLOCK for block in range(20)]

"""The registry of actions: keys that reach the program, one meaning each."""

from __future__ import annotations

from collections import Counter

import pytest

from stagebook.tui.actions import ACTIONS, of
from stagebook.tui.shown import plain
from stagebook.tui.widgets.status import key_line

PLACES = sorted({action.where for action in ACTIONS})
# Keys that terminals or multiplexers keep for themselves: this project's style sheet, after common practice.
SWALLOWED = {
    "ctrl+s",
    "ctrl+j",
    "ctrl+o",
    "ctrl+i",
    "ctrl+m",
    "ctrl+h",
    "ctrl+enter",
    "shift+enter",
    "ctrl+tab",
    "ctrl+b",
}


@pytest.mark.parametrize("where", PLACES)
def test_a_key_means_one_thing_in_one_place(where: str) -> None:
    keys = Counter(key for action in of(where) for key in action.keys.split(","))
    assert [key for key, count in keys.items() if count > 1] == []


def test_no_action_needs_a_key_that_never_arrives() -> None:
    assert [action.id for action in ACTIONS if set(action.keys.split(",")) & SWALLOWED] == []


def test_escape_is_never_the_only_way_out() -> None:
    assert [action.id for action in ACTIONS if action.keys == "escape"] == []


def test_action_ids_are_unique() -> None:
    assert max(Counter(action.id for action in ACTIONS).values()) == 1


@pytest.mark.parametrize("width", [20, 40, 80, 120])
def test_the_key_line_fits_and_keeps_help(width: int) -> None:
    shown = plain(key_line((*of("bench"), *of("app")), width))
    assert len(shown) <= width
    assert "? help" in shown

"""Terminals that cannot show the screens are told so in one line."""

from __future__ import annotations

import pytest

from stagebook.tui.terminal import refusal


@pytest.mark.parametrize("environment", [{"TERM": "dumb"}, {"TERM": "unknown"}, {}])
def test_a_terminal_without_cursor_control_is_refused_in_one_line(environment: dict[str, str]) -> None:
    said = refusal(environment, interactive=True)
    assert said is not None
    assert "\n" not in said
    assert "stagebook list" in said


def test_a_pipe_is_refused() -> None:
    assert "need a terminal" in str(refusal({"TERM": "xterm"}, interactive=False))


@pytest.mark.parametrize("terminal", ["xterm-256color", "screen", "tmux-256color", "linux", "vt100"])
def test_usual_terminals_are_taken(terminal: str) -> None:
    assert refusal({"TERM": terminal}, interactive=True) is None

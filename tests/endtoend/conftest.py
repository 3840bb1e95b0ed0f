"""A home of its own for the installed program, and a terminal to drive it in."""

from __future__ import annotations

import shutil
from collections.abc import Callable, Iterator
from pathlib import Path

import pytest

from .terminal import Terminal

Open = Callable[..., Terminal]


@pytest.fixture
def home(tmp_path: Path) -> dict[str, str]:
    """The environment of a user who has never run the program: nothing of the one who runs the tests."""
    place = tmp_path / "home"
    place.mkdir()
    return {
        "PATH": "/usr/bin:/bin",
        "HOME": str(place),
        "LANG": "C.UTF-8",
        "XDG_DATA_HOME": str(place / "data"),
        "XDG_CACHE_HOME": str(place / "cache"),
        "XDG_CONFIG_HOME": str(place / "config"),
    }


@pytest.fixture
def open_terminal(tmp_path: Path) -> Iterator[Open]:
    """Opens terminals and closes them all when the test is over."""
    if shutil.which("tmux") is None:
        pytest.skip("the end-to-end tests drive the installed program in tmux, which is not installed here")
    opened: list[Terminal] = []

    def opening(environment: dict[str, str], *command: str | Path) -> Terminal:
        opened.append(Terminal(environment, tmp_path, *command))
        return opened[-1]

    yield opening
    for terminal in opened:
        terminal.close()

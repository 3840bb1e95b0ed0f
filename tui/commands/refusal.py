"""Input that a headless command cannot use."""

from __future__ import annotations


class CommandRefused(Exception):
    """One line that says what is wrong, where, and what to write instead."""

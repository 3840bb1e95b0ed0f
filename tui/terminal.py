"""Whether this terminal can show the screens at all."""

from __future__ import annotations

from collections.abc import Mapping

_HEADLESS = "use the headless commands instead: stagebook list, margins, compare, causes (stagebook --help)"


def refusal(environment: Mapping[str, str], interactive: bool) -> str | None:
    """One line saying why the screens cannot be shown and what to use instead; None when they can.

    Args:
        environment: The environment variables (``TERM`` is read).
        interactive: Whether standard input, output and error are all a terminal.
    """
    terminal = environment.get("TERM", "")
    if not interactive:
        return f"the screens need a terminal on standard input, output and error; {_HEADLESS}"
    if terminal in {"dumb", "unknown"} or not terminal:
        named = f"TERM={terminal}" if terminal else "TERM is not set: such a terminal"
        return f"{named} cannot show the screens; {_HEADLESS}"
    return None

"""``stagebook causes``: what each changed part did to each margin."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from collections.abc import Mapping
from typing import Any

from ..shown import percent
from .printing import json_argument, print_json, print_table, print_words
from .revisions import revision_arguments, stored
from .waiting import computable, prepare_solver, progress

SEEN = 0.0005  # a change or share below is +0.0 in the table


def arguments(parser: ArgumentParser) -> None:
    """Declare WHAT and the two revisions."""
    revision_arguments(parser, "two")
    json_argument(parser)


def run(asked: Namespace) -> int:
    """Compute the shares and print them, the largest loss first."""
    name, (old, new) = stored(asked, 2, 2)
    prepare_solver(lambda: computable(old.design, new.design))
    # Imported here: it loads the compiler, which must find its folder chosen.
    from ...engine.studies.causes import causes

    with progress("causes: combination") as show:
        sheet = causes(old.design, new.design, stored=old.sheet, stored_new=new.sheet, progress=show)
    found = {"design": name, "from": old.number, "to": new.number, **_without(sheet.as_json(), "design")}
    if asked.json:
        print_json(found)
    else:
        _print(found)
    return 0


def _without(values: Mapping[str, Any], key: str) -> dict[str, Any]:
    return {name: value for name, value in values.items() if name != key}


def _print(found: Mapping[str, Any]) -> None:
    changed = ", ".join(found["changed"]) or "nothing"
    print_words(f"{found['design']} r{found['from']} to r{found['to']}: changed {changed}")
    rows = sorted(filter(_moved, found["checks"]), key=lambda check: float(check["after"] - check["before"]))
    if rows:
        print()
        heads = ("before", "after", "change", "check, with the share of each change in percent")
        print_table(heads, [_cells(check) for check in rows], right=frozenset({0, 1, 2}))
        print()
    still = len(found["checks"]) - len(rows)
    if still:
        print_words(f"{still} {'margin has' if still == 1 else 'margins have'} not changed.")
    for kind, words in (
        ("appeared", "Only in the newer one"),
        ("vanished", "Only in the older one"),
        ("unknown", "Without a margin on either side"),
    ):
        if found[kind]:
            print_words(f"{words}: {', '.join(found[kind])}")


def _moved(check: Mapping[str, Any]) -> bool:
    numbers = (check["after"] - check["before"], check.get("formula") or 0.0, *check["shares"].values())
    return any(abs(number) >= SEEN for number in numbers)


def _cells(check: Mapping[str, Any]) -> tuple[str, ...]:
    """One row: figures in percent, and below the check the share of each change, the largest first."""
    shares = sorted(check["shares"].items(), key=lambda share: -abs(share[1]))
    lines = [check["id"], ", ".join(f"{what} {share * 100:+z.1f}" for what, share in shares)]
    if abs(check["interaction"]) >= SEEN:
        lines.append(f"contained in these, by acting together: {check['interaction'] * 100:+z.1f}")
    if check.get("formula") is not None:
        lines.append(f"beside these, by the formulas of this version: {check['formula'] * 100:+z.1f}")
    if check.get("error") is not None:
        lines.append(f"standard error of the sampled shares: up to {max(check['error'].values()) * 100:.1f}")
    change = f"{(check['after'] - check['before']) * 100:+z.1f}"
    return percent(check["before"]), percent(check["after"]), change, "\n".join(lines)

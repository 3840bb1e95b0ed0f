"""What differs between two designs, change by change, and a design with only some of the changes made."""

from __future__ import annotations

import json
from collections.abc import Collection
from dataclasses import dataclass
from typing import Any, Literal

from ..errors import DesignError
from .atoms import Atom, Pieces, merged, put_together, reordered, taken_apart
from .document import Design

ChangeKind = Literal["value", "datum", "added", "removed", "condition", "requirement", "sequence", "net"]


@dataclass(frozen=True, slots=True)
class Change:
    """One difference. ``what`` is a part's designator or names the place: ``conditions.supply``, ``sequence alarm``.

    ``before`` and ``after`` say in words what was and what is; None where there is nothing. All data of a part that
    changed are one change; a part of another kind is one change of kind ``net``, because its pins change with it.
    """

    what: str
    kind: ChangeKind
    before: str | None
    after: str | None


def differences(old: Design, new: Design) -> tuple[Change, ...]:
    """Every change that leads from ``old`` to ``new``, parts first. Empty if both have the same content."""
    return tuple(_changes(taken_apart(old), taken_apart(new)))


def apply(old: Design, new: Design, changes: Collection[Change]) -> Design:
    """``old`` with these of its :func:`differences` to ``new`` made and all others left out.

    Roles, requirements and events that name a part which is not in the result are left out with it. Raises
    DesignError for a change that is none between the two, or if the result is not a document.
    """
    before, after = taken_apart(old), taken_apart(new)
    atoms = _changes(before, after)
    known = {(change.what, change.kind): found for change, found in atoms.items()}
    pieces = dict(before)
    taken: set[Atom] = set()
    for change in changes:
        if (change.what, change.kind) not in known:
            raise DesignError(f"{change.what}: no such change between the two designs; take one of their differences")
        taken.update(known[change.what, change.kind])
    for atom in taken:
        if atom in after:
            pieces[atom] = after[atom]
        else:
            pieces.pop(atom, None)
    _keep_stages(pieces, before, after)
    _leave_out_strangers(pieces, before, after)
    return Design.load(put_together(pieces, _orders(before, after, taken)))


def _changes(old: Pieces, new: Pieces) -> dict[Change, tuple[Atom, ...]]:
    """The changes with the pieces that each exchanges."""
    found: dict[Change, tuple[Atom, ...]] = {}
    for ref in dict.fromkeys(atom[1] for atom in (*old, *new) if atom[0] == "part"):
        found.update(_part_changes(ref, old, new))
    rest = [atom for atom in dict.fromkeys((*old, *new)) if atom[0] != "part"]
    twice = _said_twice(rest)
    for atom in rest:
        before, after = old.get(atom), new.get(atom)
        if _same(before, after) and (atom in old) == (atom in new):
            continue
        if atom[0] == "order":
            before, after = before or [], after or []
            if not reordered(before, after):
                continue
        elif atom[0] == "roles" and not before and not after:
            continue
        found[_change(atom, before, after, twice)] = (atom,)
    return found


def _part_changes(ref: str, old: Pieces, new: Pieces) -> dict[Change, tuple[Atom, ...]]:
    every: tuple[Atom, ...] = (("part", ref, "value"), ("part", ref, "net"), ("part", ref, "datum"))
    value, net, datum = every
    if datum not in old:
        return {Change(ref, "added", None, _part_words(ref, new)): every}
    if datum not in new:
        return {Change(ref, "removed", _part_words(ref, old), None): every}
    inseparable = any("value" in side[datum].get("data", {}) for side in (old, new))
    if old[datum]["kind"] != new[datum]["kind"] or (inseparable and not _same(old[value], new[value])):
        return {Change(ref, "net", _part_words(ref, old), _part_words(ref, new)): every}
    found: dict[Change, tuple[Atom, ...]] = {}
    if not _same(old[value], new[value]):
        found[Change(ref, "value", old[value], new[value])] = (value,)
    if not _same(old[datum], new[datum]):
        found[Change(ref, "datum", *_data_told_apart(old[datum], new[datum]))] = (datum,)
    if not _same(old[net], new[net]):
        found[Change(ref, "net", *_told_apart(old[net], new[net]))] = (net,)
    return found


def _change(atom: Atom, before: Any, after: Any, twice: Collection[tuple[str, ...]]) -> Change:
    """The change of one piece that belongs to no part."""
    group, *names = atom
    if group == "order":
        kind: ChangeKind = "requirement" if names == ["requirements"] else "datum"
        what = "order of " + (f"parts in {names[1]}" if len(names) > 1 else names[0])
        return Change(what, kind, _listed(before), _listed(after))
    told = _told_apart(before, after)
    if group == "conditions":
        return Change(f"conditions.{names[0]}", "condition", *told)
    if group in ("required", "derating"):
        return Change(f"{group} {names[0]}", "requirement", *told)
    if group == "requirements":
        check, of, stage, sequence, number = names
        details = (stage, sequence, number) if (check, of) in twice else ()
        return Change(" ".join(filter(None, ("requirement", check, of, *details))), "requirement", *told)
    if group in ("sequences", "starts"):
        return Change(f"sequence {names[0]}" if names else "start voltages", "sequence", *told)
    if group in ("stages", "strays"):
        what = f"{group[:-1]} {' '.join(names)}"
        if before is None:
            return Change(what, "added", None, _told(after))
        if after is None:
            return Change(what, "removed", _told(before), None)
        return Change(what, "value" if group == "strays" else "datum", *told)
    return Change(f"roles {names[0]}" if names else f"design {group}", "datum", *told)


def _said_twice(atoms: Collection[Atom]) -> set[tuple[str, ...]]:
    """Checks and subjects that more than one requirement has."""
    names = [atom[1:3] for atom in atoms if atom[0] == "requirements"]
    return {name for name in names if names.count(name) > 1}


def _orders(before: Pieces, after: Pieces, taken: Collection[Atom]) -> dict[Atom, list[str]]:
    """The order of every list: the new one, unless the shared members moved and that change is not taken."""
    orders: dict[Atom, list[str]] = {}
    for atom in (atom for atom in {**before, **after} if atom[0] == "order"):
        old, new = before.get(atom, []), after.get(atom, [])
        orders[atom] = merged(old, new, new_leads=atom in taken or not reordered(old, new))
    return orders


def _keep_stages(pieces: Pieces, before: Pieces, after: Pieces) -> None:
    """A stage stays or comes with the parts that are in it."""
    for name in {piece["stage"] for atom, piece in pieces.items() if atom[0] == "part" and atom[2] == "datum"}:
        pieces.setdefault(("stages", name), before.get(("stages", name), after.get(("stages", name))))
    for name in [atom[1] for atom in pieces if atom[0] == "stages"]:
        pieces.setdefault(("roles", name), before.get(("roles", name), after.get(("roles", name))))


def _leave_out_strangers(pieces: Pieces, before: Pieces, after: Pieces) -> None:
    """Take out what names a part that one of the two designs has and the result has not."""
    refs = {atom[1] for atom in pieces if atom[0] == "part"}
    for atom in list(pieces):
        piece = pieces[atom]
        sources = [side for side in (before, after) if atom in side and _same(side[atom], piece)]
        gone = set.intersection(*({each[1] for each in side if each[0] == "part"} for side in sources)) - refs
        if atom[0] == "roles":
            pieces[atom] = {role: ref for role, ref in piece.items() if ref not in gone}
        elif atom[0] == "sequences" and "events" in piece:
            pieces[atom] = {**piece, "events": [e for e in piece["events"] if e.get("part") not in gone]}
        elif atom[0] == "requirements" and piece.get("of") in gone:
            del pieces[atom]


def _same(one: Any, other: Any) -> bool:
    """Equality of JSON values in which true is not 1."""
    return json.dumps(one, sort_keys=True) == json.dumps(other, sort_keys=True)


def _part_words(ref: str, pieces: Pieces) -> str:
    datum, value = pieces["part", ref, "datum"], pieces["part", ref, "value"]
    pins = ", ".join(f"{pin} {net}" for pin, net in pieces["part", ref, "net"].items())
    return ", ".join(filter(None, (datum["kind"], value, datum.get("class"), pins)))


def _data_told_apart(before: Any, after: Any) -> tuple[str | None, str | None]:
    """Data of a part: those of a made part by its name, which stands for all of them, others figure by figure."""
    if before.get("drawer") == after.get("drawer"):
        return _told_apart(before, after)
    one, other = (side.get("drawer") or side.get("class") or "its own data" for side in (before, after))
    return one, other


def _told_apart(before: Any, after: Any) -> tuple[str | None, str | None]:
    """Both sides in words; of two objects only the fields that differ, of two lists only such members."""
    if isinstance(before, dict) and isinstance(after, dict):
        keys = [key for key in {**before, **after} if not _same(before.get(key), after.get(key))]
        pairs = {key: _told_apart(before.get(key), after.get(key)) for key in keys}
        sides = [", ".join(f"{key} {pair[side]}" for key, pair in pairs.items() if pair[side]) for side in (0, 1)]
        return sides[0] or None, sides[1] or None
    if isinstance(before, list) and isinstance(after, list):
        return (
            _told([entry for entry in before if entry not in after]) or _told(before),
            _told([entry for entry in after if entry not in before]) or _told(after),
        )
    return _told(before), _told(after)


def _told(value: Any) -> str | None:
    """A JSON value in words; None for nothing."""
    if value is None:
        return None
    if isinstance(value, bool):
        return "yes" if value else "no"
    if isinstance(value, dict):
        return ", ".join(f"{key} {_told(entry)}" for key, entry in value.items())
    if isinstance(value, list):
        return "; ".join(str(_told(entry)) for entry in value)
    return str(value)


def _listed(names: Collection[str]) -> str:
    return ", ".join(" ".join(filter(None, name.split("\n"))) for name in names)

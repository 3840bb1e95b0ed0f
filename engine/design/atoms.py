"""A document taken apart into named pieces that can be exchanged one by one, and put together again."""

from __future__ import annotations

import json
from collections import Counter
from collections.abc import Iterable, Mapping, Sequence
from typing import Any

from .document import Design

Atom = tuple[str, ...]
"""The name of a piece: ``("part", "R8", "value")``, ``("sequence", "alarm")``, ``("order", "latch")`` ..."""

Pieces = dict[Atom, Any]
_TABLES = ("conditions", "sequences", "required", "derating")
_REASONED = ("required", "derating")
_PLAIN = ("stagebook", "name", "purpose", "starts")


def taken_apart(design: Design) -> Pieces:
    """Every piece of a design, by name. Pieces named ``order`` hold the names of a list's members in their order.

    A part is three pieces: its value, its pins, and all its other data together with the stage it is in.
    """
    document = json.loads(design.canonical())
    pieces: Pieces = {(name,): document[name] for name in _PLAIN if name in document}
    for table in _TABLES:
        pieces.update({(table, key): entry for key, entry in document.get(table, {}).items()})
    for key, reason in document.get("reasons", {}).items():
        for atom in ((table, key) for table in _REASONED if (table, key) in pieces):
            pieces[atom] = {"is": pieces[atom], "because": reason}
    stages = document.get("stages", [])
    for stage in stages:
        name = stage["name"]
        pieces["stages", name] = {k: v for k, v in stage.items() if k not in ("roles", "parts")}
        pieces["roles", name] = stage.get("roles", {})
        for part in stage.get("parts", []):
            other = {k: v for k, v in part.items() if k not in ("value", "pins")}
            pieces["part", part["ref"], "value"] = part.get("value")
            pieces["part", part["ref"], "net"] = part["pins"]
            pieces["part", part["ref"], "datum"] = {**other, "stage": name}
        pieces["order", "parts", name] = [part["ref"] for part in stage.get("parts", [])]
    pieces["order", "stages"] = [stage["name"] for stage in stages]
    for field, named in (("strays", _stray_names), ("requirements", _requirement_names)):
        entries = document.get(field, [])
        names = named(entries)
        pieces.update(zip(names, entries, strict=True))
        pieces["order", field] = ["\n".join(name[1:]) for name in names]
    return pieces


def put_together(pieces: Pieces, orders: Mapping[Atom, Sequence[str]]) -> dict[str, Any]:
    """The document made of pieces; ``orders`` tells the order of each list, of any members it names."""
    document: dict[str, Any] = {name: pieces[(name,)] for name in _PLAIN if (name,) in pieces}
    for table in _TABLES:
        document[table] = {atom[1]: piece for atom, piece in pieces.items() if atom[0] == table}
    document["reasons"] = {}
    for table in _REASONED:
        for key, piece in document[table].items():
            if isinstance(piece, dict):
                document[table][key] = piece["is"]
                document["reasons"][key] = piece["because"]
    parts: dict[str, dict[str, Any]] = {}
    for atom, piece in pieces.items():
        if atom[0] == "part" and atom[2] == "datum":
            part = {key: value for key, value in piece.items() if key != "stage"}
            value = pieces["part", atom[1], "value"]
            given = {} if value is None else {"value": value}
            parts.setdefault(piece["stage"], {})[atom[1]] = {**part, "pins": pieces["part", atom[1], "net"], **given}
    document["stages"] = [
        {
            **pieces["stages", name],
            "roles": pieces["roles", name],
            "parts": [parts[name][ref] for ref in orders["order", "parts", name] if ref in parts.get(name, {})],
        }
        for name in orders["order", "stages"]
        if ("stages", name) in pieces
    ]
    for field in ("strays", "requirements"):
        atoms = [(field, *name.split("\n")) for name in orders["order", field]]
        document[field] = [pieces[atom] for atom in atoms if atom in pieces]
    return document


def merged(old: Sequence[str], new: Sequence[str], new_leads: bool) -> list[str]:
    """The members of two lists in one order: that of the leading list, others after the member they follow."""
    leading, other = (new, old) if new_leads else (old, new)
    order = list(leading)
    present = set(order)
    before: str | None = None
    for name in other:
        if name not in present:
            order.insert(order.index(before) + 1 if before is not None else 0, name)
            present.add(name)
        before = name
    return order


def reordered(old: Iterable[str], new: Iterable[str]) -> bool:
    """Whether the members that two lists share stand in another order."""
    first, second = list(old), list(new)
    return [name for name in first if name in set(second)] != [name for name in second if name in set(first)]


def _stray_names(strays: Sequence[Mapping[str, Any]]) -> list[Atom]:
    return [("strays", *sorted(stray["between"])) for stray in strays]


def _requirement_names(requirements: Sequence[Mapping[str, Any]]) -> list[Atom]:
    """A requirement is named by check, subject, stage and sequence; more of the same name are numbered."""
    counts: Counter[tuple[str, ...]] = Counter()
    names: list[Atom] = []
    for entry in requirements:
        name = tuple(str(entry.get(key, "")) for key in ("check", "of", "stage", "sequence"))
        counts[name] += 1
        names.append(("requirements", *name, str(counts[name])))
    return names

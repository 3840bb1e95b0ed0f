"""The drawer: parts that the user made of datasheet points, in versions that never change."""

from __future__ import annotations

import unicodedata
from collections.abc import Mapping
from difflib import get_close_matches
from typing import Any

from sqlmodel import Session, col, select

from .errors import PartMissing, PartRefused
from .seal import canonical
from .sealed import seal_part
from .tables import StoredMadePart
from .values import MadePart

LONGEST = 60


def newest(session: Session) -> list[MadePart]:
    """The newest version of every part, by kind and name."""
    rows = session.exec(select(StoredMadePart).order_by(col(StoredMadePart.version)))
    by_name = {row.name: _shown(row) for row in rows}
    return sorted(by_name.values(), key=lambda part: (part.kind, part.name.casefold(), part.name))


def versions(session: Session, name: str) -> list[MadePart]:
    """All versions of one part, oldest first."""
    wanted = unicodedata.normalize("NFC", name).encode(errors="replace").decode()
    rows = session.exec(_named(wanted)).all()
    if not rows:
        near = get_close_matches(name, session.exec(select(StoredMadePart.name)).all(), n=1)
        advice = f"did you mean '{near[0]}'?" if near else "see the names with `stagebook drawer`."
        raise PartMissing(f"There is no part {name[:70]!r} in the drawer: {advice}")
    return [_shown(row) for row in rows]


def keep(session: Session, name: str, document: Mapping[str, Any], made: str) -> MadePart:
    """Add a version, unless the newest one says the same."""
    # Imported here: the shelf opens without loading the part kinds.
    from ..engine.parts.made import tried

    name = _checked(name)
    tried(document)
    text, kind = canonical(dict(document)), str(document["kind"])
    before = session.exec(_named(name)).all()
    if before and before[-1].kind != kind:
        raise PartRefused(f"'{name}' is a {before[-1].kind} and no {kind}: choose another name.")
    if before and before[-1].document == text:
        return _shown(before[-1])
    version = before[-1].version + 1 if before else 1
    row = StoredMadePart(name=name, version=version, kind=kind, document=text, made=made)
    session.add(row)
    seal_part(session, row)
    return _shown(row)


def _named(name: str) -> Any:
    return select(StoredMadePart).where(StoredMadePart.name == name).order_by(col(StoredMadePart.version))


def _shown(row: StoredMadePart) -> MadePart:
    return MadePart(row.name, row.version, row.kind, row.document, row.made)


def _checked(text: str) -> str:
    name = unicodedata.normalize("NFC", text).strip()
    if not name or len(name) > LONGEST:
        raise PartRefused(f"A part in the drawer needs a name of 1 to {LONGEST} characters, such as 'low-leak npn'.")
    if not name.isprintable():
        raise PartRefused(f"The name {name!a} holds a character that cannot be seen: leave it away.")
    return name

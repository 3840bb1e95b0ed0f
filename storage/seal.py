"""The hash chain: what the hashes of what is saved cover (SHA-256, FIPS 180-4)."""

from __future__ import annotations

import json
from hashlib import sha256
from typing import Any


def canonical(value: Any) -> str:
    """JSON with sorted keys and no spaces: one text for one value."""
    return json.dumps(value, sort_keys=True, separators=(",", ":"), ensure_ascii=False)


def revision_hash(parent: str, number: int, saved: str, document: str, note: str, margins: str) -> str:
    """Hash of a revision over its parent's hash ("" for none), number, time and its canonical texts, in hex."""
    return _chained("revision", parent, str(number), saved, document, note, margins)


def entry_hash(before: str, field: str, text: str, added: str) -> str:
    """Hash of a note entry over the hash of the entry before it, or of the revision for the first, in hex."""
    return _chained("note entry", before, field, text, added)


def part_hash(name: str, version: int, kind: str, document: str, made: str) -> str:
    """Hash of a version of a part in the drawer, in hex."""
    return _chained("part", name, str(version), kind, document, made)


def design_hash(name: str, created: str) -> str:
    """Hash of a design's name and the time when it came onto the shelf, in hex."""
    return _chained("design", name, created)


def seal_hash(before: str, kind: str, subject: int, about: str, content: str) -> str:
    """Hash of an entry of the seal over the hash of the one before it ("" for none), in hex."""
    return _chained("seal", before, kind, str(subject), about, content)


def _chained(*texts: str) -> str:
    """Each text goes in with its length before it, so that no two lists of texts run together into the same bytes."""
    digest = sha256()
    for text in texts:
        data = text.encode()
        digest.update(len(data).to_bytes(8, "big") + data)
    return digest.hexdigest()

"""The hash chain: what a revision's hash and a note entry's hash cover (SHA-256, FIPS 180-4)."""

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


def _chained(*texts: str) -> str:
    """Each text goes in with its length before it, so that no two lists of texts run together into the same bytes."""
    digest = sha256()
    for text in texts:
        data = text.encode()
        digest.update(len(data).to_bytes(8, "big") + data)
    return digest.hexdigest()

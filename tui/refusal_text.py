"""What the engine refuses of a document, said for somebody who has keys and forms and no document. Pure."""

from __future__ import annotations

import re

_WRITTEN = re.compile(r'write (?:it like )?"[\w.]+": (?:"([^"]*)"|(\d[^\s,;]*))')
_OF_PART = re.compile(r"\bpart ([^\s,:]+), (?:field )?([\w.]+)")
_KEYS = (("requirement ", "R"), ("conditions", "d"), ("field required", "t"), ("field derating", "t"))


def for_form(words: str) -> str:
    """A refusal as a form says it, where one writes ``150 mA`` and no ``"current": "150 mA"``."""
    return _WRITTEN.sub(lambda found: f"write it like {found[1] or found[2]}", words)


def for_bench(words: str) -> str:
    """The same with the key that leads to what is wrong, where there is one: ``... (e on L1)``."""
    part = _OF_PART.search(words)
    if part is not None:
        key = f"{'Enter' if part[2] == 'value' else 'e'} on {part[1]}"
    else:
        key = next((key for begins, key in _KEYS if words.startswith(begins)), "")
    return for_form(words) + (f" ({key})" if key else "")

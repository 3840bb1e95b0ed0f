"""Names of designs: what may be one, and what to say when a text may not."""

from __future__ import annotations

import unicodedata

from .errors import NameRefused

LONGEST = 64


def checked_name(text: str) -> str:
    """The name as the shelf keeps it (Unicode form NFC), so that one word typed on two keyboards is one name.

    Raises:
        NameRefused: The text is empty, too long, or holds a character that a name may not have.
    """
    name = unicodedata.normalize("NFC", text)
    rule = "write 1 to 64 letters, digits, spaces, - or _"
    if not name.strip():
        raise NameRefused(f"A design needs a name: {rule}.")
    if any(unicodedata.category(character).startswith("C") for character in name):
        raise NameRefused(f"The name {text!a} holds a control character: {rule}.")
    if name.casefold().endswith(".json"):
        raise NameRefused(f"The name '{name}' ends in .json, which means a file: leave the ending away.")
    if "/" in name:
        raise NameRefused(f"The name '{name}' holds a /, which means a file: {rule}.")
    if len(name) > LONGEST:
        raise NameRefused(f"The name '{name[:20]}...' has {len(name)} characters: {rule}.")
    if name != name.strip():
        raise NameRefused(f"The name '{name}' begins or ends with a space: leave it away.")
    for character in name:
        if not (character.isalpha() or character.isdecimal() or character in "-_ "):
            raise NameRefused(f"The name '{name}' holds '{character}': {rule}.")
    return name

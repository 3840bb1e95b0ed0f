"""Part kinds: what a datasheet gives, and the primitives a part becomes. A file here with a ``KIND`` is a kind."""

from __future__ import annotations

import importlib
import pkgutil
from functools import cache

from .kind import Kind


@cache
def kinds() -> dict[str, Kind]:
    """All part kinds by name: every module of this folder that holds ``KIND`` or ``KINDS``."""
    found: dict[str, Kind] = {}
    for module in pkgutil.iter_modules(__path__):
        loaded = importlib.import_module(f"{__name__}.{module.name}")
        for kind in (*getattr(loaded, "KINDS", ()), *([loaded.KIND] if hasattr(loaded, "KIND") else [])):
            found[kind.name] = kind
    return found

"""Stage kinds: blocks of the trade, sized from what is asked of them. A file here with a ``KIND`` is a stage kind."""

from __future__ import annotations

import importlib
import pkgutil
from functools import cache

from .kind import StageKind


@cache
def stage_kinds() -> dict[str, StageKind]:
    """All stage kinds by name, in the order in which a signal usually meets them."""
    found: list[StageKind] = []
    for module in pkgutil.iter_modules(__path__):
        loaded = importlib.import_module(f"{__name__}.{module.name}")
        found += [*getattr(loaded, "KINDS", ()), *([loaded.KIND] if hasattr(loaded, "KIND") else [])]
    return {kind.name: kind for kind in sorted(found, key=lambda kind: (kind.place, kind.title))}

"""The catalogue of margins: one small file per check. A file here with ``CHECKS`` is part of the catalogue."""

from __future__ import annotations

import importlib
import pkgutil
from functools import cache
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from .check import Check


@cache
def catalogue() -> dict[str, Check]:
    """All checks by slug, in the order of their numbers: every module of this folder that holds ``CHECKS``."""
    found: list[Check] = []
    for module in pkgutil.iter_modules(__path__):
        found += getattr(importlib.import_module(f"{__name__}.{module.name}"), "CHECKS", ())
    return {check.slug: check for check in sorted(found, key=lambda check: (check.number, check.slug))}

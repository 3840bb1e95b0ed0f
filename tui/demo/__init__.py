"""Demo designs and how their histories are made."""

from __future__ import annotations

from ...storage import Store
from .flood import FLOOD
from .frost import FROST
from .path_lamp import PATH_LAMP
from .tilt import TILT
from .vault import VAULT

DEMOS = (FLOOD, FROST, TILT, PATH_LAMP, VAULT)


def put_on_shelf(store: Store) -> list[str]:
    """Put the demos that are missing on the shelf, each with its history; return their names."""
    return [demo.name for demo in DEMOS if demo.put_on(store)]

"""Lanes of a unit, for the engine and for peers alike."""

from __future__ import annotations

from typing import Any

import numpy as np

from stagebook.engine.primitives.columns import Lanes
from stagebook.engine.studies.lanes import random_lanes

from .network import Network
from .units import Unit

AMBIENT = ("conditions", "ambient")


def lanes_of(unit: Unit, count: int, seed: int = 1) -> Lanes:
    """Random units at 25 C: every part anywhere within its tolerance."""
    return random_lanes(unit.setup.circuit.columns, count, seed)


def network_of(document: dict[str, Any], lanes: Lanes, lane: int) -> Network:
    """The peers' equations of one lane."""
    return Network.of(document, {column.key: float(lanes[column.key][lane]) for column in lanes.columns})


def spread_out(count: int, sample: int) -> np.ndarray:
    """Numbers of ``sample`` lanes evenly among ``count``."""
    return np.linspace(0, count - 1, sample).astype(int)

"""The kernel's laws for one number at a time: rows of the kernel's arrays filled with it."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

import numpy as np

from stagebook.engine.kernel import laws, vectors
from stagebook.engine.kernel.compiled import compiled
from stagebook.engine.kernel.layout import Floats
from stagebook.engine.kernel.vectors import WIDTH, at, put


def _rows(*values: float) -> Floats:
    return np.ascontiguousarray(np.repeat(np.array(values, dtype=float)[:, None], WIDTH, axis=1))


@compiled
def _exp(v: Floats, p: Floats, out: Floats) -> None:
    put(out, 0, vectors.exp(at(v, 0)))


@compiled
def _log(v: Floats, p: Floats, out: Floats) -> None:
    put(out, 0, vectors.log(at(v, 0)))


@compiled
def _exponential(v: Floats, p: Floats, out: Floats) -> None:
    value, slope = laws.exponential(at(v, 0))
    put(out, 0, value)
    put(out, 1, slope)


@compiled
def _side_currents(v: Floats, p: Floats, out: Floats) -> None:
    value, slope = laws.side_currents(at(v, 0), p, 0)
    put(out, 0, value)
    put(out, 1, slope)


@compiled
def _depletion(v: Floats, p: Floats, out: Floats) -> None:
    value, slope = laws.depletion(at(v, 0), p, 0)
    put(out, 0, value)
    put(out, 1, slope)


@compiled
def _limited(v: Floats, p: Floats, out: Floats) -> None:
    put(out, 0, laws.limited(at(v, 0), at(v, 1), p, 0))


def _called(function: Callable[..., None], v: Floats, p: Floats | None) -> tuple[float, float]:
    out = _rows(0.0, 0.0)
    with np.errstate(all="ignore"):
        function(v, _rows(0.0) if p is None else _rows(*p), out)
    assert np.array_equal(out, np.repeat(out[:, :1], WIDTH, axis=1), equal_nan=True)  # no lane differs
    return float(out[0, 0]), float(out[1, 0])


def exp(y: float) -> float:
    """e to the power y."""
    return _called(_exp, _rows(y), None)[0]


def log(y: float) -> float:
    """Natural logarithm."""
    return _called(_log, _rows(y), None)[0]


def exponential(y: float) -> tuple[float, float]:
    """Value and slope."""
    return _called(_exponential, _rows(y), None)


def side_currents(v: float, p: Any) -> tuple[float, float]:
    """Current and conductance."""
    return _called(_side_currents, _rows(v), p)


def depletion(v: float, p: Any) -> tuple[float, float]:
    """Charge and capacitance."""
    return _called(_depletion, _rows(v), p)


def limited(v: float, old: float, p: Any) -> float:
    """Where to linearise."""
    return _called(_limited, _rows(v, old), p)[0]

"""A design document as Kirchhoff's equations of its own: F(t, y, y') = C(y) y' + i(y) - sources = 0.

Written from the published laws alone; nothing of the engine's kernel, parts or builder is in it. Diode (Shockley 1949);
transistor in transport form (Ebers, Moll 1954; Gummel, Poon 1970) with the Early effect as a factor 1 - v_BC/V_A;
depletion capacitance C0 (1 - v/0.75 V)^-1/2, linear beyond half of that; charge in transit tau i; a winding of copper,
L di/dt + R i = v, R as (234.5 + T)/254.5. At 25 C, where the document's laws are given. Residual and Jacobian are
compiled by numba, so that the peers are as fast as they can be.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass
from itertools import pairwise
from typing import Any

import numpy as np
from numba import njit

from stagebook.engine.quantity import read

VT = 0.025692579121493725  # kT/q at 25 C
POTENTIAL, HALF = 0.75, 0.375  # V
WARM = (234.5 + 25.0) / 254.5
RISE = 100e-9  # s of a supply that no event connects
CONDUCTANCE, CAPACITANCE, DIODE, TRANSISTOR, WINDING = range(5)
OPEN, CLOSED = 1e-9, 1e1  # S, contacts

Floats = np.ndarray
Values = Mapping[tuple[str, str], float]


@njit(cache=True, error_model="numpy")
def junction(v, saturation, slope, c0, transit):
    """Current, conductance, capacitance of a junction and its rise with voltage."""
    u = v / slope
    if u > 80.0:
        e = np.exp(80.0)
        g = saturation * e / slope
        i = saturation * (e * (1.0 + u - 80.0) - 1.0)
        bend = 0.0
    else:
        e = np.exp(u)
        g = saturation * e / slope
        i = saturation * (e - 1.0)
        bend = g / slope
    if v <= HALF:
        c = c0 / np.sqrt(1.0 - v / POTENTIAL)
        rise = 0.5 * c / (POTENTIAL - v)
    else:
        rise = 0.5 * c0 * np.sqrt(2.0) / HALF
        c = c0 * np.sqrt(2.0) + rise * (v - HALF)
    return i, g, c + transit * g, rise + transit * bend


@njit(cache=True, error_model="numpy")
def voltage_of(k, y, n, t, p):
    return y[k] if k < n else p[2 * (k - n)] + p[2 * (k - n) + 1] * t


@njit(cache=True, error_model="numpy")
def slope_of(k, yp, n, p):
    return yp[k] if k < n else p[2 * (k - n) + 1]


@njit(cache=True, error_model="numpy")
def flow(res, n, a, b, i):
    if a < n:
        res[a] += i
    if b < n:
        res[b] -= i


@njit(cache=True, error_model="numpy")
def put(J, n, row, column, v):
    if row < n and column < n:
        J[row, column] += v


@njit(cache=True, error_model="numpy")
def couple(J, n, a, b, v):
    put(J, n, a, a, v)
    put(J, n, a, b, -v)
    put(J, n, b, a, -v)
    put(J, n, b, b, v)


@njit(cache=True, error_model="numpy")
def residual(t, y, yp, res, rows, p):
    n = y.size
    res[:] = 0.0
    for r in range(rows.shape[0]):
        family, a, b, c, o = rows[r]
        va = voltage_of(a, y, n, t, p)
        vb = voltage_of(b, y, n, t, p)
        if family == CONDUCTANCE:
            flow(res, n, a, b, p[o] * (va - vb))
        elif family == CAPACITANCE:
            flow(res, n, a, b, p[o] * (slope_of(a, yp, n, p) - slope_of(b, yp, n, p)))
        elif family == DIODE:
            i, _, cap, _ = junction(va - vb, p[o], p[o + 1], p[o + 2], p[o + 3])
            flow(res, n, a, b, i + cap * (slope_of(a, yp, n, p) - slope_of(b, yp, n, p)))
        elif family == WINDING:
            flow(res, n, a, b, y[c])
            res[c] = p[o] * yp[c] + p[o + 1] * y[c] - (va - vb)
        else:  # a collector, b base, c emitter
            s = p[o]
            ve = voltage_of(c, y, n, t, p)
            vbc = s * (vb - va)
            forward, _, ce, _ = junction(s * (vb - ve), p[o + 1], p[o + 2], p[o + 6], p[o + 7])
            backward, _, cc, _ = junction(vbc, p[o + 1], p[o + 2], p[o + 8], p[o + 9])
            slope_b = slope_of(b, yp, n, p)
            dbe = ce * (slope_b - slope_of(c, yp, n, p))
            dbc = cc * (slope_b - slope_of(a, yp, n, p))
            over = s * (forward - backward) * (1.0 - vbc * p[o + 5])
            flow(res, n, a, c, over)
            flow(res, n, b, c, s * forward * p[o + 3] + dbe)
            flow(res, n, b, a, s * backward * p[o + 4] + dbc)


@njit(cache=True, error_model="numpy")
def jacobian(t, y, yp, cj, share, J, rows, p):
    """Set J to share dF/dy + cj dF/dy'; share 0 and cj 1 give the matrix C."""
    n = y.size
    J[:, :] = 0.0
    for r in range(rows.shape[0]):
        family, a, b, c, o = rows[r]
        va = voltage_of(a, y, n, t, p)
        vb = voltage_of(b, y, n, t, p)
        if family == CONDUCTANCE:
            couple(J, n, a, b, share * p[o])
        elif family == CAPACITANCE:
            couple(J, n, a, b, cj * p[o])
        elif family == DIODE:
            _, g, cap, rise = junction(va - vb, p[o], p[o + 1], p[o + 2], p[o + 3])
            g += rise * (slope_of(a, yp, n, p) - slope_of(b, yp, n, p))
            couple(J, n, a, b, share * g + cj * cap)
        elif family == WINDING:
            put(J, n, a, c, share)
            put(J, n, b, c, -share)
            J[c, c] += cj * p[o] + share * p[o + 1]
            put(J, n, c, a, -share)
            put(J, n, c, b, share)
        else:
            s = p[o]
            ve = voltage_of(c, y, n, t, p)
            vbc = s * (vb - va)
            forward, gf, ce, rise_e = junction(s * (vb - ve), p[o + 1], p[o + 2], p[o + 6], p[o + 7])
            backward, gr, cc, rise_c = junction(vbc, p[o + 1], p[o + 2], p[o + 8], p[o + 9])
            slope_b = slope_of(b, yp, n, p)
            dbe = share * (gf * p[o + 3] + s * rise_e * (slope_b - slope_of(c, yp, n, p))) + cj * ce
            dbc = share * (gr * p[o + 4] + s * rise_c * (slope_b - slope_of(a, yp, n, p))) + cj * cc
            couple(J, n, b, c, dbe)
            couple(J, n, b, a, dbc)
            early = 1.0 - vbc * p[o + 5]
            te = share * gf * early
            tc = share * (-gr * early - (forward - backward) * p[o + 5])
            for row, sign in ((a, 1.0), (c, -1.0)):
                put(J, n, row, b, sign * (te + tc))
                put(J, n, row, c, -sign * te)
                put(J, n, row, a, -sign * tc)


def rates(t: float, y: Floats, rows: Floats, p: Floats) -> Floats:
    """The explicit form y' = -C(y)^-1 (i(y) - sources)."""
    left, matrix, still = np.empty(y.size), np.empty((y.size, y.size)), np.zeros(y.size)
    y = y.copy()
    y.flags.writeable = still.flags.writeable = False  # as IDA hands them over: one compiled form for both
    residual(t, y, still, left, rows, p)
    jacobian(t, y, still, 1.0, 0.0, matrix, rows, p)
    return -np.linalg.solve(matrix, left)


def _number(text: Any, unit: str = "") -> float:
    return float(read(text, unit)) if isinstance(text, str) else float(text)


@dataclass(frozen=True)
class Operated:
    """A contact that a winding moves: row of its current, where its conductance is, the currents of the coil."""

    current: int
    place: int
    pick_up: float
    drop_out: float


@dataclass(frozen=True)
class Network:
    """The equations of one document: rows (family, nets, first parameter), what every source does over time."""

    names: tuple[str, ...]
    rows: Floats
    p: Floats
    sources: tuple[tuple[tuple[float, float], ...], ...]
    corners: tuple[float, ...]
    operated: tuple[Operated, ...]
    start: Floats

    def index(self, name: str) -> int:
        return self.names.index(name)

    def piece(self, begin: float, end: float, p: Floats) -> None:
        """Write into p what the sources do from ``begin`` to ``end``, by straight lines; time counts from ``begin``."""
        for k, points in enumerate(self.sources):
            times, values = zip(*points, strict=True)
            first, last = np.interp((begin, end), times, values)
            p[2 * k : 2 * k + 2] = first, (last - first) / (end - begin)

    @classmethod
    def of(cls, document: dict[str, Any], values: Values | None = None) -> Network:
        """Read a document; ``values`` by (ref, datum) replace what is written, in SI."""
        given = dict(values or {})

        def value(part: dict[str, Any], unit: str) -> float:
            return given.get((part["ref"], "value"), _number(part.get("value"), unit) if "value" in part else 0.0)

        (sequence,) = document["sequences"].values()
        ends = _number(sequence["ends"], "s")
        conditions = document["conditions"]
        volts = given.get(("conditions", "supply"), _number(conditions["supply"], "V"))
        rise = next(
            (_number(e["rise"], "s") for e in sequence["events"] if e["event"] == "connect supply" and "rise" in e),
            RISE,
        )
        sources: dict[str, tuple[tuple[float, float], ...]] = {
            "0V": ((0.0, 0.0), (ends, 0.0)),
            "battery": ((0.0, 0.0), (rise, volts), (ends, volts)),
        }
        parts = [part for stage in document["stages"] for part in stage["parts"]]
        for part in parts:
            if part["kind"] == "generator":
                points = [(_number(t, "s"), _number(v, "V")) for t, v in part["waveform"]["steps"]]
                sources[part["pins"]["plus"]] = (*points, (ends, points[-1][1]))
        free: dict[str, None] = {}
        for part in parts:
            free.update(dict.fromkeys(net for net in part["pins"].values() if net not in sources))
        coils = [part for part in parts if part["kind"] == "coil"]
        names = (*free, *(part["ref"] for part in coils))
        place = {name: k for k, name in enumerate((*names, *sources))}
        p = [0.0] * (2 * len(sources))
        rows: list[tuple[int, ...]] = []
        contacts: list[tuple[str, int]] = []

        def add(family: int, nets: tuple[str, ...], *numbers: float) -> None:
            at = [place[net] for net in nets]
            rows.append((family, *at, *[0] * (3 - len(at)), len(p)))
            p.extend(numbers)

        add(CONDUCTANCE, ("battery", "supply"), 1.0 / _number(conditions["source_resistance"], "ohm"))
        for part in parts:
            kind, ref, pins = part["kind"], part["ref"], part["pins"]
            law = {key: _number(v) if not isinstance(v, bool) else v for key, v in part.get("law", {}).items()}
            if kind == "resistor":
                add(CONDUCTANCE, (pins["a"], pins["b"]), 1.0 / value(part, "ohm"))
            elif kind == "capacitor":
                add(CAPACITANCE, (pins["a"], pins["b"]), value(part, "F"))
            elif kind == "contact":
                contacts.append((part["operated_by"], len(p)))
                add(CONDUCTANCE, (pins["a"], pins["b"]), OPEN)
            elif kind == "coil":
                ohms = _number(part["resistance"], "ohm")
                add(WINDING, (pins["a"], pins["b"], ref), _number(part["inductance"], "H"), ohms * WARM)
            elif kind == "diode":
                saturation = given.get((ref, "saturation_current"), law["saturation_current"])
                numbers = saturation, law.get("ideality", 1.0) * VT, law.get("capacitance", 0.0)
                add(DIODE, (pins["anode"], pins["cathode"]), *numbers, law.get("transit_time", 0.0))
            elif kind in ("npn", "pnp"):
                add(
                    TRANSISTOR,
                    (pins["collector"], pins["base"], pins["emitter"]),
                    1.0 if kind == "npn" else -1.0,
                    given.get((ref, "saturation_current"), law["saturation_current"]),
                    VT,
                    1.0 / given.get((ref, "gain"), law["forward_gain"]),
                    1.0 / law.get("reverse_gain", 1.0),
                    1.0 / law["early_voltage"] if "early_voltage" in law else 0.0,
                    law.get("base_emitter_capacitance", 0.0),
                    law.get("forward_transit_time", 0.0),
                    law.get("base_collector_capacitance", 0.0),
                    law.get("reverse_transit_time", 0.0),
                )
            elif kind != "generator":
                raise ValueError(kind)
        operated = []
        for ref, where in contacts:
            coil = next(part for part in coils if part["ref"] == ref)
            ohms = _number(coil["resistance"], "ohm")
            limits = (_number(coil[key], "V") / ohms for key in ("pick_up", "drop_out"))
            operated.append(Operated(place[ref], where, *limits))
        times = sorted({t for points in sources.values() for t, _ in points if 0.0 <= t <= ends} | {0.0, ends})
        return cls(
            names,
            np.array(rows, dtype=np.int64),
            np.array(p),
            tuple(sources.values()),
            tuple(times),
            tuple(operated),
            np.zeros(len(names)),
        )


Watch = tuple[str, float, int]
Piece = Callable[[float, Floats, Floats, list[tuple[int, float, int]]], tuple[float, Floats, list[list[float]], int]]


def through(network: Network, watches: list[Watch], solve: Piece) -> list[list[float]]:
    """Solve from corner to corner; return the instants at which each watched unknown passes its level.

    ``solve(length, y, p, watches)`` goes on for ``length`` s, or until the last watches, those of the coils, are seen;
    it returns how far it came, the state there, crossings and the number of the watch that stopped it (-1: none).
    """
    p, y = network.p.copy(), network.start
    found: list[list[float]] = [[] for _ in watches]
    own = [(network.index(name), level, way) for name, level, way in watches]
    pulled = [False] * len(network.operated)
    for begin, end in pairwise(network.corners):
        at = begin
        while at < end:
            network.piece(at, end, p)
            moves = [
                (each.current, each.drop_out if on else each.pick_up, -1 if on else 1)
                for each, on in zip(network.operated, pulled, strict=True)
            ]
            reached, y, crossings, stopped = solve(end - at, y, p, own + moves)
            for times, more in zip(found, crossings, strict=False):
                times.extend(at + t for t in more)
            if stopped < 0:
                break
            at += reached
            k = stopped - len(own)
            pulled[k] = not pulled[k]
            p[network.operated[k].place] = CLOSED if pulled[k] else OPEN
    return found

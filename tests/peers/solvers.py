"""The peers: SUNDIALS IDA (PyPI scikit-sundae) and SciPy's Radau, on the equations of :mod:`.network`."""

from __future__ import annotations

import numpy as np
from scipy.integrate import solve_ivp
from sksundae.ida import IDA

from .network import Floats, Network, Watch, jacobian, rates, residual, through

FIRST = 1e-11  # s
MOST = 500_000  # steps


def ida(network: Network, watches: list[Watch], relative: float, absolute: float, with_jacobian: bool = True) -> list:
    """Crossings of the watched unknowns by IDA. The Jacobian is compiled too; without it IDA takes differences."""
    rows = network.rows

    def solve(length: float, y: Floats, p: Floats, watched: list) -> tuple[float, Floats, list, int]:
        moves = len(network.operated)
        options = {}
        if watched:
            places = np.array([k for k, _, _ in watched])
            levels = np.array([level for _, level, _ in watched])

            def events(t: float, y: Floats, yp: Floats, out: Floats) -> None:
                out[:] = y[places] - levels

            events.terminal = [False] * (len(watched) - moves) + [True] * moves
            events.direction = [way for *_, way in watched]
            options = {"eventsfn": events, "num_events": len(watched)}
        if with_jacobian:
            options["jacfn"] = lambda t, y, yp, res, cj, J: jacobian(t, y, yp, cj, 1.0, J, rows, p)
        solver = IDA(
            lambda t, y, yp, res: residual(t, y, yp, res, rows, p),
            rtol=relative,
            atol=absolute,
            first_step=min(FIRST, 0.01 * length),
            max_num_steps=MOST,
            **options,
        )
        solved = solver.solve(np.array([0.0, length]), y, rates(0.0, y, rows, p))
        assert solved.success, solved.message
        found, stopped = [[] for _ in watched], -1
        if watched and solved.i_events is not None:
            for time, hits in zip(solved.t_events, solved.i_events, strict=True):
                for k, hit in enumerate(hits):
                    if hit:
                        found[k].append(float(time))
                        stopped = k if k >= len(watched) - moves else stopped
        return float(solved.t[-1]), np.array(solved.y[-1]), found, stopped

    return through(network, watches, solve)


def radau(network: Network, watches: list[Watch], relative: float, absolute: float) -> list:
    """Crossings of the watched unknowns by Radau, an implicit Runge-Kutta method of order 5."""
    rows = network.rows

    def solve(length: float, y: Floats, p: Floats, watched: list) -> tuple[float, Floats, list, int]:
        moves = len(network.operated)
        events = []
        for n, (k, level, way) in enumerate(watched):
            event = lambda t, y, k=k, level=level: y[k] - level  # noqa: E731
            event.direction, event.terminal = way, n >= len(watched) - moves
            events.append(event)
        solved = solve_ivp(
            lambda t, y: rates(t, y, rows, p),
            (0.0, length),
            y,
            "Radau",
            events=events or None,
            rtol=relative,
            atol=absolute,
            first_step=min(FIRST, 0.01 * length),
        )
        assert solved.success, solved.message
        found = [] if not watched else [list(map(float, times)) for times in solved.t_events]
        stopped = -1
        if solved.status == 1:
            stopped = next(k for k in range(len(watched) - moves, len(watched)) if found[k])
        return float(solved.t[-1]), solved.y[:, -1], found, stopped

    return through(network, watches, solve)

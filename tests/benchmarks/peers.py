"""What the sweep is measured against: general solvers on the same model problem, exact answers, the machine itself.

Unit plates, upper wall ramped to unit speed over ``share`` diffusion times, run for one diffusion time.  Velocities at
the inner nodes of a graded grid of finite volumes; the peak stress from the balance of the wall's half cell at the end
of the ramp, the settling time from the logarithm of the deviation between stored instants.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache

import numpy as np
from scipy.integrate import odeint, solve_ivp

from transient.compiled import compiled

CELLS = (16, 20, 24, 32, 40, 48, 64, 96)
TOLERANCES = (3e-3, 1e-3, 3e-4, 1e-4, 3e-5, 1e-5, 1e-6)
WITHIN = 0.01
INSTANTS = 24  # stored after the ramp


@lru_cache(maxsize=4096)
def exact(share: float) -> tuple[float, float]:
    """(peak stress over mu U / h, settling time in diffusion times), by the sine series of plane start-up flow added
    up over the ramp (Carslaw & Jaeger 1959, chapter 3, from memory)."""
    k = np.arange(1, 4000)
    decay = (k * np.pi) ** 2
    peak = 1.0 + 2.0 * np.sum(-np.expm1(-decay * share) / decay) / share + 2.0 / np.pi**2 / 3999.5 / share
    few, y = k[:40], np.linspace(0.0, 1.0, 2001)[:, None]
    shape = 2.0 * (-1.0) ** few / (few * np.pi) * np.sin(few * np.pi * y)
    slow = decay[:40]

    def away(t: float) -> float:
        return float(np.abs(shape @ (np.exp(-slow * (t - share)) * -np.expm1(-slow * share) / (slow * share))).max())

    return peak, _last(away, share + 0.1, 1.0)


def _last(away: Callable[[float], float], low: float, high: float) -> float:
    for _ in range(50):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if away(middle) > WITHIN else (low, middle)
    return high


def last_above(flow, height: float, speed: float, within: float, over: float, duration: float) -> float:
    """When the exact deviation of a solution from its steady end last leaves the band, s."""
    y = np.linspace(0.0, height, 401)

    def away(t: float) -> float:
        field, _ = flow.velocity(np.array([1]), np.array([t - over]), y)
        d = np.abs(field[0] - speed * y / height)
        i = int(np.clip(d.argmax(), 1, len(y) - 2))
        bend = d[i - 1] - 2.0 * d[i] + d[i + 1]
        return float(d[i] - (d[i + 1] - d[i - 1]) ** 2 / (8.0 * bend)) / speed * WITHIN / within

    return _last(away, over + 0.1 * duration, duration)


class Grid:
    """Finite volumes of unit plates, cells growing in proportion to the distance from the moving wall."""

    def __init__(self, cells: int):
        layer = 0.05
        y = 1.0 - layer * np.expm1(np.log1p(1.0 / layer) * np.linspace(1.0, 0.0, cells + 1))
        y[0], y[-1] = 0.0, 1.0
        self.y, step = y, np.diff(y)
        self.conductance = 1.0 / step
        self.volume = 0.5 * (step[1:] + step[:-1])
        self.half = 0.5 * step[-1]
        self.lower = np.append(0.0, self.conductance[1:-1]) / self.volume
        self.upper = np.append(self.conductance[1:-1], 0.0) / self.volume
        self.diagonal = -(self.conductance[1:] + self.conductance[:-1]) / self.volume
        self.drive = self.conductance[-1] / self.volume[-1]


@compiled
def compiled_side(t, w, lower, diagonal, upper, drive, share, out):
    """The right-hand side without NumPy."""
    n = len(w)
    for i in range(n):
        total = diagonal[i] * w[i]
        if i > 0:
            total += lower[i] * w[i - 1]
        if i + 1 < n:
            total += upper[i] * w[i + 1]
        out[i] = total
    out[n - 1] += drive * min(t / share, 1.0)


def numpy_side(grid: Grid, share: float) -> Callable[[float, np.ndarray], np.ndarray]:
    """The right-hand side as users write it."""

    def side(t: float, w: np.ndarray) -> np.ndarray:
        out = grid.diagonal * w
        out[1:] += grid.lower[1:] * w[:-1]
        out[:-1] += grid.upper[:-1] * w[1:]
        out[-1] += grid.drive * min(t / share, 1.0)
        return out

    return side


def quick_side(grid: Grid, share: float) -> Callable[[float, np.ndarray], np.ndarray]:
    """The compiled right-hand side behind a thin Python function."""
    out = np.empty(len(grid.volume))
    parts = (grid.lower, grid.diagonal, grid.upper, grid.drive, share, out)

    def side(t: float, w: np.ndarray) -> np.ndarray:
        compiled_side(t, w, *parts)
        return out

    return side


Side = Callable[[Grid, float], Callable[[float, np.ndarray], np.ndarray]]


@dataclass(frozen=True)
class Peer:
    """``solve(grid, share, tolerance)`` gives (peak stress, settling time); ``side``: "numpy" or "compiled"."""

    name: str
    side: str
    solve: Callable[[Grid, float, float], tuple[float, float]]


def instants(share: float) -> np.ndarray:
    """When the state is stored, from the end of the ramp on."""
    return np.linspace(share, 1.0, INSTANTS)


def headline(grid: Grid, share: float, times: np.ndarray, states: np.ndarray) -> tuple[float, float]:
    """Peak from the first state (end of the ramp), settling time from all (n, inner nodes)."""
    peak = grid.conductance[-1] * (1.0 - states[0, -1]) + grid.half / share
    d = np.abs(states - grid.y[1:-1])
    i = np.clip(d.argmax(axis=1), 1, d.shape[1] - 2)
    row, y = np.arange(len(d)), grid.y[1:-1]
    low, high = y[i] - y[i - 1], y[i + 1] - y[i]
    rise, fall = (d[row, i] - d[row, i - 1]) / low, (d[row, i] - d[row, i + 1]) / high
    top = d[row, i] + (rise * high - fall * low) ** 2 / ((low + high) * 4.0 * np.maximum(rise + fall, 1e-300))
    above = np.flatnonzero(top > WITHIN)[-1]
    near = slice(max(above - 1, 0), above + 3)
    fit = np.polyfit(times[near] - times[above], np.log(top[near]), len(times[near]) - 1)
    a, b = 0.0, times[above + 1] - times[above]
    for _ in range(40):
        middle = 0.5 * (a + b)
        a, b = (middle, b) if np.polyval(fit, middle) > np.log(WITHIN) else (a, middle)
    return float(peak), float(times[above] + b)


def _lsoda(side: Side) -> Callable[[Grid, float, float], tuple[float, float]]:
    def solve(grid: Grid, share: float, tolerance: float) -> tuple[float, float]:
        times, start = instants(share), np.zeros(len(grid.volume))
        more = {"tfirst": True, "ml": 1, "mu": 1, "rtol": tolerance, "atol": tolerance * 1e-2}
        function = side(grid, share)
        first = odeint(function, start, np.array([0.0, share]), tcrit=np.array([share]), **more)[-1]
        return headline(grid, share, times, odeint(function, first, times, mxstep=5000, **more))

    return solve


def _ivp(method: str) -> Callable[[Grid, float, float], tuple[float, float]]:
    def solve(grid: Grid, share: float, tolerance: float) -> tuple[float, float]:
        from scipy.sparse import diags

        matrix = diags([grid.lower[1:], grid.diagonal, grid.upper[:-1]], [-1, 0, 1], format="csc")
        more = {"method": method, "jac": matrix, "rtol": tolerance, "atol": tolerance * 1e-2}
        side, times = numpy_side(grid, share), instants(share)
        first = solve_ivp(side, (0.0, share), np.zeros(len(grid.volume)), **more).y[:, -1]
        later = solve_ivp(side, (share, 1.0), first, t_eval=times, **more)
        return headline(grid, share, times, later.y.T)

    return solve


def _cvode(grid: Grid, share: float, tolerance: float) -> tuple[float, float]:
    from sksundae.cvode import CVODE

    parts = (grid.lower, grid.diagonal, grid.upper, grid.drive, share)

    def side(t: float, w: np.ndarray, out: np.ndarray) -> None:
        compiled_side(t, w, *parts, out)

    times, state = instants(share), np.zeros(len(grid.volume))
    more = {"linsolver": "band", "lband": 1, "uband": 1, "rtol": tolerance, "atol": tolerance * 1e-2}
    first = CVODE(side, **more).solve(np.array([0.0, share]), state).y[-1]
    return headline(grid, share, times, CVODE(side, **more).solve(times, first).y)


def available() -> list[Peer]:
    """The peers that are installed."""
    out = [
        Peer("LSODA, banded, NumPy right-hand side", "numpy", _lsoda(numpy_side)),
        Peer("Radau, sparse Jacobian, NumPy right-hand side", "numpy", _ivp("Radau")),
        Peer("BDF, sparse Jacobian, NumPy right-hand side", "numpy", _ivp("BDF")),
        Peer("LSODA, banded, compiled right-hand side", "compiled", _lsoda(quick_side)),
    ]
    try:
        import sksundae  # noqa: F401
    except ImportError:
        return out
    return [*out, Peer("CVODE, banded, compiled right-hand side", "compiled", _cvode)]


def kernel_and_limit() -> tuple[float, float]:
    """(march of the lanes, its multiply-adds and divisions alone from the first cache), s per cell and step."""
    from transient.march.lanes_vector import WIDTH

    nodes = 24
    arrays = [np.full((nodes, WIDTH), 0.5) for _ in range(3)]
    add = _best(lambda: multiply_adds(*arrays, 4000), 4000 * nodes * WIDTH)
    divide = _best(lambda: divisions(*arrays, 4000), 4000 * nodes * WIDTH)
    march, steps_of_a_factor = _march_alone()
    return march, MULTIPLY_ADDS * add + divide / steps_of_a_factor


# of one cell and step, the two solves alone: in each a product and a multiply-add on the way in, and on the way out
MULTIPLY_ADDS = 8


def _best(what: Callable[[], object], work: int) -> float:
    what()
    taken = []
    for _ in range(9):
        began = time.perf_counter()
        what()
        taken.append(time.perf_counter() - began)
    return min(taken) / work


def _march_alone() -> tuple[float, int]:
    """(s per cell and step, steps for which factors are kept) of the finest level of typical cases."""
    from transient.case.model import Case
    from transient.march.lanes import march
    from transient.march.lanes_grid import grid_table, unit_problem
    from transient.march.lanes_inputs import FIRST_ROW, LENGTH, PIECE_FIELDS, START
    from transient.march.lanes_layout import CALM, CASE_FIELDS, FIELDS, GROWTH, LONGEST, ROOM, ROWS

    wall = {"upper": {"speed": {"kind": "step", "to": "1 m/s"}}}
    fluid = {"density": "1000 kg/m^3", "viscosity": "1 mPa*s"}
    case = Case({"gap": {"shape": "plates", "height": "1 mm"}, "fluid": fluid, "wall": wall})
    cells, every, count = 48, 4, 256
    table, ends = grid_table(unit_problem(case.problem()), cells, (1.0, 1.0 / 16.0))
    numbers = np.zeros((count, CASE_FIELDS))
    numbers[:, LONGEST], numbers[:, CALM], numbers[:, GROWTH] = 0.045, 0.9, 0.5
    numbers[:, ROOM] = 100
    parts = np.zeros((count, 2, PIECE_FIELDS))
    share = np.linspace(0.005, 0.02, count)
    parts[:, 0, LENGTH], parts[:, 1, LENGTH], parts[:, 1, START] = share, 1.0 - share, share
    parts[:, :, FIRST_ROW] = 0.05 * share[:, None]
    parts[:, :, FIRST_ROW + 1] = 1e300
    poly, wave = np.zeros((count, 2, 3, 4)), np.zeros((count, 2, 3, 4))
    poly[:, 0, 1, 1], poly[:, 1, 1, 0] = 1.0 / share, 1.0
    final = np.zeros((count, 3))
    final[:, 1] = 1.0
    rows = np.empty((count, 100, FIELDS))
    kept = np.zeros((count, 100), np.int64), np.zeros((count, 100)), np.zeros(count, np.int64)
    fixed = (
        table[None], ends[None], np.zeros(count, np.int64), numbers, np.full(count, 2), parts, poly, wave,
        np.zeros((count, 2, 3)), np.zeros((count, 3)), final, every, False,
        False, np.zeros((count, 2, 3)), rows, *kept,
    )  # fmt: skip
    steps = march(*fixed)
    return _best(lambda: march(*fixed), steps * cells), ROWS * every


def _limits() -> tuple[Callable, Callable]:
    from transient.march.lanes_vector import fma, load, splat, store

    @compiled
    def multiply_adds(a, b, c, times):
        """c <- a b + c, both factors from the first cache, sums in registers."""
        for _ in range(times):
            one, two, three, four = splat(0.0), splat(0.0), splat(0.0), splat(0.0)
            for i in range(0, len(a), 4):
                one = fma(load(a, i), load(b, i), one)
                two = fma(load(a, i + 1), load(b, i + 1), two)
                three = fma(load(a, i + 2), load(b, i + 2), three)
                four = fma(load(a, i + 3), load(b, i + 3), four)
            store(c, 0, one + two + three + four)

    @compiled
    def divisions(a, b, c, times):
        """c <- a / b."""
        for _ in range(times):
            for i in range(len(a)):
                store(c, i, load(a, i) / load(b, i))

    return multiply_adds, divisions


multiply_adds, divisions = _limits()
__all__ = ["CELLS", "TOLERANCES", "Grid", "Peer", "available", "exact", "kernel_and_limit", "last_above"]

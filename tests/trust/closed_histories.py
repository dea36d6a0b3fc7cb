"""Histories made from textbook series and single eigenfunctions, and small cases to go with them.

None of it comes from the solver.  Series: start-up of plane Couette flow (Christov 2013, arXiv 1305.5999), of pipe
flow (Szymanski 1932), eigenfunctions of annuli (Abramowitz & Stegun 1964, 9.5.27 ff. and Table 9.7, from memory).
"""

from __future__ import annotations

import numpy as np
from scipy import special

from transient.drive.pieces import Drive, Eventual, Pieces, Track, constant
from transient.gap.problem import Law, Problem, Wall
from transient.result.history import History

DENSITY, VISCOSITY = 900.0, 0.09
NU = VISCOSITY / DENSITY
MODES = np.arange(1, 4001)


def problem(metric=0, inner=0.0, outer=1e-3, speeds=(0.0, 0.0), gradient=0.0, **more) -> Problem:
    """A case with defaults; speeds and gradient: numbers or Drives; more: kinds, slips, names, any of Problem's."""
    kinds = more.pop("kinds", ("moving", "moving"))
    slips = more.pop("slips", (0.0, 0.0))
    names = more.pop("names", ("lower", "upper"))
    density, viscosity = more.pop("density", DENSITY), more.pop("viscosity", VISCOSITY)
    drives = [value if isinstance(value, Drive) else constant(value) for value in (*speeds, gradient)]
    walls = tuple(
        Wall(name, kind, slip, None, radius)
        for name, kind, slip, radius in zip(names, kinds, slips, (inner, outer), strict=True)
    )
    keys = {"start": "rest", "duration": None, "settle_within": 0.01, "accuracy": 1e-4} | more
    return Problem(
        "test", metric, inner, outer, density, Law(0, (viscosity,)), walls, tuple(drives[:2]), drives[2], **keys
    )


def ramp_drive(to: float, over: float) -> Drive:
    """A straight line from 0 to ``to`` in ``over``, then held."""
    poly = np.array([[0.0, to / over, 0.0, 0.0], [to, 0.0, 0.0, 0.0]])
    none = np.zeros((2, 0), complex)
    pieces = Pieces(np.array([0.0, over]), poly, none, none, 0.0)
    return Drive((Track(pieces),), 0.0, Eventual(constant(to), None, over))


def sine_drive(amplitude: float, period: float) -> Drive:
    """amplitude sin(2 pi t / period)."""
    rate = np.array([[2j * np.pi / period]])
    pieces = Pieces(np.zeros(1), np.zeros((1, 4)), np.array([[-1j * amplitude]]), rate, 0.0)
    drive = Drive((Track(pieces),), 0.0, Eventual(None, period))
    object.__setattr__(drive, "eventual", Eventual(drive, period, 0.0))
    return drive


def graded(n: int = 241, first: float = 1e-4) -> np.ndarray:
    """n nodes on [0, 1], first interval about ``first`` at both ends."""
    s = np.linspace(-1.0, 1.0, n)
    stretch = float(np.arccosh(1.0 / np.sqrt(first * n))) if first * n < 1.0 else 0.1
    return 0.5 * (1.0 + np.tanh(stretch * s) / np.tanh(stretch))


def rows(starts: list[float], end: float, first: float, growth: float = 1.1) -> tuple[np.ndarray, ...]:
    """(time, piece, offset): each piece from 0 by geometric steps from ``first``, no step beyond 1/40 of the piece."""
    piece, offset = [], []
    for number, (start, stop) in enumerate(zip(starts, [*starts[1:], end], strict=True)):
        length, x, step, own = stop - start, first, first, [0.0]
        while x < length * 0.999:
            own.append(x)
            step = min(step * growth, length / 40)
            x += step
        own.append(length)
        piece += [number] * len(own)
        offset += own
    piece, offset = np.array(piece), np.array(offset)
    return np.array(starts)[piece] + offset, piece, offset


def made(case: Problem, time, piece, offset, stress, stress_rate, profile, profile_rate, position, gradient) -> History:
    """A History that keeps every profile; wall speeds are the profile's ends, the mean its integral."""
    mean, mean_rate = (average(case, position, values) for values in (profile, profile_rate))
    return History(
        time, piece, offset, stress, stress_rate, profile[:, [0, -1]], profile_rate[:, [0, -1]], mean, mean_rate,
        gradient, np.zeros(len(time)), np.zeros((len(time), 2)),  # the pressure is constant in all of them
        position, np.arange(len(time)), profile, profile_rate, np.zeros_like(profile),
    )  # fmt: skip


def average(case: Problem, position, values):
    """Mean over the section by SciPy's spline through the nodes."""
    from scipy.interpolate import CubicSpline

    power = min(case.metric, 1)
    area = case.gap if case.metric != 1 else 0.5 * (case.outer**2 - case.inner**2)
    return CubicSpline(position, values * position**power, axis=1).integrate(position[0], position[-1]) / area


def _after(t: np.ndarray, h: float):
    """e^(-lambda t) (n, modes), lambda (modes,)."""
    rate = (MODES * np.pi / h) ** 2 * NU
    return np.exp(-np.clip(t, 0, None)[:, None] * rate), rate


def couette_ramp(to: float = 0.3, over: float = 2e-3, end: float = 12e-3, n: int = 241) -> tuple[Problem, History]:
    """The upper of two plates 1 mm apart brought up to speed by a ramp."""
    h = 1e-3
    case = problem(outer=h, speeds=(0.0, ramp_drive(to, over)))
    time, piece, offset = rows([0.0, over], end, 1e-6 * h * h / NU)
    position = h * graded(n)
    a = to / over
    sign = np.where(MODES % 2, -1.0, 1.0)
    shape = np.sin(np.pi * np.outer(MODES, position / h)) * (2.0 * sign / (MODES * np.pi))[:, None]
    shape[:, -1] = 0.0
    stress, stress_rate = np.zeros((len(time), 2)), np.zeros((len(time), 2))
    profile, profile_rate = np.zeros((len(time), n)), np.zeros((len(time), n))
    for begin, acceleration in ((0.0, a), (over, -a)):
        t = time - begin
        on = (t > 0) | ((t == 0) & (offset == 0.0))
        decay, rate = _after(t[on], h)
        # sum 2 (-1)^n sin(n pi y)/(n pi)^3 = (y^3 - y)/6 (Fourier series of a cubic)
        settled = h * h / NU * ((position / h) ** 3 - position / h) / 6
        lag = acceleration * (h * h / (6 * NU) - (decay / rate).sum(axis=1))  # sum 1/n^2 = pi^2/6 (Euler)
        lag_other = acceleration * (-h * h / (12 * NU) - (decay / rate * sign).sum(axis=1))
        profile[on] += acceleration * (t[on, None] * position / h + settled - (decay / rate) @ shape)
        profile_rate[on] += acceleration * (position / h + decay @ shape)
        first = t[on] == 0.0
        profile[np.flatnonzero(on)[first]] -= acceleration * (settled - (decay[first] / rate) @ shape)
        stress[on, 1] -= VISCOSITY / h * (acceleration * t[on] + 2 * np.where(first, 0.0, lag))
        stress[on, 0] += VISCOSITY / h * (acceleration * t[on] + 2 * np.where(first, 0.0, lag_other))
        with np.errstate(divide="ignore"):
            edge = np.where(first, 0.0, acceleration * (1 + 2 * decay.sum(axis=1)))
        stress_rate[on, 1] -= VISCOSITY / h * edge
        stress_rate[on, 0] += VISCOSITY / h * np.where(first, 0.0, acceleration * (1 + 2 * (decay @ sign)))
        profile_rate[np.flatnonzero(on)[first], :-1] -= acceleration * (position / h + shape.sum(axis=0))[:-1]
    return case, made(
        case, time, piece, offset, stress, stress_rate, profile, profile_rate, position, np.zeros_like(time)
    )


def couette_sudden(speed: float = 0.3, end: float = 12e-3, n: int = 241) -> tuple[Problem, History]:
    """The upper of two plates 1 mm apart set in motion at once: infinite stress at t = 0."""
    h = 1e-3
    case = problem(outer=h, speeds=(0.0, constant(speed, before=0.0)))
    time, piece, offset = rows([0.0], end, 1e-6 * h * h / NU)
    position = h * graded(n)
    decay, rate = _after(time, h)
    sign = np.where(MODES % 2, -1.0, 1.0)
    shape = np.sin(np.pi * np.outer(MODES, position / h)) * (2.0 * sign / (MODES * np.pi))[:, None]
    shape[:, -1] = 0.0
    profile = speed * (position / h + decay @ shape)
    profile_rate = -speed * ((decay * rate) @ shape)
    stress = speed * VISCOSITY / h * np.stack([1 + 2 * (decay @ sign), -(1 + 2 * decay.sum(axis=1))], axis=1)
    falling = decay * rate
    stress_rate = speed * VISCOSITY / h * np.stack([-2 * (falling @ sign), 2 * falling.sum(axis=1)], axis=1)
    profile[0], profile_rate[0] = 0.0, 0.0
    profile[0, -1] = speed
    stress[0], stress_rate[0] = (0.0, np.nan), (0.0, np.nan)
    return case, made(
        case, time, piece, offset, stress, stress_rate, profile, profile_rate, position, np.zeros_like(time)
    )


def pipe_start(gradient: float = 2e4, end: float = 12e-3, n: int = 241) -> tuple[Problem, History]:
    """A pipe of 1 mm radius under a sudden pressure drop (Szymanski 1932)."""
    radius = 1e-3
    case = problem(1, 0.0, radius, gradient=constant(gradient, before=0.0), kinds=("axis", "moving"))
    time, piece, offset = rows([0.0], end, 1e-6 * radius**2 / NU)
    position = radius * graded(n)
    zero = special.jn_zeros(0, 1500)
    rate = zero**2 * NU / radius**2
    decay = np.exp(-time[:, None] * rate)
    shape = special.j0(np.outer(zero, position / radius)) * (2 / (zero**3 * special.j1(zero)))[:, None]
    shape[:, -1] = 0.0
    scale = gradient * radius**2 / VISCOSITY
    profile = scale * (0.25 * (1 - (position / radius) ** 2) - decay @ shape)
    profile_rate = scale * ((decay * rate) @ shape)
    bore = 0.5 * gradient * radius * (1 - 4 * (decay / zero**2).sum(axis=1))
    bore_rate = 2.0 * gradient * radius * (decay * rate / zero**2).sum(axis=1)
    # The first instant from its limits: all still, uniform acceleration, no stress yet.
    profile[0], profile_rate[0], bore[0] = 0.0, gradient / DENSITY, 0.0
    profile_rate[0, -1] = 0.0
    nothing = np.zeros_like(time)
    return case, made(
        case, time, piece, offset, np.stack([nothing, bore], axis=1), np.stack([nothing, bore_rate], axis=1),
        profile, profile_rate, position, np.full_like(time, gradient),
    )  # fmt: skip


def annulus_mode(metric: int, slip: float = 0.0, n: int = 161) -> tuple[Problem, History]:
    """One eigenfunction dying away between cylinders at rest, radius ratio 2: axial (J0, Y0) or rotating (J1, Y1)."""
    order = {1: 0, 3: 1}[metric]
    root = {1: 3.12303, 3: 3.19658}[metric]  # Abramowitz & Stegun, Table 9.7 (existence seen, digits from memory)
    inner, outer = 1e-3, 2e-3
    k = _refine(order, root) / inner
    case = problem(metric, inner, outer, names=("inner", "outer"))
    position = inner + (outer - inner) * graded(n, 2e-3)
    time, piece, offset = rows([0.0], 3.0 / (NU * k * k), 0.02 / (NU * k * k))
    decay = np.exp(-NU * k * k * time)
    mode = special.jv(order, k * position) * special.yv(order, k * inner) - special.yv(
        order, k * position
    ) * special.jv(order, k * inner)
    slope = k * (
        special.jvp(order, k * position) * special.yv(order, k * inner)
        - special.yvp(order, k * position) * special.jv(order, k * inner)
    )
    mode[[0, -1]] = 0.0
    w = mode / position**order  # angular speed where rotating; at the walls both vanish, so the slope is u'
    profile = decay[:, None] * w
    stress = VISCOSITY * decay[:, None] * np.array([slope[0], -slope[-1]])
    falling = -NU * k * k
    return case, made(
        case, time, piece, offset, stress, falling * stress, profile, falling * profile, position, np.zeros_like(time)
    )


def _refine(order: int, guess: float) -> float:
    from scipy.optimize import brentq

    def cross(x: float) -> float:
        return special.jv(order, x) * special.yv(order, 2 * x) - special.jv(order, 2 * x) * special.yv(order, x)

    return brentq(cross, guess - 1e-3, guess + 1e-3, xtol=1e-14)

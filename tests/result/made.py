"""Results made from closed series, so that store, tables and figures are tested without the solver.

Between plates, wall y = h set in motion: u/U = y/h + (2/pi) sum (-1)^n/n exp(-n^2 pi^2 T) sin(n pi y/h), T = nu t/h^2
(Christov 2013, arXiv 1305.5999); other drives by Duhamel's superposition of it.  Pipe under a pressure step: Szymanski,
J. Math. Pures Appl. 11 (1932) 67.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache

import numpy as np
from scipy.special import j0, j1, jn_zeros

from transient.result.result import Result, Variable

DENSITY, VISCOSITY = 998.0, 1.002e-3


def assemble(
    title: str,
    shape: str,
    walls: list[str],
    time: np.ndarray,
    profile_time: np.ndarray,
    position: np.ndarray,
    stress: np.ndarray,
    speed: np.ndarray,
    mean: np.ndarray,
    gradient: np.ndarray,
    velocity: np.ndarray,
    breaks: list[float],
    **more: np.ndarray,
) -> Result:
    """A Result with the contract's variables.  ``stress``, ``speed`` (n, walls); ``velocity`` (k, N)."""
    rotating = shape == "rotating annulus"
    across = "distance from the lower wall" if shape == "plates" else "radius"
    v = {
        "time": Variable(("time",), time, "s", "time since the start of the run"),
        "profile_time": Variable(("profile_time",), profile_time, "s", "time of the velocity profiles"),
        "position": Variable(("position",), position, "m", across),
        "wall": Variable(("wall",), np.array(walls), "1", "name of the wall"),
        "drive_break": Variable(("drive_break",), np.array(breaks, float), "s", "breaks of the drive"),
        "wall_stress": Variable(("time", "wall"), stress, "Pa", "stress of the fluid on the wall"),
        "wall_speed": Variable(("time", "wall"), speed, "rad/s" if rotating else "m/s", "speed of the wall"),
        "mean_velocity": Variable(("time",), mean, "m/s", "mean velocity"),
        "pressure_drop_per_length": Variable(("time",), gradient, "Pa/m", "pressure drop per length"),
        "velocity": Variable(("profile_time", "position"), velocity, "m/s", "velocity"),
    }
    units = {"flow_rate": "m^3/s", "wall_force": "N", "reach": "m", "quasi_steady_stress": "Pa", "travel": "m"}
    for name, data in more.items():
        dims = ("profile_time", "position") if name == "travel" else (("time", "wall") if data.ndim == 2 else ("time",))
        v[name] = Variable(dims, data, units[name], name.replace("_", " "))
    return Result(v, _summary(title, shape, walls, time, stress, speed, mean), f'title = "{title}"\n', {})


def _summary(title, shape, walls, time, stress, speed, mean) -> dict:
    rows = {}
    for i, wall in enumerate(walls):
        finite = np.isfinite(stress[:, i])
        top = int(np.nanargmax(np.abs(stress[:, i])))
        rows[wall] = {
            "peak_stress": float(stress[top, i]) if finite.all() else None,
            "peak_stress_error": float(1e-3 * abs(stress[top, i])) if finite.all() else None,
            "peak_time": float(time[top]) if finite.all() else float(time[~finite][0]),
            "unbounded": bool(not finite.all()),
            "unbounded_coefficient": None if finite.all() else 0.3 * float(np.sqrt(VISCOSITY * DENSITY / np.pi)),
            "final_stress": float(stress[-1, i]),
            "final_speed": float(speed[-1, i]),
        }
    away = np.flatnonzero(np.abs(mean - mean[-1]) > 0.01 * abs(mean[-1]))
    settled = float(time[min(away[-1] + 1, len(time) - 1)]) if len(away) else 0.0
    return {
        "title": title,
        "shape": shape,
        "verdict": "good",
        "settling": {"reached": True, "time": settled, "error": 1e-5, "within": 0.01, "flow": settled},
        "walls": rows,
        "flow": {"peak_mean_velocity": float(np.abs(mean).max()), "final_mean_velocity": float(mean[-1])},
    }


def step_response(height: float, t: np.ndarray, y: np.ndarray, terms: int = 400) -> np.ndarray:
    """u/U between plates after the wall y = h has been set in motion; (t, y)."""
    n = np.arange(1, terms + 1)
    late = np.exp(-np.outer(np.maximum(t, 0.0), n**2) * np.pi**2 * VISCOSITY / DENSITY / height**2)
    u = y / height + (2 / np.pi) * (late * (-1.0) ** n / n) @ np.sin(np.outer(n, np.pi * y / height))
    u = np.where(t[:, None] > 0, u, 0.0)
    u[:, y >= height] = (t >= 0)[:, None]
    return u


def ramped(height: float, over: float, t: np.ndarray, y: np.ndarray, terms: int = 400) -> tuple[np.ndarray, ...]:
    """Velocity and gradients at both walls (per unit speed) for a straight ramp of ``over``: exact modal response."""
    n = np.arange(1, terms + 1)
    rate = n**2 * np.pi**2 * VISCOSITY / DENSITY / height**2
    x, held = np.minimum(t, over)[:, None], np.maximum(t - over, 0.0)[:, None]
    decay = (1 - np.exp(-rate * x)) * np.exp(-rate * held) / (rate * over)
    wall = np.minimum(t / over, 1.0)
    part = decay * (-1.0) ** n / n
    u = wall[:, None] * y / height + (2 / np.pi) * part @ np.sin(np.outer(n, np.pi * y / height))
    lower = (wall + 2 * (decay * (-1.0) ** n).sum(axis=1)) / height
    tail = (x[:, 0] < t) * 0.0
    upper = (wall + 2 * decay.sum(axis=1) + tail) / height
    return u, lower, upper


def plates_ramp(height: float = 0.8e-3, speed: float = 0.3, over: float = 50e-3, until: float = 1.0) -> Result:
    """The upper wall brought up to ``speed`` by a straight ramp."""
    first = min(over, height**2) * 1e-3
    t = np.unique(np.concatenate([[0.0], np.geomspace(first, until, 900), np.linspace(0, over, 200), [over]]))
    y = np.linspace(0, height, 101)
    keep = np.concatenate([[0.0], np.geomspace(first * 10, until, 119)])
    u, *_ = ramped(height, over, keep, y)
    _, lower, upper = ramped(height, over, t, np.zeros(1))
    wall = speed * np.minimum(t / over, 1.0)
    mean = np.array([np.trapezoid(row, y) for row in ramped(height, over, t, y)[0]]) * speed / height
    stress = VISCOSITY * speed * np.stack([lower, -upper], axis=1)
    hand = VISCOSITY * np.stack([wall, -wall], axis=1) / height
    return assemble(
        "Flow cell brought up to speed", "plates", ["lower", "upper"], t, keep, y, stress,
        np.stack([0 * wall, wall], axis=1), mean, np.zeros_like(t), u * speed, [0.0, over],
        quasi_steady_stress=hand, reach=_reach(t, height, [False, True]), flow_rate=mean * height * 25e-3,
        wall_force=stress * 60e-3 * 25e-3, travel=_travel(keep, u * speed),
    )  # fmt: skip


def film_over_long_run() -> Result:
    """A 40 um oil-thin film that diffuses in microseconds, driven by a ramp of 10 s and held for 2 s."""
    return plates_ramp(height=4e-6, speed=0.5, over=10.0, until=12.0)


def sudden_start(height: float = 0.8e-3, speed: float = 0.3) -> Result:
    """The upper wall jumps to ``speed``: its stress is infinite at t = 0, which the first row holds as NaN."""
    t = np.concatenate([[0.0], np.geomspace(1e-6, 2.0, 700)])
    y = np.linspace(0, height, 101)
    keep = np.concatenate([[0.0], np.geomspace(1e-4, 2.0, 119)])
    u = step_response(height, keep, y)
    n = np.arange(1, 2001)
    late = np.exp(-np.outer(t, n**2) * np.pi**2 * VISCOSITY / DENSITY / height**2)
    # Short times by the image form, of which one term is left: u = erfc, so the gradient is 1/sqrt(pi nu t).
    with np.errstate(divide="ignore"):
        early = 1 / np.sqrt(np.pi * VISCOSITY / DENSITY * t)
    upper = np.where(t < 0.02, early, (1 + 2 * late.sum(axis=1)) / height)
    lower = (1 + 2 * (late * (-1.0) ** n).sum(axis=1)) / height
    lower[t < 0.002] = 0.0
    upper[0] = np.nan
    stress = VISCOSITY * speed * np.stack([lower, -upper], axis=1)
    mean = np.array([np.trapezoid(row, y) for row in step_response(height, t, y)]) * speed / height
    wall = np.full_like(t, speed)
    return assemble(
        "Plate set in motion at once", "plates", ["lower", "upper"], t, keep, y, stress,
        np.stack([0 * wall, wall], axis=1), mean, np.zeros_like(t), u * speed, [0.0],
        quasi_steady_stress=VISCOSITY * np.stack([wall, -wall], axis=1) / height,
        reach=_reach(t, height, [False, True]),
    )  # fmt: skip


def pipe_step(radius: float = 6e-3, drop: float = 400.0, viscosity: float = 0.3, density: float = 880.0) -> Result:
    """A pressure drop per length switched on in an oil line at rest."""
    zero = jn_zeros(0, 300)
    t = np.concatenate([[0.0], np.geomspace(1e-7, 0.3, 800)])
    r = np.linspace(0, radius, 101)
    keep = np.concatenate([[0.0], np.geomspace(1e-5, 0.3, 119)])
    scale = drop * radius**2 / viscosity

    def decay(time):
        return np.exp(-np.outer(time, zero**2) * viscosity / density / radius**2)

    modes = j0(np.outer(zero, r / radius)) / (zero**3 * j1(zero))[:, None]
    u = scale * ((1 - (r / radius) ** 2) / 4 - 2 * decay(keep) @ modes)
    u[0], u[:, -1] = 0.0, 0.0
    mean = scale / 8 * (1 - 32 * (decay(t) / zero**4).sum(axis=1))
    stress = drop * radius / 2 * (1 - 4 * (decay(t) / zero**2).sum(axis=1))
    stress[0] = mean[0] = 0.0
    return assemble(
        "Cold oil line under a pressure step", "pipe", ["bore"], t, keep, r, stress[:, None],
        np.zeros((len(t), 1)), mean, np.full_like(t, drop), u, [0.0], flow_rate=mean * np.pi * radius**2,
        quasi_steady_stress=np.full((len(t), 1), drop * radius / 2), reach=_reach(t, radius, [True]),
    )  # fmt: skip


def oscillating(periods: int = 20, frequency: float = 5.0, height: float = 2e-3, speed: float = 0.05) -> Result:
    """The lower wall swings: the periodic state of Stokes' second problem over a finite film (from memory)."""
    t = np.linspace(0, periods / frequency, 60 * periods + 1)
    keep = np.linspace(0, periods / frequency, 120)
    y = np.linspace(0, height, 101)
    omega = 2 * np.pi * frequency
    k = np.sqrt(1j * omega * DENSITY / VISCOSITY)
    shape = np.sinh(k * (height - y)) / np.sinh(k * height)
    slope = -k * np.array([1 / np.tanh(k * height), 1 / np.sinh(k * height)])
    # The start is faded in by hand: only the look of a run from rest is wanted here.
    fade = 1 - np.exp(-t * frequency / 0.4)
    wave = np.exp(1j * omega * t) * fade / 1j
    u = speed * ((np.exp(1j * omega * keep) * (1 - np.exp(-keep * frequency / 0.4)) / 1j)[:, None] * shape).real
    stress = VISCOSITY * speed * np.stack([(wave * slope[0]).real, -(wave * slope[1]).real], axis=1)
    wall = speed * np.sin(omega * t)
    mean = speed * (wave * np.trapezoid(shape, y) / height).real
    return assemble(
        "Swinging plate under a film", "plates", ["lower", "upper"], t, keep, y, stress,
        np.stack([wall, 0 * wall], axis=1), mean, np.zeros_like(t), u, [0.0],
        reach=_reach(t, height, [True, False]),
    )  # fmt: skip


def rotating_sleeve(inner: float = 20e-3, outer: float = 22e-3, speed: float = 2.0, over: float = 0.5) -> Result:
    """An outer sleeve spun up around a fixed core: thin-gap profile on the radius (the look, not the last digit)."""
    gap = outer - inner
    t = np.unique(np.concatenate([[0.0], np.geomspace(1e-4, 20.0, 700), np.linspace(0, over, 100)]))
    keep = np.concatenate([[0.0], np.geomspace(1e-2, 20.0, 119)])
    y = np.linspace(0, gap, 101)
    u, *_ = ramped(gap, over, keep, y)
    _, lower, upper = ramped(gap, over, t, np.zeros(1))
    wall = speed * np.minimum(t / over, 1.0)
    stress = VISCOSITY * speed * outer * np.stack([lower, -upper], axis=1)
    mean = np.array([np.trapezoid(row, y) for row in ramped(gap, over, t, y)[0]]) * speed * outer / gap
    return assemble(
        "Sleeve spun up in water", "rotating annulus", ["inner", "outer"], t, keep, inner + y, stress,
        np.stack([0 * wall, wall], axis=1), mean, np.zeros_like(t), u * speed * outer, [0.0, over],
        quasi_steady_stress=VISCOSITY * outer * np.stack([wall, -wall], axis=1) / gap,
        reach=_reach(t, gap, [False, True]),
    )  # fmt: skip


def pressed_plates(height: float = 1e-3, drop: float = 20.0, until: float = 2.0) -> Result:
    """A pressure drop between fixed plates: both walls carry the same stress (series as for Szymanski, in a slot)."""
    half = height / 2
    odd = 2 * np.arange(400) + 1
    t = np.concatenate([[0.0], np.geomspace(1e-6, until, 500)])
    keep = np.linspace(0.0, until, 120)
    y = np.linspace(0, height, 101)
    rate = odd**2 * np.pi**2 / 4 * VISCOSITY / DENSITY / half**2
    scale = drop * half**2 / VISCOSITY
    modes = (-1.0) ** (odd // 2) / odd[:, None].T ** 3 * np.cos(np.outer((y - half) / half, odd * np.pi / 2))
    u = scale / 2 * (1 - ((y - half) / half) ** 2) - scale * 16 / np.pi**3 * np.exp(-np.outer(keep, rate)) @ modes.T
    u[0] = 0.0
    mean = scale / 3 * (1 - 96 / np.pi**4 * (np.exp(-np.outer(t, rate)) / odd**4).sum(axis=1))
    stress = drop * half * (1 - 8 / np.pi**2 * (np.exp(-np.outer(t, rate)) / odd**2).sum(axis=1))
    mean[0] = stress[0] = 0.0
    return assemble(
        "Slot under a pressure drop", "plates", ["lower", "upper"], t, keep, y, np.stack([stress, stress], axis=1),
        np.zeros((len(t), 2)), mean, np.full_like(t, drop), u, [0.0], reach=_reach(t, height / 2, [True, True]),
    )  # fmt: skip


def both_drives() -> Result:
    """A wall that moves and a pressure drop at once (linear superposition of the two runs): part flows backwards."""
    pressed, ramp = pressed_plates(height=0.8e-3, drop=-6000.0, until=1.0), plates_ramp()
    time, keep = ramp.time, ramp.profile_time
    at = np.searchsorted(pressed.profile_time, keep).clip(0, len(pressed.profile_time) - 1)
    stress = np.stack([np.interp(time, pressed.time, pressed.wall_stress[:, i]) for i in (0, 1)], axis=1)
    return assemble(
        "Reversing rig", "plates", ["lower", "upper"], time, keep, ramp.position, ramp.wall_stress + stress,
        ramp.wall_speed, ramp.mean_velocity + np.interp(time, pressed.time, pressed.mean_velocity),
        np.full_like(time, -6000.0), ramp.velocity + pressed.velocity[at], [0.0, 50e-3],
        flow_rate=ramp.flow_rate, reach=ramp.reach,
    )  # fmt: skip


def duty_cycle(cycles: int = 8) -> Result:
    """The upper wall brought up and stopped again and again (superposed ramps): many breaks, ends at rest."""
    height, speed, over, every = 0.8e-3, 0.3, 0.1, 2.0
    t = np.unique(np.concatenate([np.linspace(0, cycles * every, 1601)]))
    keep = np.linspace(0, cycles * every, 121)
    y = np.linspace(0, height, 101)
    breaks = [k * every + part for k in range(cycles) for part in (0.0, over, 1.0, 1.0 + over)]
    u, velocity, lower, upper, wall = (0.0,) * 5
    for k in range(2 * cycles):
        sign = 1 - 2 * (k % 2)
        late, late_kept = np.maximum(t - k * 1.0, 0.0), np.maximum(keep - k * 1.0, 0.0)
        profile, low, high = ramped(height, over, late, y)
        u, lower, upper = u + sign * profile, lower + sign * low, upper + sign * high
        velocity = velocity + sign * ramped(height, over, late_kept, y)[0]
        wall = wall + sign * np.minimum(late / over, 1.0)
    return assemble(
        "Carriage that starts and stops", "plates", ["lower", "upper"], t, keep, y,
        VISCOSITY * speed * np.stack([lower, -upper], axis=1), speed * np.stack([0 * wall, wall], axis=1),
        speed * np.trapezoid(u, y) / height, np.zeros_like(t), speed * velocity, breaks,
        reach=_reach(t, height, [False, True]),
    )  # fmt: skip


def _reach(t: np.ndarray, most: float, moving: list[bool]) -> np.ndarray:
    """1 % depth of Stokes' first problem, 3.643 sqrt(nu t), from each moving wall; NaN from the others."""
    depth = np.minimum(3.643 * np.sqrt(VISCOSITY / DENSITY * t), most)
    return np.stack([depth if on else np.full(len(t), np.nan) for on in moving], axis=1)


def sweep() -> Result:
    """Rows of a sweep, one of them refused."""
    nan = float("nan")
    v = {
        "case": Variable(("case",), np.arange(3), "1", "number of the case"),
        "gap.height": Variable(("case",), np.array([0.4e-3, 0.8e-3, 1.2e-3]), "m", "gap.height"),
        "status": Variable(("case",), np.array(["solved", "refused", "solved"]), "1", "how the case ended"),
        "message": Variable(("case",), np.array(["", 'gap.height: "x", too small', ""]), "1", "why"),
        "settling_time": Variable(("case",), np.array([0.1, nan, 0.9]), "s", "settling time"),
    }
    return Result(v, {"title": "Three gaps"}, 'case = "flow_cell.toml"\n', {})


def _travel(time: np.ndarray, velocity: np.ndarray) -> np.ndarray:
    step = np.diff(time)[:, None] * (velocity[1:] + velocity[:-1]) / 2
    return np.concatenate([np.zeros((1, velocity.shape[1])), np.cumsum(step, axis=0)])


MADE: dict[str, Callable[[], Result]] = {
    "plates_ramp": lru_cache(plates_ramp),
    "sudden_start": lru_cache(sudden_start),
    "pipe_step": lru_cache(pipe_step),
    "rotating_sleeve": lru_cache(rotating_sleeve),
    "oscillating": lru_cache(oscillating),
    "pressed_plates": lru_cache(pressed_plates),
    "both_drives": lru_cache(both_drives),
    "duty_cycle": lru_cache(duty_cycle),
    "film_over_long_run": lru_cache(film_over_long_run),
}

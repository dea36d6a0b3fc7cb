"""Random linear cases for the experiment behind the stated errors: one seed and one number make one case."""

from __future__ import annotations

from typing import Any

import numpy as np

MOST_PERIODS = 300  # of a sine in a run
MOST_CYCLES = 40  # of a repeat in a run
SHAPES = ("plates", "pipe", "axial", "rotating")


def draw(seed: int, number: int) -> dict[str, Any]:
    """Plain case ``number`` of ``seed`` (form: ``tests/reference/cases.py``), all drawn afresh for each number."""
    rng = np.random.default_rng([seed, number])
    kind = SHAPES[rng.integers(4)]
    gap = 10 ** rng.uniform(-4.5, -2)
    case: dict[str, Any] = _sizes(rng, kind, gap)
    rho, nu = rng.uniform(700, 1300), 10 ** rng.uniform(-6.5, -3.5)
    diffusion = gap**2 / nu
    drive_time = diffusion * 10 ** rng.uniform(-5, 3)
    case |= {"density": rho, "viscosity": rho * nu, "start": ("rest", "steady")[rng.integers(2)]}
    case["accuracy"] = 10 ** rng.uniform(-6, np.log10(0.05))
    case["settle_within"] = 10 ** rng.uniform(-3, -1)
    limits: list[float] = []
    _drive(rng, case, kind, gap, drive_time, limits)
    longest = max(drive_time * rng.uniform(1.5, 5), diffusion * 10 ** rng.uniform(-1, 0.5))
    if rng.random() < 0.25:
        longest = drive_time * rng.uniform(0.5, 5)
    case["duration"] = float(min([longest, *limits]))
    return case


def _sizes(rng: np.random.Generator, kind: str, gap: float) -> dict[str, Any]:
    if kind == "plates":
        return {"shape": "plates", "height": gap}
    if kind == "pipe":
        return {"shape": "pipe", "radius": gap}
    ratio = 10 ** rng.uniform(-2, -0.05) if rng.random() < 0.5 else 1 - 10 ** rng.uniform(-4, -0.5)
    outer = gap / (1 - ratio)
    return {"shape": "annulus", "motion": kind, "inner_radius": outer - gap, "outer_radius": outer}


def _drive(
    rng: np.random.Generator, case: dict[str, Any], kind: str, gap: float, drive_time: float, limits: list[float]
) -> None:
    names = {"plates": ("lower", "upper"), "pipe": ("bore",)}.get(kind, ("inner", "outer"))
    can_press = kind != "rotating"
    walls: dict[str, Any] = {}
    while True:
        for name in names:
            if rng.random() < 0.6:
                walls[name] = {"speed": history(rng, 1.0, drive_time, limits)}
        pressed = can_press and rng.random() < 0.5
        if walls or pressed:
            break
    if pressed:
        size = 12 * case["viscosity"] / gap**2 * 10 ** rng.uniform(-1, 1)
        case["pressure"] = history(rng, size, drive_time, limits)
    if rng.random() < 0.1:
        name = names[rng.integers(len(names))]
        walls.setdefault(name, {})["slip_length"] = gap * 10 ** rng.uniform(-3, 0)
    case["walls"] = walls


def history(rng: np.random.Generator, size: float, time: float, limits: list[float], deep: bool = True) -> Any:
    """One random history of values about ``size`` and times about ``time``; ``limits`` collects longest durations."""
    kinds = ["bare", "step", "ramp", "smooth_ramp", "s_curve", "trapezoid", "lag", "sine", "half_sine", "table"]
    kinds += ["smooth", "sum", "repeat"] if deep else ["smooth"]
    kind = kinds[rng.integers(len(kinds))]
    value = size * rng.uniform(-1.5, 1.5, 6)
    span = time * 10 ** rng.uniform(-0.5, 0.5, 6)
    at = {"at": float(span[0] * rng.random())} if rng.random() < 0.4 else {}
    start = {"from": float(value[1])} if rng.random() < 0.3 else {}
    to = float(value[0])
    if kind == "bare":
        return to
    if kind == "step":
        return {"kind": kind, "to": to} | at | start
    if kind in ("ramp", "smooth_ramp"):
        return {"kind": kind, "to": to, "over": float(span[1])} | at | start
    if kind == "s_curve":
        limit = abs(to - start.get("from", 0.0)) / span[1] * rng.uniform(1.2, 4)
        return {"kind": kind, "to": to, "acceleration": float(limit), "jerk": float(limit / span[1] * rng.uniform(2, 9))} | at | start  # noqa: E501
    if kind == "trapezoid":
        return {"kind": kind, "to": to, "rise": float(span[1]), "hold": float(span[2]), "fall": float(span[3])} | at | start  # noqa: E501
    if kind == "lag":
        return {"kind": kind, "to": to, "time_constant": float(span[1])} | at | start
    if kind == "sine":
        limits.append(MOST_PERIODS * span[1])
        mean = {"mean": float(value[1])} if rng.random() < 0.5 else {}
        phase = {"phase": float(rng.uniform(-3, 3))} if rng.random() < 0.5 else {}
        return {"kind": kind, "amplitude": abs(to), "period": float(span[1])} | mean | phase | at
    if kind == "half_sine":
        return {"kind": kind, "amplitude": to, "over": float(span[1])} | at
    if kind in ("table", "smooth"):
        return _table(rng, size, time, kind)
    if kind == "sum":
        parts = [history(rng, size, time, limits, False) for _ in range(rng.integers(2, 4))]
        return {"kind": kind, "parts": parts}
    return _repeat(rng, size, time, limits)


def _table(rng: np.random.Generator, size: float, time: float, kind: str) -> dict[str, Any]:
    rows = int(rng.integers(3, 12))
    times = np.cumsum(time * 10 ** rng.uniform(-1.5, 0.3, rows))
    if rng.random() < 0.7:
        times -= times[0]
    if kind == "table" and rng.random() < 0.3:
        times[2] = times[1]
    values = size * rng.uniform(-1.5, 1.5, rows)
    out = {"kind": "table", "times": times.tolist(), "values": values.tolist()}
    return out | ({"interpolation": "smooth"} if kind == "smooth" else {})


def _repeat(rng: np.random.Generator, size: float, time: float, limits: list[float]) -> dict[str, Any]:
    while True:
        part = history(rng, size, time, [], False)
        if isinstance(part, dict) and part["kind"] != "sine":
            break
    every = time * 10 ** rng.uniform(0, 0.7)
    limits.append(MOST_CYCLES * every)
    times = {"times": int(rng.integers(1, 6))} if rng.random() < 0.4 else {}
    return {"kind": "repeat", "part": part, "every": float(every)} | times

"""Random linear bodies for the experiment behind their stated errors: one seed and one number make one case."""

from __future__ import annotations

from typing import Any

import numpy as np
from draw import SHAPES, history

LOADS = ("step", "ramp", "smooth_ramp", "s_curve", "trapezoid", "lag", "half_sine", "table", "smooth", "sum")


def draw(seed: int, number: int) -> dict[str, Any]:
    """Plain case ``number`` of ``seed``: one or two bodies on the walls, of 1e-4 to 1e6 times their liquid's mass, with
    and without springs and dampers, some beside a prescribed flow (form: ``tests/reference/cases.py``)."""
    rng = np.random.default_rng([seed, number, 4])
    kind = SHAPES[rng.integers(4)]
    gap = 10 ** rng.uniform(-3 if kind == "rotating" else -4.5, -2)  # smaller inertias than these are refused
    rho, nu = rng.uniform(700, 1300), 10 ** rng.uniform(-6.5, -3.5)
    case = sizes(rng, kind, gap) | {"density": rho, "viscosity": rho * nu, "length": 30 * gap}
    diffusion = gap**2 / nu
    names = {"plates": ("lower", "upper"), "pipe": ("bore",)}.get(kind, ("inner", "outer"))
    both = len(names) == 2 and rng.random() < 0.35
    carried = names if both else (names[rng.integers(len(names))],)
    walls: dict[str, Any] = {}
    slowest = diffusion
    plans = {name: plan(rng, case, kind, name) for name in carried}
    time = max(p["time"] for p in plans.values())
    drive_time = max(time, diffusion) * 10 ** rng.uniform(-2, 0.7)
    for name, own in plans.items():
        walls[name] = {"body": body(rng, own, drive_time, diffusion)}
        slowest = max(slowest, own["time"])
    for name in names:
        if name not in walls and rng.random() < 0.4:
            walls[name] = {"speed": once(rng, 1.0, drive_time)}
    case["walls"] = walls
    if kind != "rotating" and rng.random() < 0.35:
        _press(rng, case, gap, drive_time, names)
    case["start"] = "rest"
    case["accuracy"] = 10 ** rng.uniform(-5, -2)
    case["settle_within"] = 10 ** rng.uniform(-3, -1)
    case["duration"] = float(max(drive_time * rng.uniform(1.5, 4), slowest * 10 ** rng.uniform(-0.5, 1.2)))
    swinging = [p["time"] for p in plans.values() if p["swings"]]
    if swinging:
        case["duration"] = min(case["duration"], 150.0 * min(swinging))
    return case


def sizes(rng: np.random.Generator, kind: str, gap: float) -> dict[str, Any]:
    """A gap, not more curved than its judge resolves."""
    if kind == "plates":
        return {"shape": "plates", "height": gap, "width": 20 * gap}
    if kind == "pipe":
        return {"shape": "pipe", "radius": gap}
    ratio = rng.uniform(0.2, 0.95)
    outer = gap / (1 - ratio)
    return {"shape": "annulus", "motion": kind, "inner_radius": outer - gap, "outer_radius": outer}


def once(rng: np.random.Generator, size: float, time: float) -> Any:
    """A history that ends in a constant."""
    while True:
        found = history(rng, size, time, [])
        kinds = [found["kind"]] if isinstance(found, dict) else ["bare"]
        if kinds == ["sum"]:
            kinds = [part["kind"] if isinstance(part, dict) else "bare" for part in found["parts"]]
        if all(kind in (*LOADS, "bare") for kind in kinds):
            return found


def plan(rng: np.random.Generator, case: dict[str, Any], kind: str, name: str) -> dict[str, Any]:
    """Mass, what the film resists per speed, spring and damper of one body, and the time they make."""
    gap = case.get("height", case.get("radius", 0.0)) or case["outer_radius"] - case["inner_radius"]
    radius = {"inner": case.get("inner_radius"), "outer": case.get("outer_radius")}.get(name, gap)
    breadth = case["width"] if kind == "plates" else 2 * np.pi * radius
    area = breadth * case["length"]
    lever = radius if kind == "rotating" else 1.0
    liquid = case["density"] * gap * area * lever**2
    film = case["viscosity"] / gap * area * lever**2
    mass = liquid * 10 ** rng.uniform(-4, 6)
    if np.random.default_rng([int(1e6 * mass / liquid) % 2**31, 5]).random() < 0.06:  # some weigh nothing
        mass = 0.0
    out = {"mass": mass, "area": area, "film": film, "time": mass / film, "swings": False}
    out["damping"] = film * 10 ** rng.uniform(-2, 2) if rng.random() < 0.3 else 0.0
    out["stiffness"] = 0.0
    if rng.random() < 0.4:
        weight = mass + liquid / 3
        total = film + out["damping"]
        critical = total**2 / 4 / weight
        out["stiffness"] = critical * 10 ** rng.uniform(-2, 2.5)
        out["swings"] = out["stiffness"] > critical
        quick, slow = np.sqrt(weight / out["stiffness"]), total / out["stiffness"]
        out["time"] = quick if out["swings"] else max(slow, weight / total)
    return out


def body(rng: np.random.Generator, own: dict[str, Any], drive_time: float, diffusion: float) -> dict[str, Any]:
    """A body that its load moves at about 1 m/s (or 1 rad/s)."""
    size = own["film"] + own["damping"] + own["mass"] / max(drive_time, own["time"])
    out: dict[str, Any] = {"mass": own["mass"], "area": own["area"]}
    out |= {key: own[key] for key in ("damping", "stiffness") if own[key]}
    if own["mass"] == 0.0:
        out["force"] = once(rng, size, drive_time)
        return out
    if rng.random() < 0.85:
        out["force"] = once(rng, size, drive_time)
    if rng.random() < 0.3 or "force" not in out:
        out["initial_speed"] = float(rng.uniform(-1, 1))
    if own["stiffness"] and rng.random() < 0.3:
        out["initial_displacement"] = float(rng.uniform(-1, 1) * max(own["time"], diffusion))
    return out


def _press(rng: np.random.Generator, case: dict[str, Any], gap: float, drive_time: float, names: tuple) -> None:
    """A pressure drop, a prescribed flow, or a sealed gap with or without a plunger."""
    choice = rng.random()
    if choice < 0.4:
        size = 12 * case["viscosity"] / gap**2 * 10 ** rng.uniform(-1, 1)
        case["pressure"] = once(rng, size, drive_time)
    elif choice < 0.6:
        case["pressure"] = {"mean_velocity": once(rng, 1.0, drive_time)}
    else:
        case["pressure"] = {"sealed": True}
        name = names[-1]
        own = case["walls"].get(name, {}).get("body")
        if own is not None and choice > 0.8:
            section = case["width"] * gap if "width" in case else np.pi * gap * (case.get("radius") or 2 * case["outer_radius"] - gap)  # noqa: E501
            own["displaces"] = float(section * 10 ** rng.uniform(-1, 1))


def draw_nonlinear(seed: int, number: int) -> dict[str, Any]:
    """Plain case ``number`` of ``seed``: a body on the outer wall under a force-speed curve or dry friction."""
    rng = np.random.default_rng([seed, number, 7])
    kind = SHAPES[rng.integers(4)]
    gap = 10 ** rng.uniform(-4.5, -2)
    rho, nu = rng.uniform(700, 1300), 10 ** rng.uniform(-6.5, -3.5)
    case = sizes(rng, kind, gap) | {"density": rho, "viscosity": rho * nu, "length": 30 * gap}
    name = {"plates": "upper", "pipe": "bore"}.get(kind, "outer")
    own = plan(rng, case, kind, name) | {"stiffness": 0.0, "damping": 0.0}
    liquid = own["film"] * gap**2 / nu
    own["mass"] = liquid * 10 ** rng.uniform(-1, 3)
    own["time"] = own["mass"] / own["film"]
    time = max(own["time"], gap**2 / nu)
    drive_time = time * 10 ** rng.uniform(-1, 0.5)
    size = own["film"] + own["mass"] / max(drive_time, own["time"])
    carried: dict[str, Any] = {"mass": own["mass"], "area": own["area"]}
    kinds = ("ramp", "smooth_ramp", "trapezoid", "lag", "half_sine")
    while True:
        force = once(rng, size, drive_time)
        if isinstance(force, dict) and force["kind"] in kinds:
            break
    if rng.random() < 0.5:
        speeds = np.cumsum(rng.uniform(0.05, 0.4, 4)) - 0.1
        values = size * np.sort(rng.uniform(-0.5, 1.0, 4))[::-1]
        carried["curve"] = (speeds.tolist(), values.tolist())
        if rng.random() < 0.5:
            carried["force"] = force
    else:
        carried["force"] = force
        carried["dry_friction"] = float(size * rng.uniform(0.05, 0.5))
        if rng.random() < 0.5:
            carried["breakaway_friction"] = float(carried["dry_friction"] * rng.uniform(1.0, 1.5))
    case["walls"] = {name: {"body": carried}}
    case["accuracy"] = 10 ** rng.uniform(-3.5, -2)
    case["settle_within"] = 10 ** rng.uniform(-2, -1)
    case["duration"] = float(max(3.0 * drive_time, 2.0 * time))
    return case

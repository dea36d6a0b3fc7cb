"""The gaps on which the solver is verified: one of each shape, of ordinary sizes, with ordinary liquids."""

from __future__ import annotations

from typing import Any

import numpy as np

from transient.drive.pieces import Drive, constant
from transient.gap.problem import LOWER, PRESSURE, UPPER, Law, Problem, Wall

# metric, inner and outer end (m), density (kg/m^3), viscosity (Pa s), names of the ends
GAPS: dict[str, tuple[int, float, float, float, float, tuple[str, str]]] = {
    "plates": (0, 0.0, 1.5e-3, 1030.0, 4.2e-3, ("lower", "upper")),
    "pipe": (1, 0.0, 2.4e-3, 890.0, 0.031, ("axis", "bore")),
    "axial annulus": (1, 4.0e-3, 7.0e-3, 865.0, 0.017, ("inner", "outer")),
    "rotating annulus": (3, 1.1e-2, 1.45e-2, 998.0, 1.1e-3, ("inner", "outer")),
}
SHAPES = tuple(GAPS)
SPEED = {"plates": 0.35, "pipe": 0.25, "axial annulus": 0.4, "rotating annulus": 0.9}
FIRST_SPEED = 0.6  # of the other wall, where both move
INPUTS = (LOWER, UPPER, PRESSURE)


def gap(
    shape: str,
    drives: dict[int, Drive],
    *,
    kinds: tuple[str, str] = ("moving", "moving"),
    slips: tuple[float, float] = (0.0, 0.0),
    **more: Any,
) -> Problem:
    """A problem in a gap of ``shape``; ``drives`` by LOWER, UPPER, PRESSURE; ``more``: fields of ``Problem``."""
    metric, inner, outer, density, viscosity, names = GAPS[shape]
    kinds = ("axis", kinds[1]) if shape == "pipe" else kinds
    radii = (inner, outer) if metric else (0.0, 0.0)
    walls = tuple(Wall(n, k, s, None, r) for n, k, s, r in zip(names, kinds, slips, radii, strict=True))
    low, high, push = (drives.get(index, constant(0.0)) for index in INPUTS)
    keys = {"start": "rest", "duration": None, "settle_within": 0.01, "accuracy": 1e-3} | more
    return Problem(
        shape, metric, inner, outer, density, Law(0, (viscosity,)), (walls[0], walls[1]), (low, high), push, **keys
    )


def diffusion_time(shape: str) -> float:
    """gap^2 / kinematic viscosity, s."""
    _, inner, outer, density, viscosity, _ = GAPS[shape]
    return (outer - inner) ** 2 * density / viscosity


def size(shape: str, index: int) -> float:
    """An ordinary magnitude of an input: m/s (rad/s in a rotating gap), or Pa/m."""
    _, inner, outer, _, viscosity, _ = GAPS[shape]
    if index == PRESSURE:
        return 12.0 * viscosity * SPEED[shape] / (outer - inner) ** 2
    return SPEED[shape] * (FIRST_SPEED if index == LOWER else 1.0)


def driven(shape: str) -> tuple[int, ...]:
    """The inputs that a shape has: a pipe has one wall, a rotating gap no pressure."""
    return {"pipe": (UPPER, PRESSURE), "rotating annulus": (LOWER, UPPER)}.get(shape, INPUTS)


def input_name(shape: str, index: int) -> str:
    """"upper wall", "bore", "pressure" ..."""
    if index == PRESSURE:
        return "pressure"
    name = GAPS[shape][5][index]
    return name if name == "bore" else f"{name} wall"


def scale_of_walls(problem: Problem, speed: float) -> float:
    """Stress of plane shear across the gap at a wall speed, Pa."""
    lever = problem.outer if problem.rotating else 1.0
    return float(problem.viscosity * np.abs(speed) * lever / problem.gap)

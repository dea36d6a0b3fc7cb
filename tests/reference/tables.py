"""The cases on which the judges meet each other and the solver: four shapes, every history kind, both starts."""

from __future__ import annotations

from typing import Any

GAPS: dict[str, dict[str, Any]] = {
    "plates": {"shape": "plates", "height": 1.2e-3, "density": 1040.0, "viscosity": 6.5e-3},
    "pipe": {"shape": "pipe", "radius": 2.1e-3, "density": 905.0, "viscosity": 0.024},
    "axial": {
        "shape": "annulus", "motion": "axial", "inner_radius": 3.0e-3, "outer_radius": 4.5e-3,
        "density": 870.0, "viscosity": 0.011,
    },
    "rotating": {
        "shape": "annulus", "motion": "rotating", "inner_radius": 8.0e-3, "outer_radius": 9.3e-3,
        "density": 998.0, "viscosity": 1.3e-3,
    },
}  # fmt: skip


def histories(size: float, time: float) -> dict[str, Any]:
    """Every history kind of the contract, values about ``size``, features about ``time``."""
    return {
        "bare": size,
        "step": {"kind": "step", "to": size, "from": -0.3 * size, "at": 0.1 * time},
        "ramp": {"kind": "ramp", "to": size, "over": 0.2 * time, "at": 0.05 * time},
        "smooth_ramp": {"kind": "smooth_ramp", "to": size, "over": 0.5 * time, "from": 0.2 * size},
        "s_curve": {"kind": "s_curve", "to": size, "acceleration": 3 * size / time, "jerk": 30 * size / time**2},
        "trapezoid": {"kind": "trapezoid", "to": size, "rise": 0.2 * time, "hold": 0.3 * time, "fall": 0.1 * time},
        "lag": {"kind": "lag", "to": size, "time_constant": 0.15 * time},
        "sine": {"kind": "sine", "amplitude": size, "frequency": 2.5 / time, "mean": 0.3 * size},
        "half_sine": {"kind": "half_sine", "amplitude": size, "over": 0.4 * time, "at": 0.1 * time},
        "table": {
            "kind": "table", "times": [0.0, 0.2 * time, 0.5 * time, 0.9 * time],
            "values": [0.0, 0.8 * size, 0.3 * size, size],
        },
        "smooth_table": {
            "kind": "table", "interpolation": "smooth", "times": [0.0, 0.2 * time, 0.5 * time, 0.9 * time],
            "values": [0.0, 0.8 * size, 0.9 * size, size],
        },
        "sum": {
            "kind": "sum",
            "parts": [
                {"kind": "ramp", "to": size, "over": 0.3 * time},
                {"kind": "sine", "amplitude": 0.2 * size, "period": 0.5 * time},
            ],
        },
        "repeat": {
            "kind": "repeat", "every": 0.6 * time,
            "part": {"kind": "half_sine", "amplitude": size, "over": 0.2 * time, "at": 0.1 * time},
        },
    }  # fmt: skip


def plain(shape: str, kind: str, start: str, accuracy: float = 1e-3) -> dict[str, Any]:
    """One case of the table: the outer wall (bore: the pressure too) under one history kind."""
    case = dict(GAPS[shape])
    width = case.get("height") or case.get("radius") or case["outer_radius"] - case["inner_radius"]
    time = width**2 * case["density"] / case["viscosity"]
    outer = {"plates": "upper", "pipe": "bore"}.get(shape, "outer")
    inner = {"plates": "lower"}.get(shape, "inner")
    size = 20.0 if shape == "rotating" else 0.4
    case["walls"] = {outer: {"speed": histories(size, time)[kind]}}
    if shape in ("plates", "axial", "rotating"):
        case["walls"][inner] = {"speed": histories(-0.4 * size, 1.3 * time)["smooth_ramp"]}
    if shape != "rotating":
        case["pressure"] = histories(8 * case["viscosity"] * size / width**2, 0.8 * time)["ramp"]
    return case | {"start": start, "duration": 1.8 * time, "accuracy": accuracy, "settle_within": 0.02}


KINDS = tuple(histories(1.0, 1.0))

"""Plain cases with bodies on walls and prescribed flow, in SI, for the exact answers and the march."""

from __future__ import annotations

from typing import Any


def ramp(to: float, over: float, start: float = 0.0) -> dict[str, Any]:
    """A ramp from ``start``."""
    return {"kind": "ramp", "to": to, "over": over, "from": start}


PLATES = {"shape": "plates", "height": 1e-3, "density": 1000.0, "viscosity": 1e-3, "length": 0.1, "width": 0.05}
AXIAL = {"shape": "annulus", "motion": "axial", "inner_radius": 5e-3, "outer_radius": 6e-3, "density": 1000.0,
         "viscosity": 1e-3, "length": 0.1}  # fmt: skip
ROTATING = AXIAL | {"motion": "rotating", "inner_radius": 2e-3, "outer_radius": 3e-3}
PIPE = {"shape": "pipe", "radius": 1e-3, "density": 1000.0, "viscosity": 1e-3, "length": 0.1}
AREA = 5e-3
PUSH = {"area": AREA, "force": ramp(1e-3, 0.1)}
LET_GO = {"mass": 5e-3, "area": AREA, "stiffness": 1.0, "force": ramp(1e-3, 0.1, 2e-3)}

CASES: dict[str, dict[str, Any]] = {
    "pushed plate": PLATES | {"walls": {"upper": {"body": PUSH | {"mass": 5e-3}}}},
    "sprung plate over a moving one": PLATES | {"walls": {
        "upper": {"body": PUSH | {"mass": 0.05, "stiffness": 20.0, "damping": 0.01}},
        "lower": {"speed": ramp(0.1, 0.3)}}},
    "two bodies set going": PLATES | {"walls": {
        "upper": {"body": PUSH | {"mass": 5e-3, "initial_speed": 0.03}},
        "lower": {"body": {"mass": 2e-3, "area": AREA / 2, "stiffness": 3.0, "initial_displacement": 1e-3}}}},
    "massless plate": PLATES | {"walls": {"upper": {"body": PUSH | {"mass": 0.0}}}},
    "prescribed flow": PLATES | {"pressure": {"mean_velocity": ramp(0.1, 0.1)}},
    "sealed gap": PLATES | {"pressure": {"sealed": True}, "walls": {"upper": {"speed": {"kind": "step", "to": 0.1}}}},
    "plunger": PLATES | {"pressure": {"sealed": True},
                         "walls": {"upper": {"body": PUSH | {"mass": 5e-3, "displaces": 5e-5}}}},
    "rod in a flow": AXIAL | {"pressure": {"mean_velocity": {"kind": "lag", "to": 0.1, "time_constant": 0.2}},
                              "walls": {"inner": {"body": {"mass": 4e-3, "area": 3e-3, "force": ramp(1e-3, 0.1)}}}},
    "sprung rotor": ROTATING | {"walls": {
        "inner": {"body": {"mass": 3e-8, "area": 1.2e-3, "force": ramp(1e-6, 0.1), "stiffness": 1e-5}},
        "outer": {"body": {"mass": 3e-8, "area": 1.8e-3}}}},
    "hanging pipe": PIPE | {"pressure": ramp(5.0, 0.1), "walls": {"bore": {"body": {
        "mass": 1e-3, "area": 6.28e-4, "stiffness": 0.5,
        "force": {"kind": "sine", "amplitude": 1e-4, "frequency": 3.0}}}}},
    "held, then let go": PLATES | {"start": "steady", "walls": {
        "upper": {"body": LET_GO | {"initial_speed": 0.02}}, "lower": {"speed": ramp(0.1, 0.3, 0.2)}}},
    "from equilibrium": PLATES | {"start": "steady", "walls": {
        "upper": {"body": LET_GO}, "lower": {"speed": ramp(0.1, 0.3, 0.2)}}},
}  # fmt: skip

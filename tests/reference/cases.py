"""Plain cases in SI, and the case file that says the same in the contract's words.

A plain case: shape, motion, height / radius / inner_radius, outer_radius, density, viscosity,
walls = {name: {speed | displacement | shear_free | body, slip_length}}, pressure, start, duration, settle_within,
accuracy.  A body: mass, area, and force, damping, stiffness, initial_speed, initial_displacement, displaces where it
has them; in a rotating gap the same names stand for inertia, torque and so on.  ``pressure`` is the history of the drop
per length, or {mean_velocity: history} or {sealed: True}.
"""

from __future__ import annotations

from typing import Any

SIZES = ("height", "radius", "inner_radius", "outer_radius", "length", "width")
BODY = (
    {"mass": "kg", "area": "m^2", "force": "N", "damping": "N*s/m", "stiffness": "N/m", "initial_speed": "m/s",
     "initial_displacement": "m", "displaces": "m^2", "dry_friction": "N", "breakaway_friction": "N"},
    {"mass": "kg*m^2", "area": "m^2", "force": "N*m", "damping": "N*m*s/rad", "stiffness": "N*m/rad",
     "initial_speed": "rad/s", "initial_displacement": "rad", "dry_friction": "N*m",
     "breakaway_friction": "N*m"},
)  # fmt: skip
TIMES = ("at", "over", "rise", "hold", "fall", "time_constant", "every", "period")


def tree_of(case: dict[str, Any]) -> dict[str, Any]:
    """The contract's case tree, every quantity with its unit."""
    rotating = case.get("motion") == "rotating"
    speed = "rad/s" if rotating else "m/s"
    gap = {"shape": case["shape"]} | {k: _said(case[k], "m") for k in SIZES if k in case}
    if "motion" in case:
        gap["motion"] = case["motion"]
    tree: dict[str, Any] = {
        "title": case.get("title", "judged"),
        "gap": gap,
        "fluid": {"density": _said(case["density"], "kg/m^3"), "viscosity": _said(case["viscosity"], "Pa*s")},
        "run": {k: _said(100 * case[k], "%") for k in ("settle_within", "accuracy") if k in case},
    }
    tree["run"] |= {k: case[k] for k in ("profiles",) if k in case}
    if case.get("duration") is not None:
        tree["run"]["duration"] = _said(case["duration"], "s")
    walls = {name: _wall(wall, speed, "rad" if rotating else "m") for name, wall in case.get("walls", {}).items()}
    if walls:
        tree["wall"] = walls
    pressure = case.get("pressure")
    if isinstance(pressure, dict) and "kind" not in pressure:
        tree["pressure"] = {k: v if k == "sealed" else said(v, "m/s") for k, v in pressure.items()}
    elif pressure is not None:
        tree["pressure"] = {"drop_per_length": said(pressure, "Pa/m")}
    if "start" in case:
        tree["start"] = {"state": case["start"]}
    return tree


def _wall(wall: dict[str, Any], speed: str, angle: str) -> dict[str, Any]:
    out: dict[str, Any] = {}
    if "speed" in wall:
        out["speed"] = said(wall["speed"], speed)
    if "displacement" in wall:
        out["displacement"] = said(wall["displacement"], angle)
    if "slip_length" in wall:
        out["slip_length"] = _said(wall["slip_length"], "m")
    if wall.get("shear_free"):
        out["shear_free"] = True
    if "body" in wall:
        out["body"] = _body(wall["body"], angle == "rad")
    return out


def _body(body: dict[str, Any], turning: bool) -> dict[str, Any]:
    units = BODY[1 if turning else 0]
    names = {"mass": "inertia", "force": "torque"} if turning else {}
    out = {names.get(k, k): said(v, units[k]) for k, v in body.items() if k != "curve"}
    if "curve" in body:
        speeds, values = ([_said(x, unit) for x in row] for row, unit in zip(
            body["curve"], ("rad/s" if turning else "m/s", units["force"]), strict=True))  # fmt: skip
        out["torque_curve" if turning else "force_curve"] = {"speeds": speeds, "values": values}
    return out


def _said(value: float, unit: str) -> str:
    return f"{float(value)!r} {unit}"


def said(history: Any, unit: str) -> Any:
    """A history in the contract's words, its values in ``unit``."""
    if not isinstance(history, dict):
        return _said(history, unit)
    out: dict[str, Any] = {"kind": history["kind"]}
    for key, value in history.items():
        if key in ("kind", "interpolation", "times") and history["kind"] != "table":
            out[key] = value
        elif key in TIMES:
            out[key] = _said(value, "s")
        elif key == "frequency":
            out[key] = _said(value, "Hz")
        elif key == "phase":
            out[key] = _said(value, "rad")
        elif key == "acceleration":
            out[key] = _said(value, f"{unit}/s" if unit != "m/s" else "m/s^2")
        elif key == "jerk":
            out[key] = _said(value, f"{unit}/s^2" if unit != "m/s" else "m/s^3")
        elif key == "part":
            out[key] = said(value, unit)
        elif key == "parts":
            out[key] = [said(v, unit) for v in value]
        elif history["kind"] == "table":
            out[key] = value if key in ("kind", "interpolation") else [float(v) for v in value]
        else:
            out[key] = _said(value, unit)
    if history["kind"] == "table":
        out |= {"unit": unit, "time_unit": "s"}
    return out

"""The equations that were solved, their conditions at the walls, and what they take for granted."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from transient.case.inputs import WallInput
from transient.case.model import Case
from transient.fluid import LAWS
from transient.sheet.document.blocks import Block, Formula, Points, Words
from transient.sheet.document.facts import Facts
from transient.sheet.drives import drive_words, shortened

# By the metric m of the one equation r^m: its form, its letters, the stress.
EQUATIONS = {
    0: ("ρ ∂u/∂t  =  ∂/∂y (μ ∂u/∂y)  +  G(t)", "u velocity along +x, y distance from the lower wall"),
    1: ("ρ ∂u/∂t  =  (1/r) ∂/∂r (r μ ∂u/∂r)  +  G(t)", "u velocity along +x, r radius"),
    3: ("ρ ∂u/∂t  =  (1/r²) ∂/∂r (r³ μ ∂ω/∂r),   u = r ω", "u tangential velocity, ω angular speed, r radius"),
}
# What a wall's stress is, but for the sign.
SHEARS = {0: "μ ∂u/∂y", 1: "μ ∂u/∂r", 3: "μ r ∂ω/∂r"}


def model(facts: Facts) -> tuple[Block, ...]:
    """Equation, wall stress, conditions and assumptions."""
    case = facts.case
    if case is None or case.gap.shape.metric not in EQUATIONS:
        return (Words("The case file at the end states the model; this version does not read it."), _assumed(facts))
    metric = case.gap.shape.metric
    text, letters = EQUATIONS[metric]
    push = "" if metric == 3 else ", G pressure drop per length (positive drives along +x)"
    blocks: list[Block] = [Formula(text, f"{letters}, ρ density, μ viscosity{push}, t time")]
    blocks.append(Formula(_stresses(case), "traction of the liquid on the wall"))
    blocks.append(Points(tuple(shortened(text, 240) for text in _conditions(case))))
    return (*blocks, _assumed(facts), Words(_method(facts)))


def _stresses(case: Case) -> str:
    """Stress on each wall: the traction on the face that looks along the coordinate, or against it."""
    shape = case.gap.shape
    signs = dict(zip(shape.walls, "+−", strict=True))
    return ",   ".join(f"τ_{name} = {signs[name]} {SHEARS[shape.metric]}" for name in shape.real_walls)


def _conditions(case: Case) -> Iterator[str]:
    """What holds at every wall, what drives, and how the run begins."""
    tree: dict[str, Any] = case.tree
    walls = tree.get("wall") or {}
    if case.gap.shape.axis:
        yield "Axis: ∂u/∂r = 0."
    for wall in case.walls:
        if wall is not None:
            yield _wall(wall, walls.get(wall.name) or {}, case.gap.shape.rotating)
    pressure = tree.get("pressure") or {}
    for key, value in pressure.items():
        if key == "sealed" and value:
            yield "Sealed: no net flow; G(t) follows from that."
        elif key in ("flow_rate", "mean_velocity"):
            yield f"The {key.replace('_', ' ')} is prescribed and G(t) follows: {drive_words(value)}."
        elif key in ("drop", "drop_per_length"):
            yield f"Pressure {key.replace('_', ' ')}: {drive_words(value)}."
    if not pressure and not case.gap.shape.rotating:
        yield "No pressure drop: G = 0."
    if case.start == "steady":
        yield "Start: the steady flow of the drive's values just before t = 0."
    else:
        yield "Start: everything is at rest before t = 0."


def _wall(wall: WallInput, tree: dict[str, Any], rotating: bool) -> str:
    name = f"{wall.name.capitalize()} wall"
    slip = f", with slip length {tree['slip_length']}" if wall.slip_length else ""
    if wall.shear_free:
        return f"{name}: shear-free, no stress."
    if wall.body is not None:
        return f"{name}{slip}: {_body(tree.get('body') or {}, rotating)}"
    for key in ("speed", "displacement"):
        if key in tree:
            return f"{name}{slip}: {key} prescribed, {drive_words(tree[key])}."
    return f"{name}{slip}: stands still."


def _body(tree: dict[str, Any], rotating: bool) -> str:
    inertia, load, speed = ("I", "M", "ω") if rotating else ("m", "F", "U")
    terms = [f"{load}(t)"] if ("torque" if rotating else "force") in tree else []
    terms += [f"{load}({speed})"] if ("torque_curve" if rotating else "force_curve") in tree else []
    terms += ["m g sin(incline)"] if "incline" in tree else []
    terms += ["τ r A n" if rotating else "τ A n"]
    terms += ["p times the displaced area"] if "displaces" in tree else []
    losses = {"damping": f"c {speed}", "stiffness": "k X", "dry_friction": "dry friction"}
    lost = "".join(f" − {word}" for key, word in losses.items() if key in tree)
    driven = next((tree[key] for key in ("force", "torque") if key in tree), None)
    by = "" if driven is None else f"; {load}(t): {drive_words(driven)}"
    return f"moves as a body, {inertia} d{speed}/dt = {' + '.join(terms)}{lost} (n gaps of wetted area A){by}."


def _assumed(facts: Facts) -> Points:
    """What the model takes for granted."""
    case = facts.case
    law = case.fluid.law if case is not None else "constant"
    heated = case is not None and "heat" in case.tree
    viscosity = "One viscosity throughout (Newtonian liquid)" if law == "constant" else LAWS[law].doc
    warmth = "heated by its own shear as stated" if heated else "not warmed by its own shear"
    return Points(
        (
            "The flow is laminar, one-dimensional and fully developed along the gap: no entrance and end effects, no "
            "side walls, no turbulence, no vortices.",
            f"{viscosity}; constant density; {warmth}.",
            "Walls are rigid, parallel or coaxial, and smooth; the liquid fills the gap and does not cavitate.",
            "Pressure acts along the whole gap at once: no pressure waves, no elasticity.",
            "Whether these hold is judged by the checks below, each with its limit and source.",
        )
    )


def _method(facts: Facts) -> str:
    part = facts.summary.get("numerics") or {}
    sizes = f" ({part['points']} points, {part['steps']} steps)" if "points" in part else ""
    return (
        f"Solved by finite volumes and implicit steps of second order{sizes}, refined until the stated errors met the "
        "accuracy asked for; what is printed is extrapolated from two or more levels."
    )

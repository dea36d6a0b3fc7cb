"""Small cases in plain numbers: gaps of every shape, of unit size unless said otherwise, and drives to go with them."""

from __future__ import annotations

from typing import Any

from transient.drive import lag, ramp, sine, smooth_ramp, step, trapezoid
from transient.drive.pieces import Drive, constant
from transient.gap.problem import Law, Problem, Wall

# metric, inner end, outer end, names and kinds of the ends
GAPS: dict[str, tuple[int, float, float, tuple[str, str], tuple[str, str]]] = {
    "plates": (0, 0.0, 1.0, ("lower", "upper"), ("moving", "moving")),
    "pipe": (1, 0.0, 1.0, ("axis", "bore"), ("axis", "moving")),
    "annulus_axial": (1, 0.5, 1.5, ("inner", "outer"), ("moving", "moving")),
    "annulus_rotating": (3, 0.5, 1.5, ("inner", "outer"), ("moving", "moving")),
}
SHAPES = tuple(GAPS)

Value = float | Drive


def problem(shape: str = "plates", upper: Value = 0.0, lower: Value = 0.0, push: Value = 0.0, **more: Any) -> Problem:
    """A case: wall speeds and pressure drop per length as Drives or as numbers held from t = 0 on.

    ``more``: ``kinds``, ``slips``, ``areas`` (pairs), ``density``, ``viscosity`` and any field of ``Problem``.
    """
    metric, inner, outer, names, kinds = GAPS[shape]
    inner, outer = more.pop("inner", inner), more.pop("outer", outer)
    kinds, slips = more.pop("kinds", kinds), more.pop("slips", (0.0, 0.0))
    areas = more.pop("areas", (None, None))
    radii = (inner, outer) if metric else (0.0, 0.0)
    density, viscosity = more.pop("density", 1.0), more.pop("viscosity", 1.0)
    walls = tuple(Wall(*wall) for wall in zip(names, kinds, slips, areas, radii, strict=True))
    keys = {"start": "rest", "duration": None, "settle_within": 0.01, "accuracy": 1e-3} | more
    drives = [value if isinstance(value, Drive) else held(value) for value in (lower, upper, push)]
    return Problem(
        shape, metric, inner, outer, density, Law(0, (viscosity,)), walls, (drives[0], drives[1]), drives[2], **keys
    )  # fmt: skip


def held(value: float) -> Drive:
    """A value that was there before t = 0 as well (with a start from rest: a sudden start)."""
    return constant(value)


__all__ = ["GAPS", "SHAPES", "constant", "held", "lag", "problem", "ramp", "sine", "smooth_ramp", "step", "trapezoid"]

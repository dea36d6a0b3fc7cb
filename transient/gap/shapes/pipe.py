"""A round pipe: coordinate from the axis to the bore, m = 1."""

from __future__ import annotations

import math

from transient.gap.shapes.shape import Ends, Shape, Size, Sizes, exactly_one


def _ends(sizes: Sizes) -> Ends:
    given = exactly_one(sizes, ("diameter", "radius"), 'diameter = "12 mm"')
    radius = sizes[given] / 2 if given == "diameter" else sizes[given]
    return Ends(0.0, radius, radius)


def _areas(ends: Ends, sizes: Sizes) -> tuple[float | None, float | None]:
    return None, 2 * math.pi * ends.outer * sizes["length"] if "length" in sizes else None


def _section(ends: Ends, sizes: Sizes) -> float | None:
    return math.pi * ends.outer**2


PIPE = Shape(
    name="pipe",
    word="pipe",
    motion=None,
    doc="A round pipe; its wall is the bore",
    metric=1,
    sizes=(
        Size("diameter", "length", "Diameter of the bore", "12 mm"),
        Size("radius", "length", "Radius of the bore, instead of the diameter", "6 mm"),
        Size("length", "length", "Length along the flow; needed for an area, a force or a pressure drop", "4 m"),
    ),
    walls=("axis", "bore"),
    ends=_ends,
    areas=_areas,
    section=_section,
    radii=lambda ends: (0.0, ends.outer),
    axis=True,
)

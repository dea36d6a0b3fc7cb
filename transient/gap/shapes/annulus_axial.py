"""Flow along an annulus, whose walls may slide along it: m = 1."""

from __future__ import annotations

import math

from transient.gap.shapes.annulus import annulus_areas, annulus_ends, annulus_radii, annulus_sizes
from transient.gap.shapes.shape import Ends, Shape, Sizes


def _section(ends: Ends, sizes: Sizes) -> float | None:
    return math.pi * (ends.inner + ends.outer) * ends.gap


ANNULUS_AXIAL = Shape(
    name="annulus_axial",
    word="annulus",
    motion="axial",
    doc="The gap between two coaxial round walls; flow and wall motion along the axis",
    metric=1,
    sizes=annulus_sizes("Length along the flow; needed for an area, a force or a pressure drop"),
    walls=("inner", "outer"),
    ends=annulus_ends,
    areas=annulus_areas,
    section=_section,
    radii=annulus_radii,
)

"""Flow around an annulus, whose walls turn about its axis: m = 3, the unknown is the angular speed."""

from __future__ import annotations

from transient.gap.shapes.annulus import annulus_areas, annulus_ends, annulus_radii, annulus_sizes
from transient.gap.shapes.shape import Shape

ANNULUS_ROTATING = Shape(
    name="annulus_rotating",
    word="annulus",
    motion="rotating",
    doc="The gap between two coaxial round walls that turn about the axis",
    metric=3,
    sizes=annulus_sizes("Length along the axis; needed for an area or a torque"),
    walls=("inner", "outer"),
    ends=annulus_ends,
    areas=annulus_areas,
    section=lambda ends, sizes: None,  # the flow runs in circles: nothing passes through
    radii=annulus_radii,
)

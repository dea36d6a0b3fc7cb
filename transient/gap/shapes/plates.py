"""Two parallel plates: coordinate from the lower to the upper one, m = 0."""

from __future__ import annotations

from transient.gap.shapes.shape import Ends, Shape, Size, Sizes


def _ends(sizes: Sizes) -> Ends:
    return Ends(0.0, sizes["height"], sizes["height"])


def _areas(ends: Ends, sizes: Sizes) -> tuple[float | None, float | None]:
    if "length" not in sizes or "width" not in sizes:
        return None, None
    area = sizes["length"] * sizes["width"]
    return area, area


def _section(ends: Ends, sizes: Sizes) -> float | None:
    return ends.gap * sizes["width"] if "width" in sizes else None


PLATES = Shape(
    name="plates",
    word="plates",
    motion=None,
    doc="Two parallel plates, wide against the gap between them",
    metric=0,
    sizes=(
        Size("height", "length", "Distance between the plates", "0.80 mm", required=True),
        Size("length", "length", "Length along the flow; needed for an area, a force or a pressure drop", "60 mm"),
        Size("width", "length", "Width across the flow; needed for an area, a force or a flow rate", "25 mm"),
    ),
    walls=("lower", "upper"),
    ends=_ends,
    areas=_areas,
    section=_section,
    radii=lambda ends: (0.0, 0.0),
)

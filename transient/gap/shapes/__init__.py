"""The gap shapes: one file and one entry each."""

from __future__ import annotations

from transient.gap.shapes.annulus_axial import ANNULUS_AXIAL
from transient.gap.shapes.annulus_rotating import ANNULUS_ROTATING
from transient.gap.shapes.pipe import PIPE
from transient.gap.shapes.plates import PLATES
from transient.gap.shapes.shape import Ends, Shape, ShapeError, Size

SHAPES: dict[str, Shape] = {shape.name: shape for shape in (PLATES, PIPE, ANNULUS_AXIAL, ANNULUS_ROTATING)}

__all__ = ["SHAPES", "Ends", "Shape", "ShapeError", "Size"]

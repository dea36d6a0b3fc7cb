"""The sizes of an annulus, shared by its two motions: two of inner radius, outer radius and clearance."""

from __future__ import annotations

import math

from transient.gap.shapes.shape import Ends, ShapeError, Size, Sizes

_INNER = ("inner_diameter", "inner_radius")
_OUTER = ("outer_diameter", "outer_radius")
_CLEARANCE = ("radial_clearance", "diametral_clearance")
_HALVED = ("inner_diameter", "outer_diameter", "diametral_clearance")
_NEED = "exactly two of an inner size, an outer size and a clearance are needed"


def annulus_sizes(length_doc: str) -> tuple[Size, ...]:
    """The keys of an annulus; what its length is needed for depends on the motion."""
    return (
        Size("inner_diameter", "length", "Diameter of the inner wall", "20 mm"),
        Size("inner_radius", "length", "Radius of the inner wall, instead of its diameter", "10 mm"),
        Size("outer_diameter", "length", "Diameter of the outer wall", "24 mm"),
        Size("outer_radius", "length", "Radius of the outer wall, instead of its diameter", "12 mm"),
        Size("radial_clearance", "length", "Outer radius minus inner radius", "0.5 mm"),
        Size("diametral_clearance", "length", "Outer diameter minus inner diameter", "1 mm"),
        Size("length", "length", length_doc, "80 mm"),
    )


def _radius(sizes: Sizes, names: tuple[str, str]) -> tuple[str | None, float]:
    """(key given, its value as a radius or radial clearance) of one group."""
    given = [name for name in names if name in sizes]
    if len(given) == 2:
        raise ShapeError(given[1], f"is given beside {given[0]}", f"one of {names[0]} or {names[1]} is needed")
    if not given:
        return None, 0.0
    return given[0], sizes[given[0]] / 2 if given[0] in _HALVED else sizes[given[0]]


def annulus_ends(sizes: Sizes) -> Ends:
    """Ends of an annulus from exactly two of its three groups of keys; raises ``ShapeError``.

    A clearance that is given is kept as it is: the difference of two nearly equal radii would lose its digits.
    """
    (inner_key, inner), (outer_key, outer), (clear_key, clear) = (
        _radius(sizes, group) for group in (_INNER, _OUTER, _CLEARANCE)
    )
    given = [key for key in (inner_key, outer_key, clear_key) if key]
    if len(given) == 3:
        raise ShapeError(given[2], f"is given beside {given[0]} and {given[1]}", _NEED)
    if len(given) < 2:
        missing = "inner_diameter" if not inner_key else "outer_diameter"
        raise ShapeError(
            missing, "is missing", _NEED + ', such as inner_diameter = "20 mm", radial_clearance = "0.5 mm"'
        )
    if not clear_key:
        if inner >= outer:
            raise ShapeError(
                str(inner_key), "does not lie inside the outer wall", "a smaller inner or a larger outer wall is needed"
            )
        return Ends(inner, outer, outer - inner)
    if not outer_key:
        return Ends(inner, inner + clear, clear)
    if clear >= outer:
        raise ShapeError(str(clear_key), "leaves no inner wall", "a clearance below the outer radius is needed")
    return Ends(outer - clear, outer, clear)


def annulus_areas(ends: Ends, sizes: Sizes) -> tuple[float | None, float | None]:
    """Wetted areas 2 pi r length in m^2, or None without a length."""
    if "length" not in sizes:
        return None, None
    return 2 * math.pi * ends.inner * sizes["length"], 2 * math.pi * ends.outer * sizes["length"]


def annulus_radii(ends: Ends) -> tuple[float, float]:
    """The walls' radii, m."""
    return ends.inner, ends.outer

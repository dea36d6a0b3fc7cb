"""Sizes of each shape: ends, areas, sections, and what contradicts itself."""

from __future__ import annotations

import math

import pytest

from transient.gap.shapes import SHAPES, Ends, ShapeError

RING = SHAPES["annulus_axial"]


@pytest.mark.parametrize(
    "sizes",
    [
        {"inner_radius": 0.01, "outer_radius": 0.012},
        {"inner_diameter": 0.02, "outer_radius": 0.012},
        {"inner_radius": 0.01, "outer_diameter": 0.024},
        {"inner_radius": 0.01, "radial_clearance": 0.002},
        {"inner_radius": 0.01, "diametral_clearance": 0.004},
        {"outer_diameter": 0.024, "radial_clearance": 0.002},
    ],
)
def test_two_sizes_make_an_annulus(sizes: dict[str, float]) -> None:
    for name in ("annulus_axial", "annulus_rotating"):
        ends = SHAPES[name].ends(sizes)
        assert (ends.inner, ends.outer, ends.gap) == pytest.approx((0.01, 0.012, 0.002), rel=1e-14)


def test_a_given_clearance_and_inner_wall_are_kept_to_the_bit() -> None:
    assert RING.ends({"inner_radius": 0.3, "radial_clearance": 1e-7}) == Ends(0.3, 0.3 + 1e-7, 1e-7)
    assert RING.ends({"outer_radius": 0.3, "diametral_clearance": 2e-7}) == Ends(0.3 - 1e-7, 0.3, 1e-7)


def test_areas_and_sections() -> None:
    """Areas of cylinders and sections of rings (plane geometry)."""
    plates, pipe, turning = SHAPES["plates"], SHAPES["pipe"], SHAPES["annulus_rotating"]
    flat = {"height": 1e-3, "length": 0.06, "width": 0.025}
    assert plates.areas(plates.ends(flat), flat) == (0.0015, 0.0015)
    assert plates.section(plates.ends(flat), flat) == pytest.approx(2.5e-5)
    assert plates.areas(plates.ends(flat), {"height": 1e-3, "length": 0.06}) == (None, None)
    assert plates.section(plates.ends(flat), {"height": 1e-3}) is None
    bore = {"diameter": 0.01, "length": 2.0}
    assert pipe.areas(pipe.ends(bore), bore) == (None, pytest.approx(2 * math.pi * 0.005 * 2))
    assert pipe.section(pipe.ends(bore), bore) == pytest.approx(math.pi * 25e-6)
    ring = {"inner_radius": 0.01, "outer_radius": 0.012, "length": 0.5}
    ends = RING.ends(ring)
    assert RING.areas(ends, ring) == pytest.approx((2 * math.pi * 0.01 * 0.5, 2 * math.pi * 0.012 * 0.5))
    assert RING.section(ends, ring) == pytest.approx(math.pi * (0.012**2 - 0.01**2))
    assert turning.section(ends, ring) is None
    assert RING.areas(ends, {}) == (None, None)


def test_names_and_metrics() -> None:
    assert {name: (shape.metric, shape.walls) for name, shape in SHAPES.items()} == {
        "plates": (0, ("lower", "upper")),
        "pipe": (1, ("axis", "bore")),
        "annulus_axial": (1, ("inner", "outer")),
        "annulus_rotating": (3, ("inner", "outer")),
    }
    assert SHAPES["pipe"].real_walls == ("bore",)
    assert SHAPES["pipe"].radii(SHAPES["pipe"].ends({"radius": 0.004})) == (0.0, 0.004)


@pytest.mark.parametrize(
    ("sizes", "key"),
    [
        ({"inner_radius": 0.02, "outer_radius": 0.01}, "inner_radius"),
        ({"inner_radius": 0.01, "outer_radius": 0.01}, "inner_radius"),
        ({"outer_radius": 0.01, "radial_clearance": 0.02}, "radial_clearance"),
        ({"inner_radius": 0.01}, "outer_diameter"),
        ({"outer_radius": 0.01}, "inner_diameter"),
        ({}, "inner_diameter"),
        ({"inner_radius": 0.01, "inner_diameter": 0.02, "outer_radius": 0.03}, "inner_radius"),
        ({"inner_radius": 0.01, "outer_radius": 0.03, "radial_clearance": 0.02}, "radial_clearance"),
    ],
)
def test_contradicting_sizes_name_their_key(sizes: dict[str, float], key: str) -> None:
    with pytest.raises(ShapeError) as caught:
        RING.ends(sizes)
    assert caught.value.key == key

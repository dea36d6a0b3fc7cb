"""Numbers that follow without solving."""

from __future__ import annotations

import math

import pytest

from transient.case.derived import Derived, derived, peak, span, steady_mean_velocity
from transient.case.model import Case
from transient.units import DIMENSIONS

OIL = {"density": "900 kg/m^3", "viscosity": "90 mPa*s"}


def numbers(case: Case) -> dict[str, Derived]:
    """Derived numbers by name."""
    rows = {row.name: row for row in derived(case)}
    assert all(row.dimension in {*DIMENSIONS, "number"} and row.note for row in rows.values())
    return rows


def test_plates() -> None:
    case = Case({
        "gap": {"shape": "plates", "height": "1 mm", "width": "20 mm", "length": "50 mm"}, "fluid": OIL,
        "wall": {"upper": {"speed": {"kind": "sine", "amplitude": "2 m/s", "frequency": "10 Hz"}}},
        "pressure": {"drop_per_length": "-12 kPa/m"},
    })  # fmt: skip
    found = numbers(case)
    assert found["diffusion time"].value == pytest.approx(0.01, rel=1e-12)
    assert found["kinematic viscosity"].value == pytest.approx(1e-4, rel=1e-12)
    assert found["peak speed, upper"].value == pytest.approx(2.0, rel=1e-4)
    assert found["Reynolds number of the wall"].value == pytest.approx(20.0, rel=1e-4)
    assert found["mean velocity at peak pressure"].value == pytest.approx(12e3 * 1e-6 / (12 * 0.09), rel=1e-12)
    assert found["wetted area, lower"].value == pytest.approx(1e-3, rel=1e-12)


def test_pipe() -> None:
    """Laminar pipe flow has Darcy f Re = 64 (White, Fluid Mechanics, Table 6.3, first row)."""
    case = Case({
        "gap": {"shape": "pipe", "diameter": "10 mm", "length": "2 m"}, "fluid": OIL,
        "pressure": {"drop": "2 kPa"},
    })  # fmt: skip
    found = numbers(case)
    mean = found["mean velocity at peak pressure"].value
    friction = 2 * 0.01 * 1000.0 / (900.0 * mean**2)
    assert friction * found["Reynolds number of the flow"].value == pytest.approx(64.0, rel=1e-12)
    assert found["diffusion time"].value == pytest.approx(0.25, rel=1e-12)


# White, Fluid Mechanics, Table 6.3: Darcy friction factor x Reynolds number on the hydraulic diameter.
WHITE = [
    (0.01, 80.11),
    (0.05, 86.27),
    (0.1, 89.37),
    (0.2, 92.35),
    (0.4, 94.71),
    (0.6, 95.59),
    (0.8, 95.92),
    (0.9999, 96.0),
]


@pytest.mark.parametrize(("ratio", "product"), WHITE)
def test_annulus_against_the_published_friction(ratio: float, product: float) -> None:
    gap = {"shape": "annulus", "motion": "axial", "inner_radius": f"{ratio!r} m", "outer_radius": "1 m"}
    problem = Case({"gap": gap, "fluid": OIL}).problem()
    mean = steady_mean_velocity(problem, 1.0 - ratio, 1.0)
    across = 2 * (1.0 - ratio)
    assert 2 * across**2 / (problem.viscosity * mean) == pytest.approx(product, abs=0.006)


def test_rotating() -> None:
    gap = {
        "shape": "annulus",
        "motion": "rotating",
        "inner_radius": "20 mm",
        "radial_clearance": "1 mm",
        "length": "1 m",
    }
    case = Case({"gap": gap, "fluid": OIL, "wall": {"inner": {"speed": "600 rpm"}}})
    found = numbers(case)
    turning = 600 * 2 * math.pi / 60
    assert found["Reynolds number of the wall"].value == pytest.approx(turning * 0.02 * 1e-3 / 1e-4, rel=1e-12)
    assert found["Taylor number"].value == pytest.approx(turning**2 * 0.02 * 1e-9 / 1e-8, rel=1e-12)
    assert "flow section" not in found


def test_a_clearance_keeps_its_digits() -> None:
    gap = {"shape": "annulus", "motion": "rotating", "inner_radius": "500 mm", "radial_clearance": "1 um"}
    assert numbers(Case({"gap": gap, "fluid": OIL}))["radial clearance"].value == 1e-6


@pytest.mark.parametrize(
    ("speed", "largest"),
    [
        ({"kind": "lag", "to": "2 m/s", "time_constant": "100 s"}, 2.0),
        ({"kind": "repeat", "every": "10 s", "part": {"kind": "half_sine", "amplitude": "3 m/s", "over": "8 s"}}, 3.0),
        ({"kind": "half_sine", "amplitude": "3 m/s", "over": "1 us", "at": "5 s"}, 3.0),
        ({"kind": "step", "to": "1 m/s", "from": "-4 m/s", "at": "3 s"}, 4.0),
    ],
)
def test_peaks_are_found_wherever_they_are(speed: dict[str, str], largest: float) -> None:
    drive = Case(
        {"gap": {"shape": "plates", "height": "1 mm"}, "fluid": OIL, "wall": {"upper": {"speed": speed}}}
    ).drives()[0]
    assert peak(drive, span(drive)) == pytest.approx(largest, rel=1e-4)

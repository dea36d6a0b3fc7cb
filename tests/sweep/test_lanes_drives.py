"""Drives built for many rows at once against the drives' own room, row by row."""

from __future__ import annotations

import numpy as np
import pytest

from transient.case.model import Case
from transient.drive import KINDS
from transient.sweep.keys import Varied, changes
from transient.sweep.lanes_drives import BUILDERS, DriveRows, shared, varied
from transient.sweep.lanes_form import Form

NUMBERS = {"value": (-2.0, 2.0), "value_rate": (0.5, 5.0), "value_jerk": (0.5, 20.0), "time": (0.05, 2.0)}
ROWS = 12


def value(rows: DriveRows, row: int, time: np.ndarray) -> np.ndarray:
    """Values at ``time`` (n,) of one row's pieces."""
    starts = rows.starts[row]
    piece = np.searchsorted(starts, time, side="right") - 1
    x = time - starts[piece]
    poly, wave = rows.poly[row, piece], rows.wave[row, piece]
    return (poly * x[:, None] ** np.arange(4)).sum(axis=1) + (
        (wave[:, 0] + 1j * wave[:, 1]) * np.exp((wave[:, 2] + 1j * wave[:, 3]) * x)
    ).real


@pytest.mark.parametrize("name", BUILDERS)
def test_kinds_are_those_of_the_drives_room(name):
    """At random numbers, late and immediate beginnings, and changes to the same value."""
    kind = KINDS[name]
    generator = np.random.default_rng(5)
    numbers = {field.name: generator.uniform(*NUMBERS[field.quantity], ROWS) for field in kind.fields}
    if "at" in numbers:
        numbers["at"][::3] = 0.0
    if "from" in numbers:
        numbers["from"][1] = numbers["to"][1]
    rows = varied(kind, numbers)
    time = np.sort(generator.uniform(0.0, 8.0, 300))
    for row in range(ROWS):
        given = {"from_" if key == "from" else key: float(number[row]) for key, number in numbers.items()}
        drive = kind.build(**given)
        np.testing.assert_allclose(value(rows, row, time), drive.pieces(10.0).value(time), rtol=1e-12, atol=1e-12)
        assert rows.before[row] == drive.before
        assert rows.end[row] == pytest.approx(drive.eventual.drive.pieces(1.0).value(np.zeros(1))[0], abs=1e-15)
        alone = shared(drive)
        assert alone is not None
        assert rows.last[row] == pytest.approx(alone.last[0], abs=1e-15)
        assert rows.lag[row] == pytest.approx(alone.lag[0], abs=1e-15)
    assert not rows.bad.any()


def test_numbers_that_the_drives_room_refuses_are_marked():
    kind = KINDS["ramp"]
    numbers = {"to": np.ones(4), "from": np.zeros(4), "over": np.array([1.0, 0.0, -1.0, np.nan]), "at": np.zeros(4)}
    assert list(varied(kind, numbers).bad) == [False, True, True, True]
    numbers = {"to": np.ones(2), "from": np.zeros(2), "over": np.array([1e-13, 1.0]), "at": np.array([1.0, -1.0])}
    assert list(varied(kind, numbers).bad) == [True, True]


ANNULUS = {
    "gap": {"shape": "annulus", "motion": "axial", "outer_radius": "12 mm", "diametral_clearance": "4 mm",
            "length": "80 mm"},
    "fluid": {"density": "900 kg/m^3", "kinematic_viscosity": "20 mm^2/s"},
    "pressure": {"drop": {"kind": "step", "to": "5 kPa", "at": "20 ms"}},
}  # fmt: skip


def test_sizes_and_properties_are_those_of_the_case_room():
    base = Case(ANNULUS)
    keys = [Varied("gap.outer_radius", "quantity", "length", "m"), Varied("gap.length", "quantity", "length", "m"),
            Varied("fluid.kinematic_viscosity", "quantity", "kinematic_viscosity", "m^2/s"),
            Varied("gap.count", "whole")]  # fmt: skip
    values = {"gap.outer_radius": np.array([0.01, 0.02]), "gap.length": np.array([0.1, 0.3]),
              "fluid.kinematic_viscosity": np.array([1e-5, 3e-5]), "gap.count": np.array([2, 3])}  # fmt: skip
    form = Form(base, keys)
    assert form.fits
    geometry = form.geometry(values, 2)
    density, viscosity = form.fluid(values, 2)
    drop = form.drive(2, values, geometry, 2)
    for row in range(2):
        one = base.replace(changes(keys, values, row)).problem()
        assert geometry.inner[row] == pytest.approx(one.inner, rel=1e-14)
        assert geometry.outer[row] == pytest.approx(one.outer, rel=1e-14)
        assert geometry.gap[row] == pytest.approx(one.gap, rel=1e-12)
        assert geometry.section[row] == pytest.approx(one.section, rel=1e-13)
        for end in (0, 1):
            assert geometry.areas[end][row] == pytest.approx(one.walls[end].area, rel=1e-14)
        assert density[row] == one.density
        assert viscosity[row] == pytest.approx(one.viscosity, rel=1e-14)
        assert drop.end[row] == pytest.approx(one.gradient.pieces(1.0).value(np.array([0.5]))[0], rel=1e-14)

"""Rows solved side by side against single solves, textbook series, and themselves in another order."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from transient.answer import run
from transient.case.model import Case
from transient.march.lanes_grid import grid_table, unit_problem
from transient.march.lanes_round import round_tables
from transient.sweep import lanes, lanes_batch
from transient.sweep.columns import OPEN, SOLVED, blank, layout, put_summary
from transient.sweep.keys import Varied, changes

UNITS = {"length": "m", "time": "s", "viscosity": "Pa*s", "speed": "m/s", "density": "kg/m^3",
         "angular_speed": "rad/s", "angular_acceleration": "rad/s^2", "pressure": "Pa", "pressure_gradient": "Pa/m",
         "mass": "kg", "force": "N"}  # fmt: skip


def ramped(**more) -> Case:
    """Plates whose upper wall is brought up to speed."""
    tree = {
        "gap": {"shape": "plates", "height": "1 mm", "length": "60 mm", "width": "25 mm"},
        "fluid": {"density": "1000 kg/m^3", "viscosity": "1 mPa*s"},
        "wall": {"upper": {"speed": {"kind": "ramp", "to": "0.1 m/s", "over": "10 ms"}}},
    }
    return Case({**tree, **more})


def keys_of(spec: dict) -> list[Varied]:
    return [Varied(name, "quantity", one[0], UNITS[one[0]]) for name, one in spec.items()]


def drawn(spec: dict, rows: int, seed: int = 7) -> dict[str, np.ndarray]:
    """Values between the bounds of each key, evenly spread in the logarithm."""
    generator = np.random.default_rng(seed)
    return {name: np.exp(generator.uniform(np.log(low), np.log(high), rows)) for name, (_, low, high) in spec.items()}


def solved(base: Case, spec: dict, rows: int, seed: int = 7):
    keys, values = keys_of(spec), drawn(spec, rows, seed)
    columns = layout(base.problem())
    assert lanes.takes(base, keys)
    return keys, values, columns, lanes.solve(base, keys, values, columns)


MODEL = {"gap.height": ("length", 0.3e-3, 1.5e-3), "fluid.viscosity": ("viscosity", 0.5e-3, 5e-3),
         "wall.upper.speed.over": ("time", 1e-3, 30e-3)}  # fmt: skip

CASES = {
    "plates, ramp": (ramped(), MODEL),
    "plates, sudden start": (
        ramped(wall={"lower": {"speed": "0.1 m/s"}}),
        {"gap.height": ("length", 0.3e-3, 1e-3), "wall.lower.speed": ("speed", 0.02, 0.2)},
    ),
    "plates, pressure beside a free surface": (
        ramped(wall={"upper": {"shear_free": True}}, pressure={"drop": {"kind": "lag", "to": "20 Pa",
                                                                        "time_constant": "60 ms"}}),
        {"gap.height": ("length", 0.5e-3, 1e-3), "pressure.drop.time_constant": ("time", 0.01, 0.3)},
    ),
    "plates, wall that slips, from steady flow": (
        ramped(start={"state": "steady"}, wall={
            "upper": {"slip_length": "50 um", "speed": {"kind": "smooth_ramp", "from": "0.05 m/s", "to": "0.1 m/s",
                                                        "over": "0.1 s"}}}),
        {"wall.upper.speed.over": ("time", 0.02, 0.3), "fluid.density": ("density", 800.0, 1200.0)},
    ),
    "pipe, pressure ramp": (
        Case({"gap": {"shape": "pipe", "diameter": "8 mm", "length": "4 m"},
              "fluid": {"density": "870 kg/m^3", "viscosity": "0.1 Pa*s"},
              "pressure": {"drop_per_length": {"kind": "ramp", "to": "2 kPa/m", "over": "0.05 s"}}}),
        {"gap.diameter": ("length", 4e-3, 12e-3), "pressure.drop_per_length.to": ("pressure_gradient", 500, 3000)},
    ),
    "annulus, rod drawn back": (
        Case({"gap": {"shape": "annulus", "motion": "axial", "inner_diameter": "16 mm", "radial_clearance": "1 mm",
                      "length": "350 mm"},
              "fluid": {"density": "1060 kg/m^3", "viscosity": "3.2 mPa*s"},
              "wall": {"inner": {"speed": {"kind": "trapezoid", "to": "-0.1 m/s", "rise": "80 ms", "hold": "300 ms",
                                           "fall": "80 ms"}}},
              "pressure": {"drop": "10 Pa"}}),
        {"gap.radial_clearance": ("length", 0.6e-3, 2e-3), "wall.inner.speed.rise": ("time", 0.03, 0.3)},
    ),
    "annulus, sleeve spun up": (
        Case({"gap": {"shape": "annulus", "motion": "rotating", "inner_diameter": "40 mm", "radial_clearance": "2 mm",
                      "length": "50 mm"},
              "fluid": {"density": "998 kg/m^3", "viscosity": "1.002 mPa*s"},
              "wall": {"outer": {"speed": {"kind": "s_curve", "to": "6 rad/s", "acceleration": "20 rad/s^2",
                                           "jerk": "200 rad/s^3"}}}}),
        {"fluid.viscosity": ("viscosity", 1e-3, 10e-3), "wall.outer.speed.to": ("angular_speed", 1.0, 8.0)},
    ),
    "pipe, prescribed flow": (
        Case({"gap": {"shape": "pipe", "diameter": "8 mm", "length": "4 m"},
              "fluid": {"density": "870 kg/m^3", "viscosity": "0.1 Pa*s"},
              "pressure": {"flow_rate": {"kind": "ramp", "to": "1e-5 m^3/s", "over": "50 ms"}}}),
        {"gap.diameter": ("length", 4e-3, 12e-3), "pressure.flow_rate.over": ("time", 5e-3, 0.5)},
    ),
    "plates, sealed": (
        ramped(pressure={"sealed": True}),
        {"gap.height": ("length", 0.4e-3, 1.5e-3), "wall.upper.speed.over": ("time", 5e-3, 0.3)},
    ),
    "plates, carriage pushed": (
        ramped(wall={"upper": {"body": {"mass": "20 g", "damping": "0.002 N*s/m",
                                        "force": {"kind": "ramp", "to": "0.5 mN", "over": "50 ms"}}}}),
        {"gap.height": ("length", 0.4e-3, 1e-3), "wall.upper.body.mass": ("mass", 2e-3, 0.05),
         "wall.upper.body.force.to": ("force", 1e-4, 1e-3)},
    ),
    "annulus, rotor run up": (
        Case({"gap": {"shape": "annulus", "motion": "rotating", "inner_diameter": "40 mm", "radial_clearance": "2 mm",
                      "length": "50 mm"},
              "fluid": {"density": "998 kg/m^3", "viscosity": "10 mPa*s"},
              "wall": {"inner": {"body": {"inertia": "2e-5 kg*m^2", "torque": "0.1 mN*m"}}}}),
        {"fluid.viscosity": ("viscosity", 5e-3, 30e-3), "gap.radial_clearance": ("length", 1.5e-3, 3e-3)},
    ),
}  # fmt: skip


@pytest.mark.parametrize("name", CASES)
def test_a_row_equals_the_single_solve(name):
    """Both within their stated errors; times of peaks within what the plateau rule leaves open (see below)."""
    base, spec = CASES[name]
    keys, values, columns, out = solved(base, spec, 2)
    for row in range(2):
        assert out["status"][row] == SOLVED
        alone = blank(columns, 1)
        put_summary(alone, 0, columns, run(base.replace(changes(keys, values, row))).summary)
        assert out["verdict"][row] == alone["verdict"][0]
        assert out["message"][row].split(":")[0] == alone["message"][0].split(":")[0]
        compared(base, columns, out, row, alone)


def compared(base, columns, out, row, alone):
    accuracy = base.run.accuracy
    walls = [wall.name for wall in base.problem().walls if wall.kind != "axis"]
    largest = max(abs(np.nan_to_num(alone[f"{kind}_stress_{wall}"][0])) for wall in walls for kind in ("peak", "final"))
    for column in columns:
        one, other = out[column.name][row], alone[column.name][0]
        # a peak's time is the first at which it is within the peak's error, and these errors differ
        if "error" in column.name or column.name.startswith("peak_time"):
            continue
        assert np.isnan(one) == np.isnan(other), column.name
        near = 2.0 * accuracy * abs(other) + (1e-6 * largest if "stress" in column.name else 1e-9)
        assert np.isnan(one) or abs(one - other) <= near, (column.name, one, other)


def plates_exact(over, within):
    """(peak stress over mu U/h, settling time) of plates, upper wall ramped over ``over`` diffusion times.

    Sine series of plane start-up flow added up over the ramp (Carslaw & Jaeger 1959, chapter 3, from memory).
    """
    k = np.arange(1, 4000)
    decay = (k * np.pi) ** 2
    flux = 1.0 + 2.0 * np.sum(-np.expm1(-decay * over) / decay) / over + 2.0 / np.pi**2 / 3999.5 / over
    y = np.linspace(0.0, 1.0, 2001)[:, None]
    few = k[:40]
    shape = 2.0 * (-1.0) ** few / (few * np.pi) * np.sin(few * np.pi * y)

    def away(t):
        slow = decay[:40]
        return np.abs(shape @ (np.exp(-slow * (t - over)) * -np.expm1(-slow * over) / (slow * over))).max()

    low, high = over + 0.05, 3.0
    for _ in range(60):
        middle = 0.5 * (low + high)
        low, high = (middle, high) if away(middle) > within else (low, middle)
    return flux, high


def test_stated_errors_hold_against_the_exact_series():
    rows = 60
    _keys, values, _columns, out = solved(ramped(), MODEL, rows)
    assert (out["status"] == SOLVED).all()
    for row in range(rows):
        height, viscosity = values["gap.height"][row], values["fluid.viscosity"][row]
        time = height**2 * 1000.0 / viscosity
        flux, settled = plates_exact(values["wall.upper.speed.over"][row] / time, 0.01)
        peak = -viscosity * 0.1 / height * flux
        off = abs(out["peak_stress_upper"][row] - peak)
        assert off <= out["peak_stress_error_upper"][row] <= 1e-3 * abs(peak)
        off = abs(out["settling_time"][row] - settled * time)
        assert off <= out["settling_error"][row] <= 1e-3 * settled * time


def test_a_tighter_accuracy_is_met_too():
    base = ramped(run={"accuracy": "0.01 %"})
    _keys, values, _columns, out = solved(base, MODEL, 12)
    assert (out["status"] == SOLVED).all()
    for row in range(12):
        height, viscosity = values["gap.height"][row], values["fluid.viscosity"][row]
        time = height**2 * 1000.0 / viscosity
        flux, settled = plates_exact(values["wall.upper.speed.over"][row] / time, 0.01)
        assert out["peak_stress_upper"][row] == pytest.approx(-viscosity * 0.1 / height * flux, rel=1e-4)
        assert out["settling_time"][row] == pytest.approx(settled * time, rel=1e-4)


@pytest.mark.parametrize("name", ["plates, ramp", "annulus, rod drawn back"])
def test_a_row_does_not_depend_on_its_neighbours(name):
    """Bit for bit: in another order, in a smaller company, and alone."""
    rows = 40
    base, spec = CASES[name]
    keys, values, columns, out = solved(base, spec, rows)
    order = np.random.default_rng(3).permutation(rows)
    for chosen in (order, order[:11], order[:1]):
        part = lanes.solve(base, keys, {name: array[chosen] for name, array in values.items()}, columns)
        for name, column in out.items():
            np.testing.assert_array_equal(part[name], column[chosen], err_msg=name)


@pytest.mark.parametrize("motion", ["axial", "rotating"])
@pytest.mark.parametrize("wall", [{}, {"inner": {"slip_length": "50 um"}}, {"outer": {"shear_free": True}}])
def test_grids_of_many_annuli_are_those_of_one(motion, wall):
    base = Case({"gap": {"shape": "annulus", "motion": motion, "inner_diameter": "16 mm", "radial_clearance": "1 mm"},
                 "fluid": {"density": "1000 kg/m^3", "viscosity": "1 mPa*s"}, "wall": wall,
                 "run": {"duration": "1 s"}})  # fmt: skip
    unit = unit_problem(base.problem())
    inner = np.array([0.02, 1.0, 8.0, 500.0])
    tables, ends = round_tables(unit, inner, 24, (0.01, 0.05))
    for i, radius in enumerate(inner):
        table, end = grid_table(replace(unit, inner=radius, outer=radius + 1.0), 24, (0.01, 0.05))
        size = np.abs(table).max(axis=(1, 2), keepdims=True)
        np.testing.assert_allclose(tables[i] / (size + 1e-300), table / (size + 1e-300), atol=1e-12)
        np.testing.assert_allclose(ends[i], end, rtol=1e-12)


def test_a_planted_error_is_seen(monkeypatch):
    """Grids of which the finest conducts 2 % too well: the levels no longer agree, and no row is vouched for."""
    true = lanes_batch.tables

    def wrong(*arguments):
        levels = [(table.copy(), ends.copy()) for table, ends in true(*arguments)]
        levels[-1][0][1] *= 1.02
        return levels

    monkeypatch.setattr(lanes_batch, "tables", wrong)
    _keys, _values, _columns, out = solved(ramped(), MODEL, 5)
    assert (out["status"] == OPEN).all()
    assert np.isnan(out["settling_time"]).all()


def test_rows_that_are_no_case_are_left_open():
    keys = [*keys_of(MODEL)]
    values = {"gap.height": np.array([1e-3, -1e-3, np.nan, 1e-3, 1e-3]),
              "fluid.viscosity": np.array([1e-3, 1e-3, 1e-3, 0.0, 1e-3]),
              "wall.upper.speed.over": np.array([1e-2, 1e-2, 1e-2, 1e-2, -1.0])}  # fmt: skip
    out = lanes.solve(ramped(), keys, values, layout(ramped().problem()))
    assert list(out["status"]) == [SOLVED, OPEN, OPEN, OPEN, OPEN]


@pytest.mark.parametrize(
    "more",
    [
        {"wall": {"upper": {"body": {"mass": "1 kg", "force": "1 N", "stiffness": "3 N/m"}}}},
        {"wall": {"upper": {"body": {"mass": "1 kg", "force": "1 N", "dry_friction": "0.1 N"}}}},
        {"wall": {"upper": {"body": {"mass": "1 kg", "force": "1 N"}}, "lower": {"shear_free": True}}},
        {"pressure": {"mean_velocity": "0.1 m/s"}, "wall": {}, "start": {"state": "steady"}},
        {"wall": {"upper": {"speed": {"kind": "sine", "amplitude": "1 m/s", "frequency": "5 Hz"}}}},
    ],
)
def test_what_the_lanes_cannot_march_is_left_to_others(more):
    assert not lanes.takes(ramped(**more), [Varied("gap.height", "quantity", "length", "m")])


def test_keys_that_the_lanes_do_not_know_are_left_to_others():
    for key in (Varied("run.accuracy", "quantity", "fraction"), Varied("wall.upper.speed.kind", "choice"),
                Varied("wall.upper.slip_length", "quantity", "length", "m")):  # fmt: skip
        assert not lanes.takes(ramped(), [key])

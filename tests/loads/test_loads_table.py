"""Load tables: peak kept, impulse stated, the law of an infinite stress; against closed integrals."""

from __future__ import annotations

import numpy as np
import pytest
from pulses import forced, measured
from scipy.integrate import quad

from transient.loads.history import Infinite, LoadHistory
from transient.loads.load import load_of
from transient.loads.table import table_of
from transient.result.result import ResultError

HALF_WAVE = np.linspace(0.0, 1.0, 20001)


def table(result, step):
    return table_of(load_of(result, "upper"), step)


def unbounded(rows=4000, until=2.0, before=None, law=0.5):
    """K/sqrt(t - t0) with K = -3, from t0 on; with ``before`` s of nothing ahead of it."""
    since = np.geomspace(1e-9, until, rows)
    force = np.concatenate([[np.nan], -3.0 / since**law])
    lead = [] if before is None else [0.0, np.nextafter(before, 0.0)]
    time = np.concatenate([[0.0], since]) + (before or 0.0)
    return forced(np.concatenate([lead, time]), np.concatenate([0.0 * np.array(lead), force]))


@pytest.mark.parametrize("step", [1e-3, 7e-3, 0.3, 0.9, 5.0])
def test_the_peak_is_a_row_whatever_the_step(step):
    time, force = np.array([0.0, 0.1234567, 0.5, 1.0]), np.array([0.0, -8.25, 3.0, 0.0])
    found = table(forced(time, force), step)
    row = int(np.argmax(np.abs(found.value)))
    assert (found.time[row], found.value[row]) == (0.1234567, -8.25)
    assert found.time[0] == found.shift
    assert 0.0 <= found.shift < step
    assert found.time[-1] <= 1.0 < found.time[-1] + step
    np.testing.assert_allclose(np.diff(found.time), step, rtol=1e-9)
    np.testing.assert_allclose(found.value, np.interp(found.time, time, force), rtol=1e-12, atol=1e-15)


def test_a_grid_from_the_start_would_lose_the_peak():
    """The planted error: the same step from t = 0 on clips this peak by more than a tenth."""
    time, force = np.array([0.0, 0.0149, 0.03]), np.array([0.0, 1.0, 0.0])
    plain = np.interp(np.arange(0.0, 0.03, 0.01), time, force)
    assert plain.max() < 0.9
    assert table(forced(time, force), 0.01).value.max() == 1.0


def test_impulse_of_a_half_sine():
    # Integral of A sin(pi t / T) over one half wave: 2 A T / pi.
    load = load_of(forced(HALF_WAVE, 5.0 * np.sin(np.pi * HALF_WAVE)), "upper")
    found = table_of(load, 0.01)
    assert load.history.impulse == pytest.approx(10.0 / np.pi, rel=1e-8)
    assert found.impulse == np.trapezoid(found.value, found.time)
    assert found.impulse_error == found.impulse - load.history.impulse
    # Error of the trapezoidal rule on a half wave: -(step pi / T)^2 / 12 of it, by Euler and Maclaurin.
    assert found.impulse_error / load.history.impulse == pytest.approx(-((0.01 * np.pi) ** 2) / 12.0, rel=1e-3)


def test_impulse_lost_at_the_ends_is_told_apart():
    found = table(forced([0.0, 1.0, 2.05], [2.0, -2.0, 1.95]), 0.5)
    assert found.time.tolist() == [0.0, 0.5, 1.0, 1.5, 2.0]
    # Peak at the first of equal magnitudes; the straight lines are hit exactly but for the last 0.05 s.
    slope = 3.95 / 1.05
    assert found.outside == pytest.approx(0.05 * (1.95 - 0.025 * slope), rel=1e-9)
    assert found.departure == pytest.approx(0.0, abs=1e-12)
    assert found.impulse_error == pytest.approx(-found.outside, rel=1e-9)


def test_a_step_coarser_than_the_history_states_what_is_lost():
    time = np.linspace(0.0, 1.0, 101)
    found = table(forced(time, np.sin(20.0 * np.pi * time)), 0.2)
    assert found.departure > 0.9
    assert len(table(forced(time, np.sin(np.pi * time)), 7.0).time) == 1


def test_no_table_beyond_what_can_be_written():
    with pytest.raises(ResultError, match="rows of this run"):
        table(forced([0.0, 1.0], [0.0, 1.0]), 1e-12)


@pytest.mark.parametrize("before", [None, 0.5])
def test_impulse_across_an_infinite_stress(before):
    # Integral of K / sqrt(t) from 0 to T: 2 K sqrt(T).
    load = load_of(unbounded(before=before), "upper")
    assert (load.peak, load.peak_time) == (None, before or 0.0)
    # Chords of 1/sqrt(t) lie above it; at rows 0.54 % apart by 1e-6 of the integral.
    assert load.history.impulse == pytest.approx(-6.0 * np.sqrt(2.0), rel=1e-5)


@pytest.mark.parametrize("before", [None, 0.5])
@pytest.mark.parametrize("step", [1e-4, 1e-2, 0.1])
def test_the_row_of_an_infinite_stress_keeps_the_impulse(before, step):
    load = load_of(unbounded(before=before), "upper")
    found = table_of(load, step)
    (row,) = found.averaged
    assert found.time[row] == load.peak_time
    assert np.isfinite(found.value).all()
    # 2 K sqrt(step) over the next cell (and nothing over the one before) by straight lines through -K/sqrt(step):
    # 3 K / sqrt(step) at the start of the run, half of it inside.
    expected = -3.0 / np.sqrt(step) * (3.0 if before is None else 1.5)
    assert found.value[row] == pytest.approx(expected, rel=1e-4)
    near = slice(max(row - 1, 0), row + 2)
    kept = load.history.integral(found.time[near][[0, -1]])
    assert np.trapezoid(found.value[near], found.time[near]) == pytest.approx(kept[1] - kept[0], rel=1e-9)


def test_infinite_instants_off_the_grid_keep_their_impulse_too():
    first, second = unbounded(until=0.30037), unbounded(until=1.0)
    time = np.concatenate([first.time, second.time[0:] + np.nextafter(0.30037, 1.0)])
    force = np.concatenate([first.wall_force[:, 1], 2.0 * second.wall_force[:, 1]])
    load = load_of(forced(time, force), "upper")
    assert load.peak_time == pytest.approx(0.30037)
    found = table_of(load, 0.01)
    assert len(found.averaged) == 2
    assert found.impulse_error + found.outside == pytest.approx(0.0, abs=0.02 * abs(load.history.impulse))


def test_the_law_in_the_summary_serves_where_it_agrees():
    result = unbounded(rows=400)
    result.variables["wall_stress"] = result.variables["wall_force"]
    numbers = {"unbounded": True, "unbounded_coefficient": 3.0, "unbounded_exponent": 0.5, "peak_time": 0.0}
    for law, kept in ((3.0, 3.0), (30.0, 3.0)):
        result.summary["walls"] = {"upper": {**numbers, "unbounded_coefficient": law}}
        (instant,) = load_of(result, "upper").history.infinite
        assert instant.coefficient == pytest.approx(-kept, rel=1e-6)


def test_another_exponent_of_the_law():
    # Integral of K / t^p: K T^(1-p) / (1-p); a power law of exponent 0.5 has p = 1/3.
    result = unbounded(law=1.0 / 3.0)
    result.variables["wall_stress"] = result.variables["wall_force"]
    result.summary["walls"] = {"upper": {"unbounded_coefficient": 3.0, "unbounded_exponent": 1.0 / 3.0}}
    load = load_of(result, "upper")
    assert load.history.impulse == pytest.approx(-3.0 * 2.0 ** (2.0 / 3.0) * 1.5, rel=1e-5)


def test_peaks_between_stored_rows_come_from_the_summary():
    time = np.linspace(0.0, 1.0, 41)
    result = forced(time, 4.0 * np.sin(3.0 * time))
    result.variables["wall_stress"] = forced(time, 2.0 * np.sin(3.0 * time)).variables["wall_force"]
    right = {"peak_stress": 2.0, "peak_time": np.pi / 6, "largest_stress": 2.0, "largest_time": np.pi / 6}
    result.summary["walls"] = {"upper": right}
    load = load_of(result, "upper")
    assert (load.peak, load.peak_time) == (4.0, np.pi / 6)
    assert 4.0 in table_of(load, 0.1).value
    # A summary that does not belong to the rows is not believed.
    result.summary["walls"] = {"upper": {**right, "peak_stress": 2.2, "largest_stress": 2.2}}
    load = load_of(result, "upper")
    assert (load.peak, load.peak_time) == (np.abs(result.wall_force).max(), time[21])


@pytest.mark.parametrize(
    ("variable", "unit", "quantity"),
    [("wall_force", "N", "force"), ("wall_torque", "N*m", "torque"), ("wall_stress", "Pa", "stress")],
)
def test_force_torque_or_stress(capsys, tmp_path, variable, unit, quantity):
    said = measured(capsys, tmp_path, forced([0.0, 1.0], [0.0, 2.0], variable=variable, unit=unit))
    assert (said["quantity"], said["unit"], said["peak"], said["peak_time"]) == (quantity, unit, 2.0, 1.0)
    assert said["impulse"] == 1.0


def test_the_law_and_what_it_leaves_integrate_together():
    # Against adaptive quadrature of the values themselves.
    instant = Infinite(1, 0.5, -3.0, 1.0 / 3.0, 0.7)
    history = LoadHistory(np.array([0.0, 0.5, 2.5]), np.array([1.0, 1.0, -1.6811]), (instant,))
    for until in (0.9, 2.2):
        area = 0.5 + quad(lambda t: float(history.at(np.array([t]))[0]), 0.5, until, epsabs=1e-12)[0]
        assert history.integral(np.array([until]))[0] == pytest.approx(area, rel=1e-7)

"""Dynamic load factors through the whole path: a force history in a result file into the spectrum.

Undamped factors of pulses: Biggs, Introduction to Structural Dynamics (1964), ch. 2; Chopra, Dynamics of Structures,
ch. 4 (formulas from memory; digits evaluated from them).  Ramp-invariant filter: Smallwood, Shock and Vibration
Bulletin 51 (1981) (coefficients from memory).  Any piecewise linear load: the matrix exponential of scipy.linalg,
densely sampled.
"""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from pulses import forced, measured
from scipy.linalg import expm

from transient.loads.load import load_of
from transient.loads.oscillator import _long, _series, largest_deflections
from transient.loads.spectrum import frequencies, spectrum_of

JUST_BEFORE = np.nextafter(1.0, 0.0)
HALF_WAVE = np.linspace(0.0, 1.0, 20001)
# Pulses of length 1 s (the ramp-step rises for 1 s): (times, forces).
PULSES = {
    "rectangular": ([0.0, JUST_BEFORE, 1.0, 1.5], [1.0, 1.0, 0.0, 0.0]),
    "triangle, sudden peak": ([0.0, 1.0, 1.5], [1.0, 0.0, 0.0]),
    "isosceles": ([0.0, 0.5, 1.0], [0.0, 1.0, 0.0]),
    "half-sine": (HALF_WAVE, np.sin(np.pi * HALF_WAVE)),
    "ramp-step": ([0.0, 1.0], [0.0, 1.0]),
}
# Pulse length over natural period -> factors in the order of PULSES.
PUBLISHED = {
    0.2: (1.1756, 0.6012, 0.6079, 0.7705, 1.9355),
    0.5: (2.0, 1.1962, 1.2732, 1.5708, 1.6366),
    1.0: (2.0, 1.5502, 1.5085, 1.7321, 1.0000),
    1.5: (2.0, 1.6891, 1.2879, 1.5000, 1.2122),
    2.0: (2.0, 1.7626, 1.0000, 1.2681, 1.0000),
}


def at(result, frequency, damping=0.0):
    """Factors of the upper wall's load at the frequencies given."""
    return spectrum_of(load_of(result, "upper"), np.atleast_1d(np.asarray(frequency, float)), damping).factor


@pytest.mark.parametrize("length", PUBLISHED)
def test_factors_of_pulses_from_the_handbooks(capsys, tmp_path, length):
    for (time, force), expected in zip(PULSES.values(), PUBLISHED[length], strict=True):
        said = measured(capsys, tmp_path, forced(time, 250.0 * np.array(force)), "--spectrum", f"{length} Hz", "9 Hz")
        assert said["spectrum"]["frequency"][0] == length
        assert said["spectrum"]["factor"][0] == pytest.approx(expected, abs=6e-5)


def test_the_closed_formulas_at_any_frequency():
    length = np.geomspace(0.05, 20.0, 97)
    rectangular = np.where(length < 0.5, 2.0 * np.sin(np.pi * np.minimum(length, 0.5)), 2.0)
    np.testing.assert_allclose(at(forced(*PULSES["rectangular"]), length), rectangular, rtol=1e-10)
    ramp = 1.0 + np.abs(np.sin(np.pi * length)) / (np.pi * length)
    np.testing.assert_allclose(at(forced(*PULSES["ramp-step"]), length), ramp, rtol=1e-10)


@pytest.mark.parametrize(("name", "peak", "where"), [("half-sine", 1.7685, 0.81), ("isosceles", 1.517, 0.905)])
def test_the_largest_factor_of_rounded_pulses(name, peak, where):
    # Texts give 1.77 at 0.81 for the half-sine; digits evaluated from the formulas.
    length = np.linspace(0.7, 1.1, 401)
    factor = at(forced(*PULSES[name]), length)
    assert factor.max() == pytest.approx(peak, abs=6e-4)
    assert length[np.argmax(factor)] == pytest.approx(where, abs=0.006)


@pytest.mark.parametrize("damping", [0.0, 0.02, 0.4])
def test_a_sudden_load_on_a_machine_at_rest(damping):
    # Overshoot 1 + exp(-pi z / sqrt(1 - z^2)): textbook step response of a damped oscillator (from memory).
    expected = 1.0 + np.exp(-np.pi * damping / np.sqrt(1.0 - damping**2))
    result = forced([0.0, 0.01, 3.0], [-7.0, -7.0, -7.0])
    np.testing.assert_allclose(at(result, [0.01, 1.0, 55.0, 3e4], damping), expected, rtol=1e-10)


def test_a_load_that_never_changes_has_the_factor_one():
    steady = forced([0.0, 1.0, 2.0], [3.0, 3.0, 3.0], start="steady")
    np.testing.assert_allclose(at(steady, [0.1, 1.0, 40.0], 0.02), 1.0, rtol=1e-12)


def test_the_spectrum_has_no_factor_where_the_load_is_infinite(capsys, tmp_path):
    time = np.concatenate([[0.0], np.geomspace(1e-6, 1.0, 50)])
    force = np.concatenate([[np.nan], 1.0 / np.sqrt(time[1:])])
    said = measured(capsys, tmp_path, forced(time, force), "--spectrum", "5 Hz", "50 Hz", "--cycles")
    assert said["peak"] is None
    assert said["unbounded"]
    assert set(said["spectrum"]["factor"]) == {None}
    assert said["cycles"] is None


@pytest.mark.parametrize("damping", [0.0, 1e-4, 3e-3, 0.1])
def test_a_step_of_many_swings_is_cut_short_without_loss(damping):
    """A load that climbs, holds and falls slowly under a lively oscillator, against every swing of it."""
    time, force = np.array([0.0, 0.3, 40.0, 41.0, 90.0]), np.array([-1.0, 2.0, 3.0, -1.5, -3.2])
    largest = np.empty(1)
    largest_deflections(time, force, 1.0, np.array([2.0 * np.pi * 3.1]), damping, largest)
    assert largest[0] == pytest.approx(_simulated(time, force, 1.0, 2.0 * np.pi * 3.1, damping), rel=1e-5)


def test_sign_size_and_time_scale_do_not_matter():
    rng = np.random.default_rng(5)
    time, force = np.sort(rng.uniform(0.0, 1.0, 40)), rng.normal(size=40)
    frequency = np.geomspace(0.3, 300.0, 20)
    plain = at(forced(time, force), frequency, 0.03)
    np.testing.assert_allclose(at(forced(time, -4e5 * force), frequency, 0.03), plain, rtol=1e-12)
    np.testing.assert_allclose(at(forced(1e-3 * time, force), 1e3 * frequency, 0.03), plain, rtol=1e-9)


@pytest.mark.parametrize("damping", [0.0, 0.01, 0.2, 0.7, 0.95])
@pytest.mark.parametrize("seed", range(12))
def test_any_history_against_an_independent_simulation(seed, damping):
    rng = np.random.default_rng(seed)
    count = int(rng.integers(3, 9))
    step = 10.0 ** rng.uniform(-3.0, 0.5, count - 1)
    time = np.concatenate([[0.0], np.cumsum(step)])
    force = rng.normal(size=count)
    force[rng.integers(1, count)] = force[rng.integers(0, count - 1)]
    omega = 2.0 * np.pi * np.array([0.2, 1.0, 5.0])
    largest = np.empty(3)
    before = rng.normal()
    largest_deflections(time, force, before, omega, damping, largest)
    expected = [_simulated(time, force, before, w, damping) for w in omega]
    np.testing.assert_allclose(largest, expected, rtol=2e-5)


def _simulated(time, force, before, omega, damping):
    """Largest deflection by dense sampling, which misses (pi / 1500)^2 / 2 = 2e-6 of a swing at most.

    The free vibration is a long hold of the last load.
    """
    swing = 2.0 * np.pi / omega / np.sqrt(1.0 - damping**2)
    time, force = np.append(time, time[-1] + 2.5 * swing), np.append(force, force[-1])
    state, largest = np.array([before, 0.0]), max(abs(before), abs(force[-1]))
    for length, first, last in zip(np.diff(time), force[:-1], force[1:], strict=True):
        parts = 2 ** int(np.ceil(np.log2(1500.0 * omega * length / 2.0 / np.pi + 4.0)))
        rows = _sampled(state, first, (last - first) / length, length, parts, omega, damping)
        state, largest = rows[:2, -1], max(largest, np.abs(rows[0]).max())
    return largest


def _sampled(state, load, slope, length, parts, omega, damping):
    """(4, parts + 1) deflection, speed, load and slope of load, by the matrix exponential of one part."""
    rate = np.array(
        [[0, 1, 0, 0], [-(omega**2), -2 * damping * omega, omega**2, 0], [0, 0, 0, 1], [0, 0, 0, 0]], float
    )
    move = expm(rate * length / parts)
    rows = np.array([[*state, load, slope]]).T
    while rows.shape[1] <= parts:
        rows = np.concatenate([rows, move @ rows], axis=1)
        move = move @ move
    return rows[:, : parts + 1]


@pytest.mark.parametrize("damping", [0.0, 0.05])
@pytest.mark.parametrize("phase", [0.05, 0.7, 3.0])
def test_each_step_is_that_of_the_ramp_invariant_filter(damping, phase):
    """Absolute acceleration of a base-shaken oscillator: y = u + 2 z u' of ours, in units of the phase."""
    d = np.sqrt(1.0 - damping**2)
    e = np.exp(-damping * phase)
    c, s = e * np.cos(phase * d), e * np.sin(phase * d)
    slope = s / (phase * d)
    b = (1.0 - slope, 2.0 * (slope - c), e * e - slope)
    rows = 300
    load = np.minimum(np.arange(rows), 130) * 0.01
    y = np.zeros(rows)
    for n in range(1, rows):
        x1, y1, x2, y2 = load[n - 1], y[n - 1], load[n - 2] if n > 1 else 0.0, y[n - 2] if n > 1 else 0.0
        y[n] = b[0] * load[n] + b[1] * x1 + b[2] * x2 + 2.0 * c * y1 - e * e * y2
    np.testing.assert_allclose(_stepped(load, phase, damping, d), y, rtol=1e-9, atol=1e-12)
    if phase < 0.1:
        short = _stepped(load, phase, damping, None)
        np.testing.assert_allclose(short, y, rtol=1e-9, atol=1e-12)
    # A planted error: a filter whose input is held over each step instead of joined by straight lines.
    assert np.abs(_stepped(np.roll(load, 1), phase, damping, d) - y).max() > 1e-3


def _stepped(load, phase, damping, d):
    u, w, out = 0.0, 0.0, [0.0]
    for p, q in pairwise(load):
        if d is None:
            u, w = _series(u, w, p, q - p, phase, damping)
        else:
            u, w, _ = _long(u, w, p, q - p, phase, damping, d, np.inf)
        out.append(u + 2.0 * damping * w)
    return np.array(out)


def test_rows_in_between_change_nothing():
    """No aliasing: the same straight lines with few and with many rows; sampled maxima would differ."""
    time, force = np.array([0.0, 0.5, 1.0, 1.7]), np.array([0.0, 1.0, 0.0, 0.2])
    dense = np.unique(np.concatenate([time, np.linspace(0.0, 1.7, 4001)]))
    frequency = np.geomspace(0.5, 500.0, 40)
    few, many = (at(forced(t, np.interp(t, time, force)), frequency, 0.02) for t in (time, dense))
    np.testing.assert_allclose(few, many, rtol=1e-8)


def test_a_wrong_load_before_the_start_would_be_noticed():
    """The planted error: taking the first row for the load before t = 0 turns the sudden load's 2 into 1."""
    sudden = [0.0, 1.0], [1.0, 1.0]
    assert at(forced(*sudden), 3.0)[0] == pytest.approx(2.0, rel=1e-12)
    assert at(forced(*sudden, start="steady"), 3.0)[0] == pytest.approx(1.0, rel=1e-12)


def test_frequencies_lie_evenly_and_hold_both_ends():
    found = frequencies(5.0, 2000.0)
    assert (found[0], found[-1]) == (5.0, 2000.0)
    ratio = found[1:] / found[:-1]
    np.testing.assert_allclose(ratio, ratio[0], rtol=1e-12)
    assert ratio[0] < 1.08
    assert frequencies(7.0, 7.0).tolist() == [7.0]


def test_two_threads_give_the_numbers_of_one(monkeypatch):
    import transient.loads.spectrum as room

    result = forced(*PULSES["half-sine"])
    frequency = frequencies(1.0, 80.0)
    alone = at(result, frequency, 0.02)
    monkeypatch.setattr(room, "_WORTH_A_THREAD", 0)
    np.testing.assert_array_equal(at(result, frequency, 0.02), alone)

"""Steady formulas against published tables, textbook forms and quadrature; and whether they are enough."""

from __future__ import annotations

import math

import closed_histories as closed
import mpmath
import numpy as np
import pytest
from closed_histories import problem
from scipy.integrate import quad

from transient.trust import quasi_steady as qs
from transient.trust.hand_formula import compare

MU = closed.VISCOSITY
STILL = np.zeros((1, 2))

# White, Fluid Mechanics, Table 6.3: Darcy f x Re on the hydraulic diameter, by radius ratio.
WHITE = [
    (0.0, 64.0), (1e-5, 70.09), (1e-4, 71.78), (1e-3, 74.68), (0.01, 80.11), (0.05, 86.27),
    (0.1, 89.37), (0.2, 92.35), (0.4, 94.71), (0.6, 95.59), (0.8, 95.92), (1.0, 96.0),
]  # fmt: skip


def annulus(ratio, **more):
    return problem(1, ratio, 1.0, names=("inner", "outer"), **more)


def pipe(**more):
    return problem(1, 0.0, 1.0, kinds=("axis", "moving"), names=("axis", "bore"), **more)


def channel(**more):
    return problem(0, 0.0, 1.0, **more)


@pytest.mark.parametrize(("ratio", "expected"), WHITE)
def test_friction_of_annuli(ratio, expected):
    case = {0.0: pipe(), 1.0: channel()}.get(ratio) or annulus(ratio)
    diameter = 2.0 * (1.0 - ratio) if 0.0 < ratio < 1.0 else 2.0
    mean = qs.quasi_steady_mean(case, STILL, [1.0])[0]
    # f = 2 G D_h/(rho V^2), Re = rho V D_h/mu
    assert 2.0 * diameter**2 / (MU * mean) == pytest.approx(expected, abs=0.00501)


@pytest.mark.parametrize("p", [-4.0, -3.0, -1.5, -1.0, -0.5, 0.0, 1.0, 2.0])
def test_couette_poiseuille(p):
    # P = h^2 G/(2 mu U): stresses (mu U/h)(1 + P), -(mu U/h)(1 - P), flow/(U h) = 1/2 + P/6 (exact algebra).
    case, gradient = channel(), 2.0 * MU * p
    stress = qs.quasi_steady_stress(case, [[0.0, 1.0]], [gradient])[0]
    assert stress == pytest.approx([MU * (1 + p), -MU * (1 - p)], abs=1e-15)
    assert qs.quasi_steady_mean(case, [[0.0, 1.0]], [gradient])[0] == pytest.approx(0.5 + p / 6, abs=1e-14)
    profile = qs.steady_profile(case, np.array([0.0, 1.0]), gradient, np.linspace(0, 1, 2001)[1:-1])
    assert (profile.min() < 0.0) == (p < -1.0)  # backflow sets in at P = -1


def test_annulus_of_ratio_one_half():
    # From the textbook form r_max/R2 = sqrt((1-k^2)/(2 ln 1/k)) and its flow, digits evaluated for ratio 0.5.
    case = annulus(0.5)
    mean = qs.quasi_steady_mean(case, STILL, [1.0])[0]
    flow = mean * math.pi * 0.75
    assert flow / (math.pi / (8 * MU)) == pytest.approx(1 - 0.5**4 - 0.75**2 / math.log(2), rel=1e-13)
    assert flow / (math.pi / (8 * MU)) == pytest.approx(0.12598404, abs=5e-9)
    r = 0.73553426 + np.array([-1e-4, 0.0, 1e-4])
    u = qs.steady_profile(case, np.zeros(2), 1.0, r)
    assert u[1] > u[0]
    assert u[1] > u[2]
    assert u[0] == pytest.approx(u[2], rel=1e-10)


@pytest.mark.parametrize("ratio", [0.01, 0.5, 0.95, 0.9999])
def test_torque_between_cylinders(ratio):
    # torque/length = 4 pi mu R1^2 R2^2 dOmega/(R2^2 - R1^2): textbook form, from memory.
    case = problem(3, ratio, 1.0)
    stress = qs.quasi_steady_stress(case, [[2.0, 5.0]], [0.0])[0]
    with mpmath.workdps(40):
        r1, r2 = mpmath.mpf(ratio), mpmath.mpf(1)
        torque = float(4 * mpmath.pi * MU * r1**2 * r2**2 * 3 / (r2**2 - r1**2))
        # and v = A r + B/r averaged over the radius
        b = (2 - 5) / (1 / r1**2 - 1 / r2**2)
        a = 5 - b / r2**2
        mean = float((a * (r2**2 - r1**2) / 2 + b * mpmath.log(r2 / r1)) / (r2 - r1))
    assert stress[0] * 2 * math.pi * ratio**2 == pytest.approx(torque, rel=1e-12)
    assert stress[1] * 2 * math.pi == pytest.approx(-torque, rel=1e-12)
    assert qs.quasi_steady_mean(case, [[2.0, 5.0]], [0.0])[0] == pytest.approx(mean, rel=1e-12)


@pytest.mark.parametrize("ratio", [0.01, 0.1, 0.5, 0.83, 0.84, 0.95, 0.99, 0.999, 0.9999])
def test_axial_annulus_keeps_its_digits(ratio):
    # The textbook form in 40 digits; double precision of the same form loses twelve at ratio 0.9999.
    case = annulus(ratio)
    speeds, gradient = [[0.3, -0.2]], [50.0]
    with mpmath.workdps(40):
        k, mu, g = mpmath.mpf(ratio), mpmath.mpf(MU), mpmath.mpf(50)
        low, up = mpmath.mpf(0.3), mpmath.mpf(-0.2)
        c = (up - low + g * (1 - k**2) / (4 * mu)) / mpmath.log(1 / k)

        def u(r):
            return low + c * mpmath.log(r / k) - g * (r**2 - k**2) / (4 * mu)

        mean = 2 * mpmath.quad(lambda r: u(r) * r, [k, mpmath.sqrt(k), 1]) / (1 - k**2)
        inner, outer = mu * c / k - g * k / 2, -(mu * c - g / 2)
        middle = (1 + k) / 2
        expected = [float(x) for x in (inner, outer, mean, u(middle))]
    stress = qs.quasi_steady_stress(case, speeds, gradient)[0]
    assert stress == pytest.approx(expected[:2], rel=1e-11)
    assert qs.quasi_steady_mean(case, speeds, gradient)[0] == pytest.approx(expected[2], rel=1e-11)
    found = qs.steady_profile(case, np.array(speeds[0]), 50.0, np.array([float(middle)]))[0]
    assert found == pytest.approx(expected[3], abs=1e-11)


def test_a_thin_annulus_tends_to_plates():
    gap = 1e-4
    thin = problem(1, 1.0, 1.0 + gap)
    flat = problem(0, 0.0, thin.gap)
    for f in (qs.quasi_steady_stress, qs.quasi_steady_mean):
        assert f(thin, [[0.1, 0.4]], [1e6]) == pytest.approx(f(flat, [[0.1, 0.4]], [1e6]), rel=2 * gap)


def test_slip():
    # Navier's slip: drag mu U/(h + b1 + b2); flow between plates x (1 + 6 b/h), in a pipe x (1 + 4 b/R) (from memory).
    case = channel(slips=(0.1, 0.3))
    assert qs.quasi_steady_stress(case, [[0.0, 2.0]], [0.0])[0] == pytest.approx([2 * MU / 1.4, -2 * MU / 1.4])
    both = channel(slips=(0.1, 0.1))
    assert qs.quasi_steady_mean(both, STILL, [1.0])[0] == pytest.approx((1 + 0.6) / (12 * MU), rel=1e-13)
    assert qs.quasi_steady_mean(pipe(slips=(0.0, 0.1)), STILL, [1.0])[0] == pytest.approx(1.4 / (8 * MU), rel=1e-13)
    turning = problem(3, 1.0, 2.0, slips=(0.05, 0.1))
    stress = qs.quasi_steady_stress(turning, [[1.0, 3.0]], [0.0])[0]
    ends = qs.steady_profile(turning, np.array([1.0, 3.0]), 0.0, np.array([1.0, 2.0]))
    assert 1.0 * (ends[0] - 1.0) == pytest.approx(0.05 * stress[0] / MU)  # slip speed = b x stress/mu
    assert 2.0 * (ends[1] - 3.0) == pytest.approx(0.1 * stress[1] / MU)


def test_films_with_a_free_surface():
    # Falling film: surface h^2 G/(2 mu), mean h^2 G/(3 mu) (Bird, Stewart & Lightfoot, section 2.2, from memory).
    for kinds, free, held in ((("moving", "shear_free"), 1.0, 0), (("shear_free", "moving"), 0.0, 1)):
        case = channel(kinds=kinds)
        surface = qs.steady_profile(case, np.zeros(2), 1.0, np.array([free]))[0]
        assert surface == pytest.approx(1 / (2 * MU), rel=1e-13)
        assert qs.quasi_steady_mean(case, STILL, [1.0])[0] == pytest.approx(1 / (3 * MU), rel=1e-13)
        stress = qs.quasi_steady_stress(case, STILL, [1.0])[0]
        assert stress[held] == pytest.approx(1.0)
        assert stress[1 - held] == 0.0


@pytest.mark.parametrize("kinds", [("moving", "shear_free"), ("shear_free", "moving")])
@pytest.mark.parametrize("metric", [1, 3])
def test_round_films_with_a_free_surface(metric, kinds):
    # The equation itself integrated by SciPy's adaptive quadrature from the free end.
    gradient = 3.0 if metric == 1 else 0.0
    case = problem(metric, 0.4, 1.0, kinds=kinds, slips=(0.02, 0.02))
    free, held = (1.0, 0.4) if kinds[1] == "shear_free" else (0.4, 1.0)

    def flux(r):
        return -gradient * (r ** (metric + 1) - free ** (metric + 1)) / (metric + 1)

    slope = flux(held) / (MU * held**metric)
    wall = 0.7 + (0.02 * slope if held == 0.4 else -0.02 * slope)
    expected = wall + quad(lambda r: flux(r) / (MU * r**metric), held, 0.8)[0]
    found = qs.steady_profile(case, np.array([0.7, 0.7]), gradient, np.array([0.8]))[0]
    assert found == pytest.approx(expected, rel=1e-10)


def test_hagen_poiseuille_at_and_near_the_axis():
    u = qs.steady_profile(pipe(), np.array([0.0, 0.5]), 2.0, np.array([0.0, 1e-9, 0.5, 1.0]))
    assert u == pytest.approx(0.5 + 2.0 / (4 * MU) * np.array([1.0, 1.0, 0.75, 0.0]), rel=1e-14)
    assert qs.quasi_steady_stress(pipe(), STILL, [2.0])[0] == pytest.approx([0.0, 1.0])  # G R/2


def test_no_steady_flow_without_a_wall_that_holds():
    with pytest.raises(ValueError, match="no steady flow"):
        qs.quasi_steady_stress(channel(kinds=("shear_free", "shear_free")), STILL, [1.0])


def peaks_of(history):
    """Largest |stress| at the rows, None where infinite."""
    out = {}
    for index, name in enumerate(("lower", "upper")):
        column = history.stress[:, index]
        out[name] = None if np.isnan(column).any() else float(column[np.abs(column).argmax()])
    return out


def test_a_slow_ramp_needs_no_more_than_the_hand_formula():
    case, history = closed.couette_ramp(over=1.0, end=1.05)  # a hundred diffusion times
    found = compare(case, history, peaks_of(history))
    assert found["enough"] is True
    assert found["peak_stress"]["upper"] == pytest.approx(-MU * 0.3 / 1e-3)
    assert found["peak_stress"]["lower"] == pytest.approx(MU * 0.3 / 1e-3)
    # During a ramp of length T the moving wall's stress exceeds the hand formula by h^2/(3 nu T) (the series' sum).
    assert found["difference"]["upper"] == pytest.approx(1 / 300, rel=0.01)


def test_a_fast_ramp_needs_more():
    case, history = closed.couette_ramp(over=1e-3)
    found = compare(case, history, peaks_of(history))
    assert found["enough"] is False
    # Half space under a ramp: peak 2 rho a sqrt(nu T/pi) (Stokes' first problem integrated), against mu U/h.
    ratio = 2 * math.sqrt(case.diffusion_time / (1e-3 * math.pi))
    assert found["difference"]["upper"] == pytest.approx(1 - 1 / ratio, rel=1e-3)
    assert "upper" in found["note"]


def test_a_sudden_start_has_no_hand_formula():
    case, history = closed.couette_sudden()
    found = compare(case, history, peaks_of(history))
    assert found["enough"] is False
    assert found["difference"]["upper"] is None
    assert found["peak_stress"]["upper"] == pytest.approx(-MU * 0.3 / 1e-3)
    assert "sudden start" in found["note"]


def test_crests_between_rows_are_seen():
    case = channel(speeds=(0.0, closed.sine_drive(1.0, 1.0)))
    time, piece, offset = closed.rows([0.0], 1.0, 0.03, growth=1.0)
    time, piece, offset = time[::9], piece[::9], offset[::9]  # no row within 2 % of the crest
    speed = np.stack([np.zeros_like(time), np.sin(2 * np.pi * time)], axis=1)
    assert np.abs(speed).max() < 0.999
    history = closed.made(
        case, time, piece, offset, 0 * speed, 0 * speed, np.repeat(speed, 2, axis=1), 0 * np.repeat(speed, 2, axis=1),
        np.linspace(0, 1, 4), np.zeros_like(time),
    )  # fmt: skip
    found = compare(case, history, peaks_of(history))["peak_stress"]
    assert np.abs(list(found.values())) == pytest.approx([MU, MU], rel=5e-3)

"""The judges against each other and against published solutions; nothing of the solver is used here."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

from . import exact
from .chebyshev import stresses
from .gap import Gap, gap_of
from .judge import Judge
from .tables import GAPS, KINDS, plain

AGREE = 1e-7  # what Radau's values between its steps allow at 3e-10 per step; most cases agree to 1e-9
SMOOTH = [k for k in KINDS if k not in ("bare", "step")]  # just after a jump polynomials across the gap do not converge


@pytest.mark.parametrize(("shape", "kind"), [(list(GAPS)[i % 4], kind) for i, kind in enumerate(SMOOTH)])
def test_two_unrelated_judges_agree(shape: str, kind: str) -> None:
    """Laplace inversion and Chebyshev collocation with Radau share neither space nor time discretisation."""
    case = plain(shape, kind, "steady")
    times = np.linspace(0.15, 1.0, 12) * case["duration"]
    judge = Judge(case)
    away = np.abs(times[:, None] - judge.breaks[None, :]).min(axis=1) > 0.01 * case["duration"]
    first = judge.state(times)[:2].T
    second = stresses(case, times)
    assert np.abs(first - second)[away].max() < AGREE * np.abs(first).max()


@pytest.mark.parametrize("kind", ["ramp", "sine", "repeat", "lag"])
def test_double_precision_against_forty_digits(kind: str) -> None:
    """mpmath, fixed Talbot, break by break with unscaled functions."""
    for shape, channels in (("plates", (0, 1, 2)), ("pipe", (1,))):
        judge = Judge(plain(shape, kind, "steady"))
        for t in (1e-6 * judge.until, 0.51 * judge.until)[len(channels) == 1 :]:
            for channel in channels:
                slow = exact.state(judge.gap, judge._inputs, t, channel, judge.response.steady[:, channel])
                largest = np.abs(judge.state(judge.samples(1e-6))[channel]).max()
                assert abs(judge.state([t])[channel, 0] - slow) < 1e-11 * largest


GAPS_FAR_APART = [
    Gap("axial", 1e-5, 1e-3, 900.0, 0.05),
    Gap("axial", 0.9999e-2, 1e-2, 900.0, 0.05),
    Gap("rotating", 1e-5, 1e-3, 900.0, 0.05),
    Gap("rotating", 0.9999e-2, 1e-2, 900.0, 0.05, (1e-7, 0.0)),
    Gap("plates", 0.0, 1e-3, 900.0, 0.05, (1e-5, 0.0), (False, True)),
    Gap("pipe", 0.0, 1e-3, 900.0, 0.05, (0.0, 1e-4)),
]


@pytest.mark.parametrize("gap", GAPS_FAR_APART)
def test_transfer_functions_against_forty_digits(gap: Gap) -> None:
    from .transfer import transfer

    middle = (gap.ri + gap.ro) / 2
    for share in (1e-4, 1.0):
        s = 5 / share * np.exp(2j) / gap.time
        fast = transfer(gap, np.array([s]), np.array([middle]))[:, :, 0]
        with mp.workdps(45):
            rows = range(2 if gap.kind == "rotating" else 3)
            slow = [[complex(exact.transfer(gap, mp.mpc(s), row, c, middle)) for c in range(4)] for row in rows]
        scale = np.abs(fast).max(axis=1, keepdims=True)
        assert np.abs(fast[: len(slow)] - np.array(slow)).max(axis=0).max() < 1e-11 * scale.max()


def still(shape: str, **more: object) -> dict:
    return dict(GAPS[shape]) | {"start": "rest", "settle_within": 0.01, "accuracy": 1e-3} | more


def test_plane_start_up() -> None:
    """Start-up of plane Couette flow, series of Christov 2013 (arXiv 1305.5999); digits computed from it."""
    case = still("plates", walls={"upper": {"speed": 1.0}})
    gap = gap_of(case)
    judge = Judge(case | {"duration": 1.1 * gap.time})
    table = {
        0.01: (0.0004069520, 5.641895835, 1.567087e-10),
        0.1: (0.2627562698, 1.784286114, 0.2928996518),
        0.5: (0.4954215049, 1.014383772, 0.9856162386),
        1.0: (0.4999670720, 1.000103446, 0.9998965536),
    }
    for time, (middle, moving, fixed) in table.items():
        t = np.array([time * gap.time])
        stress = judge.state(t)[:2, 0] * (gap.ro / gap.mu)
        assert stress == pytest.approx([fixed, -moving], rel=1e-9, abs=1e-15)
        assert judge.velocity(t, np.array([gap.ro / 2]))[0, 0] == pytest.approx(middle, rel=1e-6)
    times = judge.settling()
    assert times["lower"] == pytest.approx(0.5368 * gap.time, rel=1e-4)  # computed
    assert times["upper"] is not None
    assert times["upper"] == pytest.approx(0.5368 * gap.time, rel=1e-4)  # computed


@pytest.mark.parametrize(
    ("shape", "scale", "flow", "stress"), [("pipe", 1.0, 0.78867, 0.73256), ("plates", 0.25, 1.86050, 1.78129)]
)
def test_pressure_start_up_times(shape: str, scale: float, flow: float, stress: float) -> None:
    """Szymanski, J. Math. Pures Appl. 11 (1932) 67, series; times to 99 % computed from it (plates: half width)."""
    case = still(shape, pressure=1000.0)
    gap = gap_of(case)
    judge = Judge(case | {"duration": 3 * gap.time})
    times = judge.settling()
    assert times["flow"] == pytest.approx(flow * scale * gap.time, abs=6e-6 * gap.time)
    assert times[gap.names[1]] == pytest.approx(stress * scale * gap.time, abs=6e-6 * gap.time)


def test_spin_up_of_a_cylinder_from_its_momentum() -> None:
    """Acheson, Elementary Fluid Dynamics (spin-down): momentum fraction 1 - 8 sum exp(-j1^2 T)/j1^2; digits computed.

    A thin inner shaft without shear stands for the empty middle, hence the loose limit.
    """
    case = still("rotating", inner_radius=1e-6, outer_radius=9.3e-3)
    case["walls"] = {"inner": {"shear_free": True}, "outer": {"speed": 10.0}}
    judge = Judge(case | {"duration": 0.3 * gap_of(case).time})
    gap = judge.gap
    t = np.linspace(0, 1, 2001)[1:] ** 2 * 0.1 * gap.ro**2 / gap.nu
    torque = -judge.state(t)[1] * gap.ro**2 * 2 * np.pi
    root = np.sqrt(t)
    y = torque * 2 * root
    impulse = float(np.sum((y[1:] + y[:-1]) / 2 * np.diff(root)) + y[0] * root[0])
    whole = gap.rho * np.pi / 2 * gap.ro**4 * 10.0
    assert impulse / whole == pytest.approx(0.873304053, rel=1e-5)


def test_first_problem_of_stokes() -> None:
    """Wall stress mu U / sqrt(pi nu t) (Schlichting, from memory), K of the contract, in every shape at short times."""
    for shape in GAPS:
        outer = {"plates": "upper", "pipe": "bore"}.get(shape, "outer")
        case = still(shape, walls={outer: {"speed": 3.0}})
        judge = Judge(case | {"duration": gap_of(case).time})
        gap = judge.gap
        lever = gap.ro if shape == "rotating" else 1.0
        t = 1e-8 * gap.time
        k = lever * 3.0 * np.sqrt(gap.rho * gap.mu / np.pi)
        assert judge.unbounded(1) == (pytest.approx(k, rel=1e-12), 0.0)
        assert judge.state([t])[1, 0] == pytest.approx(-k / np.sqrt(t), rel=1e-3)


def test_second_problem_of_stokes() -> None:
    """Amplitude U sqrt(rho mu omega), 45 degrees ahead of the wall's speed (Schlichting, from memory), deep gap."""
    case = still("plates", walls={"upper": {"speed": {"kind": "sine", "amplitude": 0.2, "frequency": 4000.0}}})
    judge = Judge(case | {"duration": 0.01})
    omega = 2 * np.pi * 4000.0
    t = np.linspace(0.0, 2 * np.pi / omega, 9)
    ahead = -0.2 * np.sqrt(judge.gap.rho * judge.gap.mu * omega) * np.sin(omega * t + np.pi / 4)
    assert judge.settled(t)[1] == pytest.approx(ahead, abs=1e-9 * np.abs(ahead).max())


def test_backflow_begins_at_minus_one() -> None:
    """Couette-Poiseuille: the fixed wall's stress is (mu U / h)(1 + P), zero at P = -1 (exact algebra)."""
    case = still("plates", walls={"upper": {"speed": 0.3}})
    gap = gap_of(case)
    for p, sign in ((-0.9, 1.0), (-1.0, 0.0), (-1.1, -1.0)):
        drop = p * 2 * gap.mu * 0.3 / gap.ro**2
        final = Judge(case | {"pressure": drop, "duration": 5 * gap.time}).final()
        assert final[0] == pytest.approx(gap.mu * 0.3 / gap.ro * (1 + p), abs=1e-10)
        assert np.sign(np.round(final[0], 9)) == sign


def test_pulsating_pipe_flow() -> None:
    """Womersley, J. Physiol. 127 (1955) 553: Q from 1 - 2 J1(z)/(z J0(z)); digits at alpha = 5 computed."""
    case = still("pipe")
    gap = gap_of(case)
    omega = 25 * gap.nu / gap.ro**2
    case["pressure"] = {"kind": "sine", "amplitude": 100.0, "frequency": omega / (2 * np.pi), "phase": np.pi / 2}
    judge = Judge(case | {"duration": 10 * gap.time})
    t = np.linspace(0, 1, 7) * 2 * np.pi / omega
    mean = gap.ro**2 * 100.0 / gap.mu * 0.0302244 * np.sin(omega * t + np.deg2rad(18.64715))
    assert judge.settled(t)[2] == pytest.approx(mean, abs=2e-6 * np.abs(mean).max())


def test_many_short_cycles_are_summed() -> None:
    """The periodic state against the march of every cycle from rest until nothing of the start is left."""
    case = still("axial", walls={"outer": {"speed": 0.0}})
    gap = gap_of(case)
    every = 0.05 * gap.time
    part = {"kind": "trapezoid", "to": 1.0, "rise": 0.2 * every, "hold": 0.3 * every, "fall": 0.1 * every, "from": 0.3}
    case["walls"]["outer"]["speed"] = {"kind": "repeat", "every": every, "part": part}
    judge = Judge(case | {"duration": 170 * every})
    t = np.linspace(0.011, 0.97, 20) * every
    late = judge.state(t + 165 * every)
    assert np.abs(judge.settled(t) - late).max() < 1e-10 * np.abs(late).max()


def test_a_planted_error_is_seen() -> None:
    """The agreement above cannot be had with a viscosity one part in a hundred thousand off."""
    case = plain("axial", "ramp", "steady")
    times = np.linspace(0.5, 1.0, 4) * case["duration"]
    wrong = stresses(case | {"viscosity": case["viscosity"] * (1 + 1e-5)}, times)
    first = Judge(case).state(times)[:2].T
    assert np.abs(first - wrong).max() > AGREE * np.abs(first).max()

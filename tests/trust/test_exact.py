"""The march against the exact solution: the stated errors hold against an independent one, and planted faults show.

Independent: collocation on Chebyshev points (``chebyshev``), exact in time, which shares no code with the series.
"""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from chebyshev import Collocation
from problems import SHAPES, lag, problem, ramp, trapezoid
from scipy.optimize import brentq

from transient.answer import look, solve
from transient.gap.problem import Law
from transient.march import march as room
from transient.march.levels import climb
from transient.series.gapshape import SeriesError
from transient.trust.balance import momentum_check, stress_check
from transient.trust.exact import compare

EARLY = 5e-3  # of the diffusion time: before it the collocation points cannot follow a layer


def case(shape, accuracy=1e-3, **more):
    push = 0.0 if shape == "annulus_rotating" else lag.build(2.0, 0.2, at=0.05)
    lower = 0.0 if shape == "pipe" else ramp.build(-0.4, 0.1, at=0.1)
    return problem(shape, upper=trapezoid.build(1.0, 0.3, 0.1, 0.2, from_=0.1), lower=lower, push=push,
                   start="steady", accuracy=accuracy, **more)  # fmt: skip


@pytest.mark.parametrize("shape", SHAPES)
@pytest.mark.parametrize("accuracy", [1e-2, 1e-4])
def test_stated_errors_of_rows_hold(shape, accuracy):
    flow = case(shape, accuracy)
    solved = solve(flow)
    h, errors = solved.run.history, solved.run.errors
    assert errors.kind == "exact"
    exact = Collocation(flow, solved.ahead.until)
    for piece in range(len(exact.inputs.starts)):
        rows = np.flatnonzero((h.piece == piece) & (h.offset > EARLY))
        true = exact.stress(piece, h.offset[rows])
        assert (np.abs(h.stress[rows] - true) <= errors.stress[rows] + 1e-9).all()
        mean = exact.mean(piece, h.offset[rows])
        assert (np.abs(h.mean[rows] - mean) <= errors.mean[rows] + 1e-9).all()


@pytest.mark.parametrize("shape", SHAPES)
def test_stated_errors_of_peaks_hold_and_meet_the_request(shape):
    flow = case(shape)
    solved = solve(flow)
    exact = Collocation(flow, solved.ahead.until)
    for wall in solved.run.walls:
        best = max(
            (
                abs(value)
                for piece, length in enumerate(np.diff(np.append(exact.inputs.starts, solved.ahead.until)))
                for value in exact.stress(piece, np.linspace(EARLY, length, 4000))[:, wall.end]
            )
        )
        said = solved.parts["walls"][wall.name]
        assert abs(abs(said["peak_stress"]) - best) <= said["peak_stress_error"] + 1e-7 * best
        assert said["peak_stress_error"] <= flow.accuracy * best


@pytest.mark.parametrize("ratio", [0.05, 0.5])
@pytest.mark.parametrize("judge", ["series", "refinement"])
def test_the_settling_error_of_an_annulus_under_pressure_holds(ratio, judge):
    """The largest steady velocity lies between nodes: a size taken at nodes only made this time wrong by 1e-3."""
    flow = problem("annulus_axial", push=1.0, inner=ratio, outer=1.0)
    flow = replace(flow, outer=ratio + 1.0)
    exact = Collocation(flow, 10.0)
    r = np.linspace(flow.inner, flow.outer, 2001)
    steady = exact.velocity(0, 9.0, r)

    def left(t):
        return np.abs(exact.velocity(0, t, r) - steady).max() - 0.01 * np.abs(steady).max()

    said = solve(flow, judge).parts["settling"]
    assert abs(said["time"] - brentq(left, 0.1, 3.0, xtol=1e-13)) <= said["error"]


def planted(monkeypatch, factor=1.01):
    """A march whose viscosity is off, while everything else believes the case."""
    true = room.assemble
    monkeypatch.setattr(
        room, "assemble",
        lambda case_, *more: true(replace(case_, law=Law(0, (factor * case_.viscosity,))), *more),
    )  # fmt: skip


def test_a_wrong_viscosity_in_the_march_is_caught_by_the_series(monkeypatch):
    flow = case("plates")
    ahead = look(flow)
    clean = compare(flow, ahead, climb(flow, ahead, flow.accuracy, 1.0, 2))
    planted(monkeypatch)
    wrong = compare(flow, ahead, climb(flow, ahead, flow.accuracy, 1.0, 2))
    assert clean.peak.max() < 1e-3
    assert wrong.peak.max() > 5e-3
    assert wrong.stress.max() > 10.0 * clean.stress.max()


def test_a_wrong_viscosity_in_the_march_does_not_escape_the_profiles_either(monkeypatch):
    """Stresses that belong to another viscosity than the profiles: the check of stresses against profiles fails."""
    flow = case("plates")
    assert stress_check(flow, solve(flow).run.history).status == "pass"
    planted(monkeypatch, 1.05)
    ladder = climb(flow, look(flow), flow.accuracy, 1.0, 2)
    assert stress_check(flow, ladder.best.flow).status == "fail"


def test_a_stored_stress_off_by_a_percent_fails_the_balances():
    flow = case("plates")
    h = solve(flow).run.history
    assert momentum_check(flow, h).status == "pass"
    off = replace(h, stress=h.stress * [1.0, 1.02], stress_rate=h.stress_rate * [1.0, 1.02])
    assert momentum_check(flow, off).status == "fail"
    assert stress_check(flow, off).status == "fail"


def test_a_lost_row_error_is_an_infinite_one():
    """Where the series is infinite and the march is not, nothing is known: the error is infinite, not zero."""
    flow = problem(upper=1.0, duration=0.5)
    ahead = look(flow)
    ladder = climb(flow, ahead, 1e-3, 1.0, 2)
    ladder.best.flow.stress[0, 1] = -1e9
    assert np.isinf(compare(flow, ahead, ladder).stress[0, 1])


def test_a_law_without_a_series_is_judged_by_refinement():
    flow = problem(upper=ramp.build(1.0, 0.1), duration=1.0)
    ahead = look(flow)
    ladder = climb(flow, ahead, 1e-2, 1.0, 2)
    with pytest.raises(SeriesError, match="only a constant one"):
        compare(replace(flow, law=Law(7, (1.0,))), ahead, ladder)

"""The solver judged from outside: four shapes, every history kind, both starts, through the Python interface."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from transient.answer import run
from transient.case.model import Case

from .cases import tree_of
from .chebyshev import stresses
from .judge import Judge
from .tables import GAPS, KINDS, plain

TABLE = [(shape, kind, start) for shape in GAPS for kind in KINDS for start in ("rest", "steady")]
# A fifth of the table is run: every shape with both starts, every kind.
THINNED = TABLE[::5]


def solved(case: dict[str, Any]) -> tuple[Any, Judge]:
    result = run(Case(tree_of(case)))
    return result, Judge(case)


def rows_of(result: Any) -> tuple[np.ndarray, dict[str, np.ndarray]]:
    data = result.variables
    names = [str(name) for name in data["wall"].data]
    return data["time"].data, {name: data["wall_stress"].data[:, k] for k, name in enumerate(names)}


def allowed(judge: Judge, end: int, t: np.ndarray, exact: np.ndarray, accuracy: float) -> np.ndarray:
    """The contract's tolerance of a stored stress: of the largest, or after an infinite stress of the local value."""
    if judge.unbounded(end)[0] > 0.0:
        return accuracy * np.maximum(np.abs(exact), np.abs(judge.final()[end]))
    return np.full_like(t, accuracy * abs(judge.peak(end)[0]))


@pytest.mark.parametrize(("shape", "kind", "start"), THINNED)
def test_stored_histories_and_headlines(shape: str, kind: str, start: str) -> None:
    case = plain(shape, kind, start)
    result, judge = solved(case)
    t, stress = rows_of(result)
    for end, name in enumerate(judge.gap.names):
        if name not in stress:
            continue
        _rows_hold(judge, end, t, stress[name], case["accuracy"])
    _headlines_hold(case, judge, result.summary)


def _rows_hold(judge: Judge, end: int, t: np.ndarray, stored: np.ndarray, accuracy: float) -> None:
    apart = np.abs(t[:, None] - judge.breaks[None, :]).min(axis=1) > 1e-12 * judge.until
    good = np.flatnonzero((t > 0) & np.isfinite(stored) & apart)
    exact = judge.state(t[good])[end]
    off = np.abs(stored[good] - exact) / allowed(judge, end, t[good], exact, accuracy)
    assert off.max() <= 1.0
    pairs = good[:-1][np.diff(good) == 1]
    middle = (t[pairs] + t[pairs + 1]) / 2
    exact = judge.state(middle)[end]
    line = (stored[pairs] + stored[pairs + 1]) / 2
    assert (np.abs(line - exact) / allowed(judge, end, middle, exact, accuracy)).max() <= 1.0


def _headlines_hold(case: dict[str, Any], judge: Judge, summary: dict[str, Any]) -> None:
    final = judge.final()
    for end, name in enumerate(judge.gap.names):
        if name not in summary["walls"]:
            continue
        wall = summary["walls"][name]
        sure = 1e-9 * abs(judge.peak(end)[0]) if not wall["unbounded"] else 1e-9 * abs(final[end])
        assert abs(wall["final_stress"] - final[end]) <= wall["final_stress_error"] + sure
        k, at = judge.unbounded(end)
        assert wall["unbounded"] == (k > 0.0)
        if k > 0.0:
            assert wall["peak_stress"] is None
            assert wall["unbounded_coefficient"] == pytest.approx(k, rel=1e-9)
            assert wall["peak_time"] == pytest.approx(at, abs=1e-12 * judge.until)
            continue
        peak, when = judge.peak(end)
        error = wall["peak_stress_error"]
        assert error <= case["accuracy"] * abs(peak)
        assert abs(abs(wall["peak_stress"]) - abs(peak)) <= error + sure
        assert np.sign(wall["peak_stress"]) == np.sign(peak)
        first = judge.first_at(end, abs(peak) - error)
        assert abs(wall["peak_time"] - first) <= wall["peak_time_error"] + 1e-6 * judge.until
        assert wall["peak_time"] <= when + wall["peak_time_error"] + 1e-6 * judge.until
    flow, sure = summary["flow"], 1e-9 * abs(judge.peak(2)[0])
    assert abs(flow["final_mean_velocity"] - final[2]) <= flow["final_mean_velocity_error"] + sure
    assert abs(flow["peak_mean_velocity"] - judge.peak(2)[0]) <= flow["peak_mean_velocity_error"] + sure
    _settling_holds(judge, summary["settling"])


def _settling_holds(judge: Judge, said: dict[str, Any]) -> None:
    exact = judge.settling()
    pairs = [(said[key], said["errors"][key], exact[key]) for key in ("velocity", "flow")]
    pairs += [(said["stress"][name], said["errors"]["stress"][name], exact[name]) for name in said["stress"]]
    for value, error, true in pairs:
        assert (value is None) == (true is None)
        if value is not None:
            assert abs(value - true) <= error + 1e-7 * judge.until


@pytest.mark.parametrize("shape", list(GAPS))
def test_against_an_integration_on_chebyshev_points(shape: str) -> None:
    """SciPy's Radau at 3e-10 on an unrelated spatial discretisation, one case per shape."""
    case = plain(shape, "sum", "steady")
    result, judge = solved(case)
    t, stress = rows_of(result)
    late = np.flatnonzero(np.abs(t[:, None] - judge.breaks[None, :]).min(axis=1) > 0.02 * judge.until)[::6]
    other = stresses(case, t[late])
    for end, name in enumerate(judge.gap.names):
        if name in stress:
            limit = case["accuracy"] * np.abs(other[:, end]).max()
            assert np.abs(stress[name][late] - other[:, end]).max() <= limit


@pytest.mark.parametrize("shape", list(GAPS))
def test_velocity_profiles(shape: str) -> None:
    case = plain(shape, "trapezoid", "rest")
    result, judge = solved(case)
    data = result.variables
    t, r, u = data["profile_time"].data, data["position"].data, data["velocity"].data
    chosen = np.flatnonzero(t > 0)[::5]
    exact = judge.velocity(t[chosen], r)
    assert np.abs(u[chosen] - exact).max() <= case["accuracy"] * np.abs(u).max()


def test_the_request_orders_the_errors() -> None:
    """A stricter request gives a smaller actual error, down to 1e-6 (the march is of second order, computed here)."""
    off = []
    for accuracy in (1e-2, 1e-4, 1e-6):
        case = plain("plates", "smooth_ramp", "steady", accuracy)
        result, judge = solved(case)
        wall = result.summary["walls"]["upper"]
        off.append(abs(wall["peak_stress"] - judge.peak(1)[0]) / abs(judge.peak(1)[0]))
        assert off[-1] <= accuracy
    assert off[2] <= 1e-6


def test_a_planted_error_is_seen() -> None:
    """A density two parts in a thousand off does not pass for the case that was solved."""
    case = plain("plates", "ramp", "rest")
    result, _ = solved(case | {"density": case["density"] * 1.002})
    t, stress = rows_of(result)
    with pytest.raises(AssertionError):
        _rows_hold(Judge(case), 1, t, stress["upper"], case["accuracy"])

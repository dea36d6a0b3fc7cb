"""What the map says: percentiles, worst cases and influences, against NumPy, SciPy and a published test function."""

from __future__ import annotations

import math
from types import SimpleNamespace

import numpy as np
import pytest
import quick
from scipy import stats

import transient as tr
from transient.sweep.columns import Column
from transient.sweep.influence import Inputs, influence
from transient.sweep.plan import plan_of
from transient.sweep.says import Data, summary

CASE = tr.Case(
    {
        "gap": {"shape": "plates", "height": "0.8 mm"},
        "fluid": {"density": "998 kg/m^3", "viscosity": "1 mPa*s"},
        "wall": {"upper": {"speed": "0.3 m/s"}},
    }
)
THREE = ("gap.height", "gap.length", "gap.width")


def scattered(samples: int, low: str, high: str, seed: int = 5):
    """A plan over three lengths, uniform between two values, and its inputs (samples, 3)."""
    spec = {"samples": samples, "seed": seed, **{key: {"uniform": [low, high]} for key in THREE}}
    plan = plan_of(CASE, {"scatter": spec})
    rows = plan.values(0, plan.rows)
    return plan, np.stack([rows[key] for key in THREE], axis=1)


def ishigami(x: np.ndarray) -> np.ndarray:
    """sin x1 + 7 sin^2 x2 + 0.1 x3^4 sin x1 (Ishigami & Homma 1990), x (n, 3) in -pi..pi."""
    return np.sin(x[:, 0]) + 7.0 * np.sin(x[:, 1]) ** 2 + 0.1 * x[:, 2] ** 4 * np.sin(x[:, 0])


def shares(inputs: Inputs, y: np.ndarray) -> dict[str, float]:
    """Share of each input by name."""
    return {one["key"]: one["share"] for one in influence(inputs, y)["sensitivities"]}


def test_first_order_indices_of_the_ishigami_function():
    plan, x = scattered(4096, f"{-math.pi} m", f"{math.pi} m")
    found = influence(Inputs(plan), ishigami(x))
    # Exact first-order indices for a = 7, b = 0.1: 0.3139, 0.4424, 0 (Saltelli et al. 2008, chapter 4, from memory)
    expected = {"gap.height": 0.3139, "gap.length": 0.4424, "gap.width": 0.0}
    for key, share in expected.items():
        assert shares(Inputs(plan), ishigami(x))[key] == pytest.approx(share, abs=0.02)
    assert [one["key"] for one in found["sensitivities"]] == ["gap.length", "gap.height", "gap.width"]
    # no straight line explains x2's part: sin^2 is even
    assert abs(found["sensitivities"][0]["slope"]) < 0.05
    assert found["linear"] < 0.25


def test_first_order_indices_are_those_of_scipys_own_method():
    def smooth(x: np.ndarray) -> np.ndarray:
        return x[:, 0] ** 3 + 2.0 * x[:, 1] * x[:, 0] + np.exp(0.5 * x[:, 2])

    plan, x = scattered(4096, "1 m", "2 m")
    found = shares(Inputs(plan), smooth(x))
    theirs = stats.sobol_indices(
        func=lambda x: smooth(x.T)[None, :], n=8192, dists=[stats.uniform(1, 1)] * 3, rng=np.random.default_rng(3)
    )
    for key, share in zip(THREE, theirs.first_order.ravel(), strict=True):
        assert found[key] == pytest.approx(share, abs=0.015)


def test_slopes_are_those_of_scipys_regression():
    plan, x = scattered(512, "1 m", "3 m")
    y = 4.0 * x[:, 0] - 2.0 * x[:, 1]
    found = influence(Inputs(plan), y)
    slopes = {one["key"]: one["slope"] for one in found["sensitivities"]}
    assert found["linear"] == pytest.approx(1.0, abs=1e-12)
    # with inputs that do not go together a standardised coefficient is coefficient x spread of x / spread of y
    for key, column, factor in zip(THREE, x.T, (4.0, -2.0, 0.0), strict=True):
        assert slopes[key] == pytest.approx(factor * column.std() / y.std(), abs=1e-9)
    only = stats.linregress(x[:, 0], y - (-2.0 * x[:, 1]))
    assert slopes["gap.height"] == pytest.approx(only.slope * x[:, 0].std() / y.std(), abs=1e-9)


def test_influences_on_a_grid_are_the_analysis_of_variance():
    vary = {"gap.height": {"from": "1 m", "to": "5 m", "count": 5}, "start.state": ["rest", "steady"]}
    plan = plan_of(CASE, {"vary": vary})
    rows = plan.values(0, plan.rows)
    y = rows["gap.height"] + 3.0 * rows["start.state"]
    # variances of 1..5 and of {0, 3}: 2 and 2.25; purely additive
    assert shares(Inputs(plan), y) == pytest.approx({"gap.height": 2.0 / 4.25, "start.state": 2.25 / 4.25}, abs=1e-12)


def test_what_does_not_matter_has_no_share_and_what_is_constant_none():
    plan, x = scattered(1024, "1 m", "2 m")
    noise = np.random.default_rng(1).normal(size=1024)
    assert max(shares(Inputs(plan), noise).values()) < 0.03
    assert influence(Inputs(plan), np.full(1024, 3.0)) == {"linear": None, "sensitivities": []}
    with_gaps = np.where(x[:, 1] > 1.9, np.nan, x[:, 0])
    assert shares(Inputs(plan), with_gaps)["gap.height"] > 0.98


def column_of(plan, y: np.ndarray, codes=None) -> dict:
    """The headline of one column of values, as the summary has it."""
    parts = ("title", "axes", "scatter", "rows", "samples", "combinations", "values")
    framed = SimpleNamespace(
        **{name: getattr(plan, name) for name in parts},
        frame=SimpleNamespace(
            keys=plan.frame.keys, walls=("upper",), columns=(Column("settling_time", "s", "", ()),)
        ),
    )  # fmt: skip
    codes = codes or {"status": np.zeros(plan.rows, np.int8), "verdict": np.ones(plan.rows, np.int8)}
    return summary(Data(framed, codes, {"settling_time": y, "message": np.full(plan.rows, "why")}.__getitem__))


def test_percentiles_are_numpys_and_the_worst_case_is_the_largest():
    plan, x = scattered(500, "1 m", "2 m")
    y = -(x[:, 0] ** 2) * x[:, 1]
    said = column_of(plan, y)["headlines"]["settling_time"]
    for q, value in said["percentiles"].items():
        assert value == np.percentile(y, float(q))
    worst = int(np.argmax(np.abs(y)))
    assert (said["worst"]["case"], said["worst"]["value"]) == (worst, y[worst])
    assert said["worst"]["inputs"] == pytest.approx(dict(zip(THREE, x[worst], strict=True)))
    assert (said["least"], said["greatest"], said["median"]) == (y.min(), y.max(), np.median(y))
    assert (said["mean"], said["deviation"]) == pytest.approx((y.mean(), y.std()))
    # a magnitude: what enlarges it counts as rising, whatever its sign
    assert {one["key"]: np.sign(one["slope"]) for one in said["sensitivities"]}["gap.height"] == 1.0


def test_percentiles_over_the_scatter_at_the_worst_combination():
    spec = {"samples": 200, "seed": 2, "gap.length": {"normal": ["10 m", "1 m"]}}
    plan = plan_of(CASE, {"vary": {"gap.height": ["1 m", "3 m", "2 m"]}, "scatter": spec})
    rows = plan.values(0, plan.rows)
    y = rows["gap.height"] * rows["gap.length"]
    said = column_of(plan, y)["headlines"]["settling_time"]["combination"]
    assert said["inputs"] == {"gap.height": 3.0}
    assert said["percentiles"]["95"] == np.percentile(y[200:400], 95)


def test_what_most_samples_stay_below_is_numpys_percentile():
    from transient.sweep.says import _reach

    grid = np.random.default_rng(4).normal(size=(50, 13)) ** 2
    np.testing.assert_allclose(_reach(grid, 0.95), np.percentile(grid, 95, axis=1), rtol=1e-13)
    grid[3, 4:], grid[7] = np.nan, np.nan
    found = _reach(grid, 0.95)
    assert found[3] == pytest.approx(np.percentile(grid[3, :4], 95))
    assert found[7] == -1.0


def test_counts_and_reasons():
    plan, x = scattered(8, "1 m", "2 m")
    status, verdict = np.array([0, 0, 1, 2, 0, 0, 0, 1], np.int8), np.array([1, 2, 0, 0, 3, 1, 1, 0], np.int8)
    codes = {"status": status, "verdict": verdict}
    said = column_of(plan, np.where(codes["status"] == 0, x[:, 0], np.nan), codes)
    assert said["status"] == {"solved": 5, "refused": 2, "failed": 1}
    assert said["verdicts"] == {"good": 3, "caution": 1, "outside": 1, "failed": 0}
    assert said["messages"] == [{"message": "why", "cases": 3, "first": 2}]
    assert said["cautions"] == [{"message": "why", "cases": 2, "first": 1}]
    assert said["headlines"]["settling_time"]["cases"] == 5


def test_the_screen_is_one_screen_of_80_columns(sweep_file, call, tmp_path):
    file = sweep_file(
        """
        [vary]
        "gap.height" = ["0.6 mm", "0.9 mm"]
        "fluid.viscosity" = ["1 mPa*s", "2 mPa*s"]
        [scatter]
        samples = 4
        "wall.upper.speed.over" = { triangular = ["40 ms", "50 ms", "70 ms"] }
        """
    )
    status, out, err = call("sweep", file, "--out", tmp_path / "out.h5", "--workers", "1")
    assert (status, err) == (0, "")
    lines = out.splitlines()
    assert len(lines) <= 32
    assert max(len(line) for line in lines if str(tmp_path) not in line) <= 80  # a path is the user's
    for word in ("16 cases: 16 solved", "median", "95 %", "Largest", "Matters", "gap.height", str(tmp_path.name)):
        assert word in out.replace("\n           ", "")


def test_json_is_one_object_and_the_same_as_in_the_file(sweep_file, call, tmp_path, monkeypatch):
    import json

    quick.use(monkeypatch)
    file = sweep_file('[vary]\n"gap.height" = { from = "1 m", to = "30 m", count = 30 }\n')
    status, out, _ = call("sweep", file, "--out", tmp_path / "out.h5", "--json")
    assert status == 0
    assert out.count("\n") == 1
    assert json.loads(out) == tr.read_result(tmp_path / "out.h5").summary
    assert call("sweep", file, "--out", tmp_path / "other.h5", "--quiet") == (0, "", "")

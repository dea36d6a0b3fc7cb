"""Notebook habits: a case built, changed and solved; results shown, plotted, compared and written."""

from __future__ import annotations

from collections.abc import Iterator
from pathlib import Path

import matplotlib
import numpy as np
import pytest
from matplotlib import pyplot
from matplotlib.axes import Axes
from test_sweeps import CASE

import transient as tr
from transient.result.result import Result, ResultError, Variable


@pytest.fixture(autouse=True)
def _no_windows() -> Iterator[None]:
    """Figures are made without a screen, and closed."""
    before = matplotlib.get_backend()
    pyplot.switch_backend("agg")
    yield
    pyplot.close("all")
    pyplot.switch_backend(before)


def test_a_case_is_built_changed_and_solved():
    """The steady stress mu U/h of plane Couette flow (White, Viscous Fluid Flow, ch. 3; from memory)."""
    case = tr.Case(
        {
            "gap": {"shape": "plates", "height": "0.8 mm"},
            "fluid": {"density": "998 kg/m^3", "viscosity": "1.002 mPa*s"},
            "wall": {"upper": {"speed": {"kind": "ramp", "to": "0.30 m/s", "over": "50 ms"}}},
        }
    )
    thin = case.replace({"gap.height": "0.4 mm", "wall.upper.speed.to": "0.2 m/s"})
    assert thin == case.replace(gap__height="0.4 mm", wall__upper__speed__to="0.2 m/s")
    result = tr.run(thin)
    assert result.walls["lower"].final_stress == pytest.approx(1.002e-3 * 0.2 / 0.4e-3, rel=2e-3)
    assert case.gap.ends.gap == 0.8e-3
    with pytest.raises(tr.CaseError, match=r"gap\.heigth: unknown key; did you mean"):
        case.replace({"gap.heigth": "1 mm"})


def test_results_and_sweeps_show_a_summary(solved):
    result = solved("flow_cell")
    assert repr(result).splitlines()[0] == "Result 'Flow cell brought up to speed' (plates, good)"
    assert len(repr(result).splitlines()) < 10
    assert "<table>" in result._repr_html_()
    evil = Result(result.variables, {**result.summary, "title": "<script>"}, "", {"title": "<script>"})
    assert "<script>" not in evil._repr_html_()


def test_a_history_is_plotted_on_axes_that_are_returned(solved):
    result = solved("flow_cell")
    axes = result.plot()
    assert isinstance(axes, Axes)
    assert [line.get_label() for line in axes.lines] == ["lower", "upper"]
    np.testing.assert_allclose(axes.lines[1].get_ydata(), result.wall_stress[:, 1])
    assert axes.get_xlabel() == "time [ms]"
    assert axes.get_ylabel().endswith("[Pa]")
    assert len({line.get_linestyle() for line in axes.lines}) == 2
    same = result.plot("wall_stress upper", axes=axes)
    assert same is axes
    assert len(axes.lines) == 3


def test_profiles_are_plotted_with_their_times(solved):
    result = solved("flow_cell")
    axes = result.plot("velocity")
    assert len(axes.lines) == 7
    np.testing.assert_allclose(axes.lines[-1].get_xdata(), result.velocity[-1])
    assert axes.get_legend().get_title().get_text() == "time"


def test_columns_of_a_sweep_are_plotted_over_a_key():
    table = tr.sweep(CASE, vary={"gap.height": ["0.6 mm", "0.8 mm"]}, workers=1)
    axes = table.plot()
    np.testing.assert_allclose(axes.lines[0].get_xdata(), [0.6, 0.8])
    np.testing.assert_allclose(axes.lines[0].get_ydata(), 1e3 * table.settling_time)
    assert axes.get_xlabel() == "gap.height [mm]"
    with pytest.raises(ResultError, match="nothing varies under the name"):
        table.plot("settling_time", over="gap.hight")


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("wall_strss", "there is no variable 'wall_strss'; did you mean 'wall_stress'"),
        ("wall", "wall is no history"), ("position", "position is no history"),
        ("wall_stress uper", "there is no wall 'uper'; did you mean 'upper'"),
    ],
)  # fmt: skip
def test_what_cannot_be_plotted_is_one_line(solved, name: str, words: str):
    with pytest.raises(ResultError, match=words):
        solved("flow_cell").plot(name)


def test_a_title_is_only_text(solved):
    result = solved("flow_cell")
    other = Result(result.variables, {**result.summary, "title": "cost $5 of $x_"}, "", {"title": "cost $5 of $x_"})
    other.plot().figure.canvas.draw()


def test_time_lines_are_data_of_the_result(solved):
    result = solved("flow_cell")
    moved = result.time_lines([0.0, 0.1], 0.3)
    assert moved.shape == (2, len(result.position))
    # the wall has moved by the integral of its ramp
    assert moved[0, -1] == pytest.approx(0.3 * (0.3 - 0.025), rel=1e-4)
    assert moved[1, -1] == pytest.approx(0.3 * 0.2, rel=1e-4)


def test_one_import_shows_compares_and_writes(solved, tmp_path: Path):
    first, second = solved("flow_cell"), solved("sudden_start")
    assert tr.draw(first, "stress").axes
    assert len(tr.overlay(first, second, "mean_velocity").axes) == 2
    tr.write_sheet(first, tmp_path / "a.html")
    tr.write_result(first, tmp_path / "a.h5")
    np.testing.assert_array_equal(tr.read_result(tmp_path / "a.h5").wall_stress, first.wall_stress)
    assert (tmp_path / "a.html").read_text(encoding="utf-8").startswith("<!doctype html>")


def test_every_history_reaches_xarray(solved):
    import xarray

    data = solved("pushed_carriage").to_xarray()
    assert isinstance(data, xarray.Dataset)
    assert data["wall_stress"].dims == ("time", "wall")
    assert data["wall_stress_error"].attrs["units"] == "Pa"
    assert float(data["wall_stress"].sel(wall="upper").min()) < 0.0


def test_a_variable_of_a_made_result_needs_no_walls():
    time = np.linspace(0.0, 1.0, 5)
    bare = Result(
        {"time": Variable(("time",), time, "s", "time"), "x": Variable(("time",), time**2, "1", "share")}, {}, ""
    )
    assert bare.plot("x").get_ylabel() == "share [1]"

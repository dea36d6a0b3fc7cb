"""Figures that need a case, travel or stated errors: on solved cases of our own."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.interpolate import Akima1DInterpolator
from test_figures import OF_SOLVED, changed, marked, overlap, texts

from transient.result.lines import time_lines, travelled
from transient.result.result import Result, ResultError, Variable
from transient.sheet.akima import akima
from transient.sheet.energy import account_of
from transient.sheet.figures import draw
from transient.sheet.lines import lines
from transient.sheet.stated import case_of

CASES = ["flow_cell", "sudden_start", "cold_oil_line", "rod_flush", "spun_sleeve", "reversing_rig", "pushed_carriage"]


@pytest.mark.parametrize("name", OF_SOLVED)
@pytest.mark.parametrize("case", CASES)
def test_nothing_lies_on_anything_else(solved, case: str, name: str):
    figure = draw(solved(case), name)
    assert overlap(figure) == []
    assert figure.get_figheight() <= 10.0


def test_the_sketch_says_what_moves_and_where_positive_is(solved):
    said = " ".join(texts(draw(solved("rod_flush"), "sketch"))).replace("\n", " ")
    for words in ("outer: stands still", "inner: speed: trapezoid (to -0.25 m/s", "τ > 0", "x", "r", "smooth ramp"):
        assert words in said
    assert "25 kg" in texts(draw(solved("pushed_carriage"), "sketch"))


@pytest.mark.parametrize(("case", "to_the_right"), [("flow_cell", True), ("rod_flush", False), ("reversing_rig", True)])
def test_the_arrow_of_a_wall_points_the_way_it_moves(solved, case: str, to_the_right: bool):
    axes = draw(solved(case), "sketch").axes[0]
    arrows = [text for text in axes.texts if getattr(text, "arrow_patch", None) is not None]
    broad = [text for text in arrows if text.arrow_patch.get_linewidth() == 2.2]
    assert [text.xy[0] > text.get_position()[0] for text in broad] == [to_the_right]


def test_a_free_surface_is_no_wall_and_feels_no_stress(solved):
    result = solved("flow_cell")
    free = result.case_text + "[wall.lower]\nshear_free = true\n"
    figure = draw(Result(result.variables, result.summary, free, result.attributes), "sketch")
    assert len(marked(figure, "free")) == 1
    assert texts(figure).count("τ > 0") == 1
    assert texts(draw(result, "sketch")).count("τ > 0") == 2


def test_work_of_a_ramped_wall_closes_with_the_exact_dissipation(solved):
    """In the end the film dissipates mu U^2/h per area and holds rho U^2 h/6 per area of kinetic energy: integrals
    of the plane Couette profile (White, Viscous Fluid Flow, ch. 3; from memory)."""
    result = solved("flow_cell")
    account = account_of(result, case_of(result))
    area, height, speed = 60e-3 * 25e-3, 0.8e-3, 0.3
    assert account.per == ""
    assert account.kinetic[-1] == pytest.approx(998.0 * speed**2 * height / 6.0 * area, rel=1e-3)
    final = np.diff(account.dissipated)[-1] / np.diff(result.profile_time)[-1]
    assert final == pytest.approx(1.002e-3 * speed**2 / height * area, rel=1e-2)
    assert (np.diff(account.dissipated) > 0.0).all()


@pytest.mark.parametrize(("case", "wall"), [("pushed_carriage", "upper"), ("motor_rotor", "inner")])
def test_work_on_the_liquid_is_what_the_run_itself_states(solved, case: str, wall: str):
    """Against the march's own running balance, from its own rows (computed)."""
    result = solved(case)
    account, film = account_of(result, case_of(result)), result.summary["energy"]["film"]
    assert list(account.work) == [f"{wall} wall"]
    assert account.work[f"{wall} wall"][-1] == pytest.approx(film["work"], rel=1e-3)
    assert account.dissipated[-1] == pytest.approx(film["dissipated"], rel=1e-3)


def test_energies_count_from_the_first_kept_profile(solved):
    """Work between two instants does not depend on where the count begins."""
    result = solved("flow_cell")
    later = {
        name: Variable(v.dims, v.data[40:], v.units, v.long_name)
        for name, v in result.variables.items() if v.dims[0] == "profile_time"
    }  # fmt: skip
    other = Result({**result.variables, **later}, result.summary, result.case_text, result.attributes)
    whole, part = account_of(result, case_of(result)), account_of(other, case_of(other))
    np.testing.assert_allclose(part.dissipated, whole.dissipated[40:] - whole.dissipated[40], atol=1e-18)
    assert any(axes.get_ylabel().replace("\n", " ").startswith("energy since ") for axes in draw(other, "energy").axes)


def test_energy_per_length_where_no_length_is_known(solved):
    result = solved("spun_sleeve")
    text = result.case_text.replace('length = "50 mm"\n', "")
    other = Result(result.variables, result.summary, text, result.attributes)
    whole = account_of(result, case_of(result))
    part = account_of(other, case_of(other))
    assert part.per == "/m"
    np.testing.assert_allclose(part.kinetic * 50e-3, whole.kinetic, rtol=1e-12, atol=1e-30)


def test_the_first_work_of_an_infinite_stress_is_that_of_its_law(solved):
    """Power K U A / sqrt(t), work 2 K U A sqrt(t) (Stokes' first problem: K = U sqrt(mu rho / pi))."""
    result = solved("sudden_start")
    account = account_of(result, case_of(result))
    row = int(np.searchsorted(result.profile_time, 1e-3))
    area, speed = 60e-3 * 25e-3, 0.3
    factor = speed * np.sqrt(1.002e-3 * 998.0 / np.pi)
    (work,) = account.work.values()
    assert work[row] == pytest.approx(2.0 * factor * speed * area * np.sqrt(result.profile_time[row]), rel=5e-3)


def test_time_lines_of_steady_shear_are_straight():
    """A line in plane Couette flow leans by U t y/h."""
    time, y = np.linspace(0.0, 2.0, 21), np.linspace(0.0, 1e-3, 11)
    velocity = np.tile(0.3 * y / 1e-3, (21, 1))
    result = Result(
        {
            "profile_time": Variable(("profile_time",), time, "s", "t"),
            "position": Variable(("position",), y, "m", "y"),
            "velocity": Variable(("profile_time", "position"), velocity, "m/s", "u"),
            "travel": Variable(("profile_time", "position"), velocity * time[:, None], "m", "x"),
        },
        {},
        "",
    )
    moved = time_lines(result, [0.0, 0.55, 1.99], 1.77)
    np.testing.assert_allclose(moved[0], 0.3 * y / 1e-3 * 1.77, rtol=1e-12)
    np.testing.assert_allclose(moved[1], 0.3 * y / 1e-3 * 1.22, rtol=1e-12)
    assert np.isnan(moved[2]).all()
    with pytest.raises(ResultError, match=r"2\.1 s lies outside the run's profiles, 0 s to 2 s"):
        time_lines(result, [0.0], 2.1)


def test_time_lines_between_profiles_follow_the_velocity(solved):
    """Travel between kept profiles against the travel of every second profile left out."""
    result = solved("oscillating_plate")
    half = {
        name: Variable(v.dims, v.data[::2], v.units, v.long_name)
        for name, v in result.variables.items() if v.dims[0] == "profile_time"
    }  # fmt: skip
    coarse = Result({**result.variables, **half}, {}, "")
    # the first profiles stand closest, where the start is
    error = np.abs(travelled(coarse, result.profile_time[21:-1:2]) - result.travel[21:-1:2]).max()
    assert error < 2e-3 * np.ptp(result.travel)


def test_lines_asked_for_are_drawn_and_named(solved):
    result = solved("flow_cell")
    figure = lines(result, [0.0, 0.1, 0.2], 0.25)
    assert [line.get_gid() for line in marked(figure, "line")] == ["line 0.0", "line 0.1", "line 0.2"]
    assert {"0 s", "100 ms", "200 ms"} <= set(texts(figure))
    (first, *_) = marked(figure, "line 0.0")
    tip = first.get_xdata()[-1]
    assert tip == pytest.approx(1e3 * 0.3 * (0.25 - 0.025), rel=1e-3)  # a wall ramped up over 50 ms, in mm


def test_trust_marks_what_was_not_met(solved):
    result = solved("flow_cell")
    checks = [{**check, "status": "fail", "value": 10.0 * check["limit"]} for check in result.summary["checks"][:1]]
    other = changed(result, {**result.summary, "checks": checks})
    bars = [bar for bar in draw(other, "trust").axes[0].patches if bar.get_hatch()]
    assert [bar.get_width() for bar in bars] == [10.0]
    assert not [bar for bar in draw(result, "trust").axes[0].patches if bar.get_hatch()]
    bare = changed(result, {"title": ""})
    with pytest.raises(ResultError, match="states neither errors nor checks"):
        draw(bare, "trust")


def test_without_a_readable_case_there_is_no_sketch(solved):
    result = solved("flow_cell")
    other = Result(result.variables, result.summary, "title = 1", result.attributes)
    for name in ("sketch", "energy"):
        with pytest.raises(ResultError, match=f"figure {name}: needs the case"):
            draw(other, name)


@pytest.mark.parametrize("count", [3, 4, 5, 40])
def test_the_smooth_curve_is_the_modified_akima_curve(count: int):
    rng = np.random.default_rng(count)
    x, y = np.sort(rng.uniform(0.0, 1.0, count)), rng.normal(size=count)
    y[count // 2 :] = y[-1]
    at = np.linspace(x[0], x[-1], 301)
    expected = Akima1DInterpolator(x, y, method="makima")(at)
    np.testing.assert_allclose(akima(x, y, at), expected, rtol=0, atol=1e-13 * np.abs(y).max())

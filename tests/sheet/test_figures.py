"""Figures: what is on them, and that nothing lies on top of anything else (judged by matplotlib's own renderer)."""

from __future__ import annotations

import re
import subprocess
import sys
from pathlib import Path

import matplotlib
import numpy as np
import pytest
from made import MADE, plates_ramp, sweep
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure

from transient.result.result import Result, ResultError, Variable
from transient.sheet import figures
from transient.sheet.figures import FIGURES, draw, save
from transient.sheet.labels import spread, thinned
from transient.sheet.profiles import between, instants, time_labels
from transient.sheet.span import span


def made(name: str) -> Result:
    return MADE[name]()


def changed(result: Result, summary: dict | None = None, **variables: Variable | None) -> Result:
    """``result`` with other variables (None: without) and summary."""
    merged = {name: v for name, v in {**result.variables, **variables}.items() if v is not None}
    return Result(merged, result.summary if summary is None else summary, result.case_text, result.attributes)


def marked(figure: Figure, gid: str) -> list:
    """The lines of the figure whose mark begins with ``gid``."""
    return [line for axes in figure.axes for line in axes.lines if (line.get_gid() or "").startswith(gid)]


def verticals(figure: Figure) -> list[float]:
    """Places of the lines from the bottom to the top of an axes."""
    lines = [line for axes in figure.axes for line in axes.lines if list(line.get_ydata()) == [0, 1]]
    return [float(line.get_xdata()[0]) for line in lines]


def texts(figure: Figure) -> list[str]:
    return [t.get_text() for t in figure.texts] + [t.get_text() for axes in figure.axes for t in axes.texts]


def overlap(figure: Figure) -> list[tuple[str, str]]:
    """Pairs of texts whose drawn boxes share more than a hair, and texts that leave the page."""
    renderer = FigureCanvasAgg(figure).get_renderer()
    figure.draw_without_rendering()
    shown = [*figure.texts]
    for axes in figure.axes:
        every = [*axes.texts, axes.xaxis.label, axes.yaxis.label]
        for other in axes.child_axes:
            every += [other.yaxis.label]
        shown += [t for t in every if t.get_text() and t.get_visible()]
    boxes = [(t.get_text(), t.get_window_extent(renderer)) for t in shown]
    page = figure.bbox
    found = [(t, "page") for t, b in boxes if b.x0 < 0 or b.y0 < 0 or b.x1 > page.x1 or b.y1 > page.y1]
    for i, (text, a) in enumerate(boxes):
        for other, b in boxes[i + 1 :]:
            wide = min(a.x1, b.x1) - max(a.x0, b.x0)
            tall = min(a.y1, b.y1) - max(a.y0, b.y0)
            if wide > 1.0 and tall > 2.0:
                found.append((text, other))
    return found


# What needs a case, travel or stated errors is looked at on solved cases.
OF_SOLVED = ("sketch", "energy", "lines", "trust")


@pytest.mark.parametrize("name", [name for name in FIGURES if name not in OF_SOLVED])
@pytest.mark.parametrize("make", MADE)
def test_every_figure_of_every_result_is_complete_and_clear(make: str, name: str):
    figure = draw(made(make), name)
    assert overlap(figure) == []
    assert figure.get_figwidth() <= 7.0
    assert figure.get_figheight() <= 10.0
    for axes in figure.axes:
        label = axes.get_ylabel()
        assert re.search(r"\[\S+\]$", label.replace("\n", " ")), label
        assert axes.get_lines()
    bottom = [axes for axes in figure.axes if axes.get_xlabel()]
    assert bottom
    for axes in bottom:
        assert "[" in axes.get_xlabel() or "units at the ticks" in axes.get_xlabel()


def test_the_overlap_check_sees_a_planted_overlap_and_a_text_off_the_page():
    figure = draw(made("plates_ramp"), "stress")
    axes = figure.axes[0]
    first = axes.texts[0]
    axes.text(*first.get_position(), "planted", transform=first.get_transform(), ha=first.get_ha(), va=first.get_va())
    figure.text(0.99, 0.5, "leaves the page")
    found = overlap(figure)
    assert (first.get_text(), "planted") in found
    assert ("leaves the page", "page") in found


def test_stress_shows_walls_peaks_breaks_and_the_hand_formula():
    result = made("plates_ramp")
    figure = draw(result, "stress")
    (upper,) = marked(figure, "wall_stress upper")
    np.testing.assert_allclose(upper.get_xydata(), np.column_stack([result.time, result.wall_stress[:, 1]]))
    (peak,) = marked(figure, "peak upper")
    assert peak.get_xydata()[0] == pytest.approx([0.05, result.walls.upper.peak_stress])
    assert {"lower", "upper", "\N{MINUS SIGN}1.511 Pa at 50 ms"} <= set(texts(figure))
    assert len(marked(figure, "quasi-steady")) == 2
    assert [line.get_xdata().tolist() for line in marked(figure, "break")] == [[0.05], [0.05]]
    assert figure.axes[0].get_xlim() == figure.axes[1].get_xlim()
    styles = {line.get_linestyle() for line in marked(figure, "wall_stress")}
    assert len(styles) == 2, "two walls must differ without colour"


def test_an_unbounded_stress_is_cut_and_said_and_its_nan_draws_nothing():
    figure = draw(made("sudden_start"), "stress")
    assert len(marked(figure, "unbounded upper")) == 1
    assert marked(figure, "peak upper") == []
    assert any("upper: unbounded at 0 s" in text and "K = 0.169 Pa·√s" in text for text in texts(figure))
    low, high = figure.axes[0].get_ylim()
    assert -3.0 < low < -1.0
    assert high < 1.0


def test_a_jump_later_than_the_start_says_its_time():
    result = made("sudden_start")
    when = float(result.time[400])
    stress = result.wall_stress.copy()
    stress[0], stress[400, 1] = 0.0, np.nan
    walls = {**result.summary["walls"], "upper": {**result.summary["walls"]["upper"], "peak_time": when}}
    other = changed(
        result, {**result.summary, "walls": walls}, wall_stress=Variable(("time", "wall"), stress, "Pa", "stress")
    )
    assert any("√(t \N{MINUS SIGN} " in text for text in texts(draw(other, "stress")))


def test_equal_stresses_on_both_walls_are_one_curve():
    figure = draw(made("pressed_plates"), "stress")
    assert len(marked(figure, "wall_stress")) == 1
    assert "both walls" in texts(figure)


def test_a_largest_value_that_is_the_final_one_has_no_time():
    figure = draw(made("plates_ramp"), "stress")
    assert "0.3757 Pa, no overshoot" in texts(figure)
    (mark,) = marked(figure, "peak lower")
    assert mark.get_xdata() == [1.0]


def test_a_peak_lost_on_the_axis_is_not_marked():
    figure = draw(made("oscillating"), "stress")
    assert len(marked(figure, "peak lower")) == 1
    assert marked(figure, "peak upper") == []


def test_only_what_drives_is_shown_as_drive():
    assert [a.get_ylabel().split("\n")[0] for a in draw(made("pressed_plates"), "stress").axes] == [
        "wall stress [mPa]",
        "pressure",
    ]
    assert [a.get_ylabel().split("\n")[0] for a in draw(made("rotating_sleeve"), "stress").axes][1:] == ["wall speed"]


def test_many_breaks_become_ticks_and_very_many_nothing():
    result = made("duty_cycle")
    assert verticals(draw(made("plates_ramp"), "stress")) == [50e-3, 50e-3]
    assert verticals(draw(result, "stress")) == []
    assert len(marked(draw(result, "stress"), "break")) == 2
    dense = Variable(("drive_break",), np.linspace(0, 16, 2000), "s", "breaks")
    assert marked(draw(changed(result, drive_break=dense), "stress"), "break") == []


def test_time_is_logarithmic_only_where_most_happens_early():
    assert draw(made("sudden_start"), "stress").axes[0].get_xscale() == "log"
    assert draw(made("rotating_sleeve"), "stress").axes[0].get_xscale() == "log"
    for name in ("plates_ramp", "oscillating", "film_over_long_run", "duty_cycle"):
        assert draw(made(name), "stress").axes[0].get_xscale() == "linear"


def test_a_signal_that_changes_early_makes_the_axis_logarithmic():
    time = np.linspace(0.0, 1.0, 1001)
    result = Result({"time": Variable(("time",), time, "s", "time")}, {}, "")
    assert span(result, [1 - np.exp(-time / 0.01)]).log
    assert not span(result, [1 - np.exp(-time / 0.2)]).log
    assert not span(result, [np.zeros_like(time)]).log


def test_profiles_are_labelled_at_the_curve_with_their_times():
    result = made("pipe_step")
    figure = draw(result, "profiles")
    curves = marked(figure, "profile")
    assert 4 <= len(curves) <= 8
    for curve in curves:
        time = float(curve.get_gid().split()[1])
        row = int(np.argmin(np.abs(result.profile_time - time)))
        drawn = dict(zip(curve.get_ydata(), curve.get_xdata(), strict=True))
        stored = [drawn[1e3 * y] for y in result.position]
        np.testing.assert_allclose(stored, 1e3 * result.velocity[row], atol=1e-12)
    assert "300 ms" in texts(figure)
    assert sum(text.endswith("ms") for text in texts(figure)) == len(curves)
    assert "axis" in texts(figure)
    assert figure.axes[0].get_xlabel() == "velocity [mm/s]   (positive: along +x)"


def test_between_stored_points_the_curve_is_smooth_and_level_at_an_axis():
    radius = np.linspace(0.0, 1.0, 13)
    fine = np.linspace(0.0, 1.0, 101)
    drawn = between(radius, 1 - radius**2, fine, mirrored=True)
    assert np.abs(drawn - (1 - fine**2)).max() < 2e-3
    assert abs(drawn[1] - drawn[0]) < 2e-4
    layer = np.where(radius > 0.95, 1.0, 0.0)
    steep = between(radius, layer, fine, mirrored=False)
    assert steep.min() >= 0.0
    assert steep.max() <= 1.0


def test_the_picture_of_a_swinging_flow_is_its_last_cycle():
    result = made("oscillating")
    chosen = instants(result.velocity, result.position)
    assert result.profile_time[chosen[0]] > 4.0 - 0.3
    assert any("last cycle" in text for text in texts(draw(result, "profiles")))


def test_chosen_profiles_differ_and_end_with_the_last():
    for name in MADE:
        result = made(name)
        chosen = instants(result.velocity, result.position)
        assert chosen[-1] == len(result.velocity) - 1
        assert len(chosen) <= 8
        for i, row in enumerate(chosen):
            for other in chosen[i + 1 :]:
                assert np.abs(result.velocity[row] - result.velocity[other]).max() > 0.02 * np.ptp(result.velocity)


def test_a_flow_that_does_not_change_has_one_profile():
    result = made("plates_ramp")
    assert instants(np.ones_like(result.velocity), result.position).tolist() == [119]
    assert instants(np.zeros_like(result.velocity), result.position).tolist() == [119]


def test_time_labels_are_short_and_differ():
    assert time_labels(np.array([0.0, 0.0253, 0.1066, 1.0])) == ["0 s", "25.3 ms", "107 ms", "1 s"]
    assert time_labels(np.array([100.01, 100.02])) == ["100.01 s", "100.02 s"]


def test_flow_rate_is_a_second_scale_of_the_mean_velocity():
    result = made("plates_ramp")
    figure = draw(result, "flow")
    (other,) = figure.axes[0].child_axes
    FigureCanvasAgg(figure).draw()
    assert other.get_ylabel() == "flow rate [cm³/s]"
    ratio = other.get_ylim()[1] / figure.axes[0].get_ylim()[1]
    assert ratio == pytest.approx(1e6 * 0.8e-3 * 25e-3, rel=1e-9)  # area of the section: height x width
    assert any(text.startswith("settled within 1 %") for text in texts(figure))


def test_reach_is_drawn_from_its_own_wall():
    result = made("pressed_plates")
    figure = draw(result, "reach")
    (lower,), (upper,) = marked(figure, "reach lower"), marked(figure, "reach upper")
    drawn = np.isfinite(lower.get_xdata())
    np.testing.assert_allclose(lower.get_ydata()[drawn] + upper.get_ydata()[drawn], 1.0)
    assert {"from lower", "from upper"} <= set(texts(figure))
    one = np.column_stack([np.zeros(len(result.time)), result.reach[:, 1]])
    figure = draw(changed(result, reach=Variable(("time", "wall"), one, "m", "reach")), "reach")
    assert marked(figure, "reach lower") == []
    for nothing in (0.0, np.nan):
        still = Variable(("time", "wall"), np.full((len(result.time), 2), nothing), "m", "reach")
        with pytest.raises(ResultError, match="no motion spreads"):
            draw(changed(result, reach=still), "reach")


def test_overview_holds_the_numbers_and_the_panels():
    figure = draw(made("plates_ramp"))
    assert len(figure.axes) == 4
    assert "settling: within 1 % after" in "".join(texts(figure))


def test_a_run_in_which_nothing_happens_is_drawn():
    result = made("plates_ramp")
    still = {
        name: Variable(v.dims, np.zeros_like(v.data), v.units, v.long_name)
        for name, v in result.variables.items()
        if v.units in ("Pa", "m/s", "m^3/s", "Pa/m")
    }
    for name in ("overview", "stress", "flow", "profiles"):
        assert overlap(draw(changed(result, {"title": "still"}, **still), name)) == []


@pytest.mark.parametrize("title", ["cost $5 and $6", "<b>&amp;</b>", "R^2_x \\frac", "\u8fd0\u52a8", ""])
def test_a_title_is_only_text(title: str, tmp_path: Path):
    result = plates_ramp()
    figure = draw(changed(result, {**result.summary, "title": title}), "flow")
    save(figure, tmp_path / "f.png")
    assert figure.texts[0].get_text() == title


SIGNATURES = [("png", b"\x89PNG"), ("svg", b"<?xml"), ("pdf", b"%PDF"), ("PNG", b"\x89PNG")]


@pytest.mark.parametrize(("ending", "signature"), SIGNATURES)
def test_files_of_each_kind_are_the_same_each_time(ending: str, signature: bytes, tmp_path: Path):
    result = made("film_over_long_run")
    for name in ("a", "b"):
        save(draw(result, "reach"), tmp_path / f"{name}.{ending}")
    raw = (tmp_path / f"a.{ending}").read_bytes()
    assert raw.startswith(signature)
    assert raw == (tmp_path / f"b.{ending}").read_bytes()
    assert sorted(path.name for path in tmp_path.iterdir()) == [f"a.{ending}", f"b.{ending}"]


@pytest.mark.parametrize(
    ("name", "words"),
    [("strss", "there is no figure 'strss'; did you mean 'stress'?"), ("zzz", "there is no figure 'zzz'; there are: ")],
)
def test_an_unknown_name_gets_the_nearest(name: str, words: str):
    with pytest.raises(ResultError, match=re.escape(words)):
        draw(made("plates_ramp"), name)


def test_what_cannot_be_drawn_is_one_line(tmp_path: Path):
    with pytest.raises(ResultError, match="this file holds a sweep"):
        draw(sweep(), "stress")
    with pytest.raises(ResultError, match="figure reach: this file holds no reach"):
        draw(changed(made("plates_ramp"), reach=None), "reach")
    figure = draw(made("plates_ramp"), "flow")
    with pytest.raises(ResultError, match=r"ends in \.png, \.svg or \.pdf"):
        save(figure, tmp_path / "f.docx")
    with pytest.raises(ResultError, match="cannot be written: no such file or directory"):
        save(figure, tmp_path / "none" / "f.png")
    assert list(tmp_path.iterdir()) == []


def test_a_users_own_settings_neither_matter_nor_change():
    matplotlib.rcParams["font.size"] = 30.0
    try:
        assert overlap(draw(made("plates_ramp"), "stress")) == []
        assert matplotlib.rcParams["font.size"] == 30.0
    finally:
        matplotlib.rcdefaults()


def test_matplotlib_waits_until_something_is_drawn():
    code = "import sys, transient.sheet.figures; sys.exit('matplotlib' in sys.modules)"
    assert subprocess.run([sys.executable, "-c", code], check=False).returncode == 0


def test_the_registry_and_the_default_agree():
    assert figures.DEFAULT in FIGURES
    assert all(FIGURES[name].__name__ == name for name in FIGURES)


def test_of_very_many_points_the_extremes_and_gaps_are_drawn():
    x = np.linspace(0.0, 1.0, 200_001)
    y = np.sin(40.0 * np.pi * x)
    y[77_777], y[123_456] = 3.0, np.nan
    kept_x, kept_y = thinned(x, y)
    assert len(kept_x) < 5000
    assert np.nanmax(kept_y) == 3.0
    assert np.isnan(kept_y).sum() == 1
    assert (kept_x[0], kept_x[-1]) == (0.0, 1.0)
    back = np.interp(x, kept_x[np.isfinite(kept_y)], kept_y[np.isfinite(kept_y)])
    assert np.abs(np.delete(back - y, range(77_500, 78_000)))[:90_000].max() < 2e-2
    few = x[:100]
    assert thinned(few, few)[0] is few


def test_spread_keeps_order_and_distance():
    places = spread(np.array([5.0, 5.0, 4.9, 50.0]), 10.0, 0.0, 100.0)
    assert np.all(np.diff(places[[2, 0, 1, 3]]) >= 10.0 - 1e-6)
    assert places.min() >= 0.0
    assert places.max() <= 100.0

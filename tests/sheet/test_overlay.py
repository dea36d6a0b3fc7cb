"""Two histories beside each other, and how they differ, against histories made by hand."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest
from test_figures import marked, overlap, texts

from transient.result.result import Result, ResultError, Variable
from transient.result.store import write
from transient.result.trace import Trace, difference, names, trace_of
from transient.sheet.measured import measured
from transient.sheet.overlay import overlay, says


def trace(time, value, label="a", sampled=False) -> Trace:
    return Trace("torque", "torque", label, "N*m", np.asarray(time, float), np.asarray(value, float), sampled)


def test_the_difference_of_a_parabola_and_its_chord():
    """t - t^2 between 0 and 1: largest 1/4 in the middle, mean square 1/30 (integrals by hand)."""
    t = np.linspace(0.0, 1.0, 2001)
    stated = difference(trace(t, t * t), trace([0.0, 1.0], [0.0, 1.0], "b"))
    assert stated.largest == pytest.approx(0.25, rel=1e-6)
    assert stated.when == pytest.approx(0.5)
    assert stated.rms == pytest.approx(np.sqrt(1.0 / 30.0), rel=1e-6)
    assert stated.peak == (1.0, 1.0)
    assert "25 % of the largest" in says(stated, "N*m")


def test_only_the_time_of_both_is_compared():
    stated = difference(trace([0.0, 2.0], [0.0, 2.0]), trace([1.0, 3.0], [1.5, 3.5], "b"))
    assert (stated.start, stated.end) == (1.0, 2.0)
    assert stated.largest == pytest.approx(0.5)
    assert stated.rms == pytest.approx(0.5)
    with pytest.raises(ResultError, match="a and b share no time"):
        difference(trace([0.0, 1.0], [0.0, 1.0]), trace([2.0, 3.0], [0.0, 1.0], "b"))


def test_samples_are_compared_where_they_were_taken():
    """Between two samples nothing is known: the corner of a triangle is no difference."""
    triangle = trace([0.0, 1.0, 2.0], [0.0, 1.0, 0.0])
    assert difference(triangle, trace([0.5, 1.5], [0.5, 0.5], "b", True)).largest == 0.0
    assert difference(triangle, trace([0.5, 1.5], [0.5, 0.5], "b")).largest == pytest.approx(-0.5)


def test_an_infinite_history_has_no_largest_difference():
    stated = difference(trace([0.0, 1.0, 2.0], [np.nan, 1.0, 0.5]), trace([0.0, 2.0], [0.0, 0.0], "b"))
    assert (stated.largest, stated.when, stated.rms) == (None, None, None)
    assert stated.peak == (None, 0.0)
    assert "becomes infinite" in says(stated, "Pa")


def test_histories_go_by_the_names_of_the_table(solved):
    result = solved("flow_cell")
    known = names(result)
    assert {"wall_stress upper", "wall_stress lower", "mean_velocity", "wall_force upper"} <= set(known)
    np.testing.assert_array_equal(trace_of(result, "wall_stress upper").value, result.wall_stress[:, 1])
    assert trace_of(solved("cold_oil_line"), "wall_stress").name == "wall_stress bore"
    with pytest.raises(ResultError, match="which wall"):
        trace_of(result, "wall_stress")
    with pytest.raises(ResultError, match="no history 'mean_velocty'; did you mean 'mean_velocity'"):
        trace_of(result, "mean_velocty")


def test_a_measurement_is_read_in_its_own_units(solved, tmp_path: Path):
    like = trace_of(solved("flow_cell"), "wall_stress upper")
    path = tmp_path / "rig.csv"
    path.write_text("# rig 3\nTime [ms];probe (mPa);room [degC]\n0;0;20\n25;-1000;20\n50;-1500;21\n", encoding="utf-8")
    found = measured(path, like, shift=1e-3)
    np.testing.assert_allclose(found.time, [1e-3, 26e-3, 51e-3])
    np.testing.assert_allclose(found.value, [0.0, -1.0, -1.5])
    assert found.sampled
    assert measured(path, like, "2").value[1] == pytest.approx(-1.0)
    assert measured(path, like, "probe [mPa]").value[1] == pytest.approx(-1.0)


@pytest.mark.parametrize(
    ("text", "column", "words"),
    [
        ("t [s],a [Pa],b [Pa]\n0,1,2\n1,1,2\n", None, r'which column\? choose one of "a \[Pa\]", "b \[Pa\]"'),
        ("t [s],a\n0,1\n1,1\n", None, r'column "a" needs its unit in the header, such as "a \[Pa\]"'),
        ("t [s],a [N]\n0,1\n1,1\n", None, "is the unit of a force; the unit of a pressure is needed"),
        ("t [s]\n0\n1\n", None, "two columns at least"),
        ("t [s],a [Pa]\n0,x\n", None, "is no number"),
        ("t [s],a [Pa]\n1,1\n0,1\n", None, "time goes back"),
        ("", None, "two columns at least"),
    ],
)
def test_a_measurement_that_cannot_be_read_is_one_line(solved, tmp_path: Path, text: str, column, words: str):
    path = tmp_path / "rig.csv"
    path.write_text(text, encoding="utf-8")
    with pytest.raises(ResultError, match=words) as caught:
        measured(path, trace_of(solved("flow_cell"), "wall_stress upper"), column)
    assert "\n" not in str(caught.value)


def test_what_is_no_file_or_no_text_is_refused(solved, tmp_path: Path):
    like = trace_of(solved("flow_cell"), "wall_stress upper")
    with pytest.raises(ResultError, match="there is no such file"):
        measured(tmp_path / "none.csv", like)
    (tmp_path / "binary.csv").write_bytes(b"\xff\xfe\x00\x81")
    with pytest.raises(ResultError, match="is not a text file"):
        measured(tmp_path / "binary.csv", like)


def test_the_figure_states_what_differs(solved, tmp_path: Path):
    first, second = solved("flow_cell"), solved("sudden_start")
    figure = overlay(first, second, "wall_stress lower")
    assert overlap(figure) == []
    stated = difference(trace_of(first, "wall_stress lower"), trace_of(second, "wall_stress lower"))
    assert any(says(stated, "Pa") in text for text in texts(figure))
    (line,) = marked(figure, "difference")
    assert np.nanmax(line.get_ydata()) == pytest.approx(1e3 * stated.largest)  # drawn in mPa
    write(second, tmp_path / "other.h5")
    again = overlay(first, tmp_path / "other.h5", "wall_stress lower")
    assert len(marked(again, "trace")) == 2


def test_a_measurement_is_drawn_as_points(solved, tmp_path: Path):
    result = solved("flow_cell")
    time = np.linspace(0.0, 0.7, 40)
    stress = 1.03 * np.interp(time, result.time, result.wall_stress[:, 1])
    rows = "".join(f"{t!r},{v!r}\n" for t, v in zip(time.tolist(), stress.tolist(), strict=True))
    (tmp_path / "rig.csv").write_text(f"time [s],stress [Pa]\n{rows}", encoding="utf-8")
    figure = overlay(result, tmp_path / "rig.csv")
    assert overlap(figure) == []
    (points,) = marked(figure, "trace 1")
    assert points.get_linestyle() == "None"
    assert any("3 % of the largest" in text for text in texts(figure))


def test_an_infinite_stress_does_not_press_the_rest_flat(solved):
    figure = overlay(solved("flow_cell"), solved("sudden_start"), "wall_stress upper")
    low, high = figure.axes[0].get_ylim()
    assert high - low < 4.0
    assert overlap(figure) == []
    assert any("unbounded (dashed)" in text for text in texts(figure))


def test_quantities_of_other_units_do_not_compare():
    other = Trace("mean_velocity", "mean velocity", "b", "m/s", np.array([0.0, 1.0]), np.array([0.0, 1.0]))
    with pytest.raises(ResultError, match=r"b is in m/s, a in N\*m"):
        difference(trace([0.0, 1.0], [0.0, 1.0]), other)


def test_a_result_without_histories_has_nothing_to_compare():
    bare = Result({"x": Variable(("x",), np.arange(3.0), "m", "x")}, {}, "")
    with pytest.raises(ResultError, match="no histories to compare"):
        overlay(bare, bare)

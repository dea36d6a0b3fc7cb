"""The figure of the walls' motion: what is drawn, from results with and without bodies."""

from __future__ import annotations

import numpy as np
import pytest
from made import MADE
from test_figures import changed, marked, overlap, texts

from transient.result.result import Result, Variable
from transient.sheet.figures import draw

BY_WALL = ("time", "wall")


def carriage(pressure: bool = False, infinite: bool = False) -> Result:
    """A wall brought up to speed as if a body carried it, with loads of its own."""
    result = MADE["plates_ramp"]()
    time, speed = result.time, result.wall_speed
    film = -0.02 * result.wall_stress
    film[:, 0] = 0.0
    if infinite:
        film[0, 1] = np.nan
    drive = np.zeros_like(film)
    drive[:, 1] = 0.04 + 0.5 * speed[:, 1]
    place = np.concatenate([np.zeros((1, 2)), np.cumsum(np.diff(time)[:, None] * 0.5 * (speed[1:] + speed[:-1]), 0)])
    more = {
        "wall_position": Variable(BY_WALL, place, "m", "displacement of the wall"),
        "drive_load": Variable(BY_WALL, drive, "N", "drive"),
        "wall_force": Variable(BY_WALL, film, "N", "film"),
    }
    if pressure:
        more["pressure_load"] = Variable(BY_WALL, -0.5 * drive, "N", "pressure")
    half = float(time[len(time) // 2])
    body = {
        "terminal_speed": float(speed[-1, 1]), "speed_settling_time": half,
        "coast_down": {"begins": 0.0, "time": half, "distance": 0.01, "within": 0.01},
    }  # fmt: skip
    return changed(result, {**result.summary, "bodies": {"upper": body}}, **more)


@pytest.mark.parametrize("options", [{}, {"pressure": True}, {"infinite": True}])
def test_the_figure_is_complete_and_clear(options):
    figure = draw(carriage(**options), "motion")
    assert len(figure.axes) == 5
    assert overlap(figure) == []
    assert [axes.get_ylabel().split("[")[0].split()[-1] for axes in figure.axes] == [
        "speed", "position", "force", "power", "work"
    ]  # fmt: skip


def test_drive_and_film_are_drawn_apart_with_their_powers(monkeypatch):
    monkeypatch.setattr("transient.sheet.labels.MOST_POINTS", 10**6)
    result = carriage()
    figure = draw(result, "motion")
    for kind, load in (("drive", result.drive_load), ("film", result.wall_force)):
        (force,) = marked(figure, f"force {kind}")
        (power,) = marked(figure, f"power {kind}")
        unit = force.get_ydata()[-1] / load[-1, 1]  # the axis' prefix
        np.testing.assert_allclose(force.get_ydata(), unit * load[:, 1], rtol=1e-12)
        watts = (load * result.wall_speed)[:, 1]
        np.testing.assert_allclose(power.get_ydata()[::8] / power.get_ydata()[-1], watts / watts[-1], rtol=1e-9)
    drive, film = (marked(figure, f"force {kind}")[0] for kind in ("drive", "film"))
    assert drive.get_linestyle() != film.get_linestyle()
    assert drive.get_color() != film.get_color()


def test_work_is_the_integral_of_the_power():
    result = carriage()
    (work,) = marked(draw(result, "motion"), "work drive")
    fine = np.linspace(result.time[0], result.time[-1], 200001)
    load, speed = (np.interp(fine, result.time, data[:, 1]) for data in (result.drive_load, result.wall_speed))
    ratio = work.get_ydata()[-1] / np.trapezoid(load * speed, fine)
    assert np.log10(ratio) == pytest.approx(round(np.log10(ratio)), abs=2e-3)  # a prefix


def test_settling_terminal_speed_and_coasting_are_said():
    figure = draw(carriage(), "motion")
    assert marked(figure, "terminal")
    assert marked(figure, "settled")
    assert marked(figure, "coasted")
    assert any("settled at" in text and "towards" in text for text in texts(figure))
    assert any("coasted 10 mm" in text for text in texts(figure))


def test_an_infinite_film_load_does_not_press_the_rest_flat():
    figure = draw(carriage(infinite=True), "motion")
    low, high = figure.axes[2].get_ylim()
    (drive,) = marked(figure, "force drive")
    assert np.ptp(drive.get_ydata()) > 0.1 * (high - low)


def test_a_prescribed_wall_shows_what_its_motion_asks_for():
    result = changed(carriage(), {}, drive_load=None, wall_position=None)
    figure = draw(result, "motion")
    assert len(figure.axes) == 4
    drive, film = (marked(figure, f"force {kind}")[0].get_ydata() for kind in ("drive", "film"))
    np.testing.assert_array_equal(drive, -film)
    assert any("what the film asks for" in text for text in texts(figure))

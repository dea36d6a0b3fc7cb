"""A case as numbers: what each section becomes in SI, and the text that reads back to the same case."""

from __future__ import annotations

import math
import pickle
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from transient.case.model import Case
from transient.case.read import read_case

SPEED = 'speed = { kind = "ramp", to = "0.30 m/s", over = "50 ms" }'
AT = np.array([0.0, 0.025, 1.0])


def small(**sections: object) -> Case:
    """A case from a dict."""
    tree = {
        "gap": {"shape": "plates", "height": "1 mm"},
        "fluid": {"density": "1000 kg/m^3", "viscosity": "2 mPa*s"},
        "run": {"duration": "1 s"},
        **sections,
    }
    return Case(tree)


def test_the_carriage_in_numbers(read: Callable[..., Case]) -> None:
    problem = read().problem()
    assert (problem.shape, problem.metric, problem.inner, problem.outer) == ("plates", 0, 0.0, 0.0002)
    assert (problem.density, problem.viscosity, problem.count) == (870.0, 0.04, 1)
    assert [wall.name for wall in problem.walls] == ["lower", "upper"]
    assert problem.walls[0].area == pytest.approx(60e-3 * 25e-3, rel=1e-15)
    assert problem.section == pytest.approx(0.2e-3 * 25e-3, rel=1e-15)
    assert problem.speeds[1].pieces(2.0).value(AT) == pytest.approx([0.0, 0.15, 0.3], rel=1e-14)
    assert not problem.speeds[0].pieces(2.0).value(AT).any()
    assert (problem.start, problem.duration, problem.settle_within, problem.accuracy) == ("rest", None, 0.01, 0.001)
    assert (problem.profiles, problem.profile_times) == (120, None)


def test_kinematic_viscosity_times_density() -> None:
    case = small(fluid={"density": "850 kg/m^3", "kinematic_viscosity": "46 cSt"})
    assert case.problem().viscosity == pytest.approx(0.0391, rel=1e-15)


def test_a_bare_quantity_starts_suddenly_or_has_always_been() -> None:
    walls = {"upper": {"speed": "0.3 m/s"}}
    rest, steady = (small(wall=walls, start={"state": state}).problem().speeds[1] for state in ("rest", "steady"))
    assert (rest.before, steady.before) == (0.0, 0.3)
    assert rest.pieces(1.0).jumps(0).tolist() == [0.3]
    assert steady.pieces(1.0).jumps(0).tolist() == [0.0]


def test_a_drop_is_spread_over_the_length() -> None:
    gap = {"shape": "pipe", "diameter": "8 mm", "length": "4 m"}
    drop = small(gap=gap, pressure={"drop": "2 kPa"}).problem().gradient
    slope = small(gap=gap, pressure={"drop_per_length": "0.5 kPa/m"}).problem().gradient
    assert drop.pieces(1.0).value(AT).tolist() == slope.pieces(1.0).value(AT).tolist() == [500.0] * 3


@pytest.mark.parametrize(
    ("kind", "value_at_end"),
    [
        ({"kind": "step", "to": "2 m/s", "at": "10 ms"}, 2.0),
        ({"kind": "ramp", "to": "2 m/s", "over": "10 ms", "from": "1 m/s"}, 2.0),
        ({"kind": "smooth_ramp", "to": "2 m/s", "over": "10 ms"}, 2.0),
        ({"kind": "s_curve", "to": "2 m/s", "acceleration": "200 m/s^2", "jerk": "1e5 m/s^3"}, 2.0),
        ({"kind": "trapezoid", "to": "2 m/s", "rise": "1 ms", "hold": "1 ms", "fall": "1 ms"}, 0.0),
        ({"kind": "lag", "to": "2 m/s", "time_constant": "1 ms"}, 2.0),
        ({"kind": "sine", "amplitude": "2 m/s", "frequency": "1 Hz", "phase": "90 deg"}, 2.0),
        ({"kind": "sine", "amplitude": "2 m/s", "period": "1 s", "phase": "90 deg"}, 2.0),
        ({"kind": "half_sine", "amplitude": "2 m/s", "over": "10 ms"}, 0.0),
        ({"kind": "table", "times": [0, 1], "values": [0, 2000], "time_unit": "s", "unit": "mm/s"}, 2.0),
        ({"kind": "sum", "parts": ["1 m/s", {"kind": "step", "to": "1 m/s"}]}, 2.0),
        (
            {"kind": "repeat", "part": {"kind": "ramp", "to": "2 m/s", "over": "1 ms"}, "every": "10 ms", "times": 3},
            2.0,
        ),
    ],
)
def test_every_history_kind_is_read(kind: dict[str, object], value_at_end: float) -> None:
    case = small(wall={"upper": {"speed": kind}})
    assert case.problem().speeds[1].pieces(2.0).value(np.array([1.0])) == pytest.approx([value_at_end], abs=1e-12)
    assert read_text(case) == case


def read_text(case: Case) -> Case:
    """The case from its own text."""
    import tomllib

    return Case(tomllib.loads(case.text()))


def test_values_take_the_dimension_of_their_place() -> None:
    gap = {"shape": "annulus", "motion": "rotating", "inner_radius": "20 mm", "radial_clearance": "1 mm"}
    ramp = {"kind": "s_curve", "to": "600 rpm", "acceleration": "100 rpm/s", "jerk": "1000 rad/s^3"}
    case = small(gap=gap, wall={"inner": {"speed": ramp}}, run={"duration": "20 s"})
    values = {one.key: (one.value, one.unit) for one in case.inputs()}
    assert values["wall.inner.speed.to"] == (pytest.approx(20 * math.pi), "rad/s")
    assert values["wall.inner.speed.acceleration"] == (pytest.approx(100 * math.pi / 30), "rad/s^2")
    assert values["wall.inner.speed.jerk"] == (1000.0, "rad/s^3")
    assert case.problem().rotating


def test_the_echo_has_every_key_as_typed(read: Callable[..., Case]) -> None:
    rows = [tuple(row) for row in read().inputs()]
    assert rows == [
        ("gap.shape", "plates", None, ""),
        ("gap.height", "0.2 mm", 0.0002, "m"),
        ("gap.length", "60 mm", 0.06, "m"),
        ("gap.width", "25 mm", 0.025, "m"),
        ("fluid.density", "870 kg/m^3", 870.0, "kg/m^3"),
        ("fluid.viscosity", "40 mPa*s", 0.04, "Pa*s"),
        ("wall.upper.speed.kind", "ramp", None, ""),
        ("wall.upper.speed.to", "0.30 m/s", 0.3, "m/s"),
        ("wall.upper.speed.over", "50 ms", 0.05, "s"),
        ("run.duration", "auto", None, ""),
    ]


def test_the_text_reads_back(read: Callable[..., Case], write: Callable[..., str]) -> None:
    case = read(more='profile_times = ["1 s", "0 s"]\n[start]\nstate = "steady"\n')
    again = read_case(write(case.text(), "again.toml"))
    assert again == case
    assert again.text() == case.text()
    assert again.run.profile_times == (0.0, 1.0)
    assert hash(again) == hash(case)


def test_a_title_is_the_file_name_where_none_is_given(read: Callable[..., Case]) -> None:
    case = read({'title = "Carriage on a film"': ""})
    assert case.title == "carriage"
    assert read_text(case).title == "carriage"


def test_a_case_travels_to_other_processes(read: Callable[..., Case]) -> None:
    case = read()
    assert pickle.loads(pickle.dumps(case)) == case


def test_line_ends_and_byte_order_mark(read: Callable[..., Case], tmp_path: Path) -> None:
    case = read()
    text = (tmp_path / "carriage.toml").read_text()
    (tmp_path / "dos.toml").write_bytes(b"\xef\xbb\xbf" + text.replace("\n", "\r\n").encode())
    assert read_case(tmp_path / "dos.toml") == case

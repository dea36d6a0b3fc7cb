"""Keys set from outside the file."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
import pytest

from transient.case.model import Case
from transient.case.override import parse_value
from transient.case.source import CaseError

F = "carriage.toml"
SPEED = 'speed = { kind = "ramp", to = "0.30 m/s", over = "50 ms" }'


@pytest.mark.parametrize(
    "text", ['gap.height="0.5 mm"', "gap.height=0.5 mm", "gap.height='0.5 mm'", "gap . height = 0.5 mm "]
)
def test_a_size_is_set(read: Callable[..., Case], text: str) -> None:
    assert read(overrides=(text,)).problem().outer == 0.0005


def test_pairs_are_taken_as_well(read: Callable[..., Case]) -> None:
    assert read(overrides=(("gap.height", "0.5 mm"),)).problem().outer == 0.0005  # type: ignore[arg-type]


def test_inside_an_inline_table(read: Callable[..., Case]) -> None:
    case = read(overrides=("wall.upper.speed.over=20 ms", "wall.upper.speed.to=1 m/s"))
    assert case.problem().speeds[1].pieces(1.0).value(np.array([0.01, 0.02])) == pytest.approx([0.5, 1.0])


def test_tables_appear_where_needed(read: Callable[..., Case]) -> None:
    case = read(overrides=("wall.lower.speed=-1 m/s", "run.accuracy=1 %", 'start.state="steady"'))
    assert case.problem().speeds[0].before == -1.0
    assert case.problem().accuracy == 0.01


def test_items_of_a_list_count_from_one(read: Callable[..., Case]) -> None:
    case = read(
        {SPEED: 'speed = { kind = "sum", parts = ["1 m/s", "2 m/s"] }'}, overrides=("wall.upper.speed.parts.2=5 m/s",)
    )
    assert case.problem().speeds[1].pieces(1.0).value(np.array([1.0])) == pytest.approx([6.0])


@pytest.mark.parametrize(
    ("text", "value"),
    [("3", 3), ("true", True), ("[1, 2]", [1, 2]), ("{ a = 1 }", {"a": 1}), ("0.5 mm", "0.5 mm"),
     ('"x"', "x"), ("", ""),
     ("1\nextra = 2", "1\nextra = 2")],
)  # fmt: skip
def test_values_are_toml_or_text(text: str, value: object) -> None:
    assert parse_value(text) == value


@pytest.mark.parametrize(
    ("override", "message"),
    [
        ("gap.height=0.2 kg", '--set gap.height: "0.2 kg" is a mass; a length is needed, such as "0.2 mm"'),
        ("gap.heigth=0.2 mm", '--set gap.heigth: unknown key; did you mean "height"?'),
        ("gap.height=0.2", '--set gap.height: 0.2 has no unit; a length is needed, such as "0.2 mm"'),
        ("gap.height.x=1", '--set gap.height.x: gap.height is "0.2 mm", which has no keys'),
        ("wall.upper.speed.over=2 kg",
         '--set wall.upper.speed.over: "2 kg" is a mass; a time is needed, such as "2 ms"'),
        ("wall.upper.speed={ kind = 'sum', parts = ['2 kg'] }",
         '--set wall.upper.speed: wall.upper.speed.parts.1: "2 kg" is a mass; a speed is needed, such as "2 m/s"'),
        ("wall.top.speed=1 m/s",
         '--set wall.top.speed: wall.top: "top" is no wall of this shape; known here: lower, upper'),
        ("gap..height=1", '--set gap..height: "gap..height" is no key; a dotted key is needed, such as gap.height'),
        ("gap.radius=1 mm", "--set gap.radius: unknown key; known here: shape, height, length, width, count"),
        ("run.profiles=0",
         "--set run.profiles: 0 is no whole number from 2 to 100000; one is needed, such as 120"),
    ],
)  # fmt: skip
def test_refusals_name_the_option(refusal: Callable[..., str], override: str, message: str) -> None:
    assert refusal(overrides=(override,)) == f"{F}: {message}"


def test_replace_gives_a_new_case(read: Callable[..., Case]) -> None:
    case = read()
    assert case.replace({"gap.height": "0.5 mm"}) == case.replace(gap__height="0.5 mm") != case
    assert case.replace({"gap.height": "0.5 mm"}).problem().outer == 0.0005
    assert case.replace(title="Another").title == "Another"
    assert case.problem().outer == 0.0002
    with pytest.raises(CaseError) as caught:
        case.replace({"gap.height": "2 kg"})
    assert str(caught.value) == f'{F}: gap.height: "2 kg" is a mass; a length is needed, such as "2 mm"'

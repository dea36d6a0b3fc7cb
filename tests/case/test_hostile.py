"""Whatever a file holds, it is read or refused with one line: nothing else is ever raised."""

from __future__ import annotations

import random
from collections.abc import Callable
from pathlib import Path

import pytest

from transient.case.read import CaseError, read_case

CASES = sorted((Path(__file__).parents[2] / "cases").glob("*.toml"))
TOKENS = [
    '"', "'", "[", "]", "{", "}", "=", ",", ".", "#", "\n", "-", "0", "1e999", "nan", "true", "2020-01-01", "12:00:00",
    '"1 m"', '"-1 s"', '"0 Pa"', "[]", "{}", '"""', "\\", "é", "kind", '"repeat"', "9" * 30, "\x1b[31m", "\u2028",
]  # fmt: skip


def read_or_refuse(name: str) -> bool:
    """Whether a file is taken; its refusal is one printable line."""
    try:
        read_case(name)
    except CaseError as error:
        message = str(error)
        assert message.isprintable(), message
        assert message.startswith(name), message
        return False
    return True


@pytest.mark.parametrize("path", CASES, ids=lambda path: path.stem)
def test_spoilt_cases(path: Path, write: Callable[..., str]) -> None:
    random.seed(path.stem)
    text = path.read_text(encoding="utf-8")
    for table in path.parent.glob("*.csv"):
        write(table.read_bytes(), table.name)
    taken = 0
    for _ in range(120):
        at = random.randrange(len(text))
        spoilt = text[:at] + random.choice(TOKENS) + text[at + random.choice([0, 0, 1, 8]) :]
        taken += read_or_refuse(write(spoilt, "spoilt.toml"))
    assert 0 < taken < 120


@pytest.mark.parametrize(
    "line",
    [
        "height = " + "9" * 400,
        "height = " + "9" * 5000,
        "height = 2020-01-01",
        "height = 2020-01-01T00:00:00Z",
        "height = [[[1]]]",
        "height = {a = {b = 1}}",
        '"hei\\nght" = 1',
        '"\\u001b[31m" = 1',
        'height = "\\u001b[31m"',
        'height = "1\\n2 mm"',
        'height = "' + "9" * 5000 + ' mm"',
        "count = " + "9" * 400,
        "count = true",
        "shape = 3",
        'shape = ["plates"]',
    ],
    ids=lambda line: line[:24],
)
def test_odd_values(refusal: Callable[..., str], line: str) -> None:
    old = 'shape = "plates"' if line.startswith("shape") else 'height = "0.2 mm"'
    message = refusal({old: line})
    assert message.isprintable()
    assert len(message) < 300


@pytest.mark.parametrize(
    "key", ["run.accuracy", "run.settle_within", "run.duration", "wall.upper.speed", "run.profile_times"]
)
@pytest.mark.parametrize("value", ["9" * 400, "9" * 5000, "2020-01-01", "[1]", "{}", "true", "-0.0", '""'])
def test_odd_overrides(refusal: Callable[..., str], key: str, value: str) -> None:
    assert refusal(overrides=(f"{key}={value}",)).isprintable()


@pytest.mark.parametrize("values", ["[0, " + "9" * 400 + "]", "[0, 1e400]", "[0, true]", "[[0], 1]", "[0, 2020-01-01]"])
def test_odd_lists(refusal: Callable[..., str], values: str) -> None:
    text = f'speed = {{ kind = "table", times = [0, 1], values = {values}, time_unit = "s", unit = "m/s" }}'
    message = refusal({'speed = { kind = "ramp", to = "0.30 m/s", over = "50 ms" }': text})
    assert "values" in message


def test_deep_histories(write: Callable[..., str]) -> None:
    """Histories in histories, deeper than anyone writes: read, or refused in words."""
    text = '[gap]\nshape = "plates"\nheight = "1 mm"\n[fluid]\ndensity = "1 kg/L"\nviscosity = "1 cP"\n'
    text += "[wall.upper]\nspeed = "
    for depth in (20, 2000):
        nested = '{ kind = "sum", parts = [' * depth + '"1 m/s"' + "] }" * depth
        assert read_or_refuse(write(text + nested + "\n", "deep.toml")) == (depth < 100)

"""A small valid case to spoil, and the ways to read it."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from transient.case import later
from transient.case.model import Case
from transient.case.read import CaseError, read_case

CARRIAGE = """\
title = "Carriage on a film"

[gap]
shape = "plates"


height = "0.2 mm"
length = "60 mm"
width = "25 mm"

[fluid]
density = "870 kg/m^3"
viscosity = "40 mPa*s"

[wall.upper]
speed = { kind = "ramp", to = "0.30 m/s", over = "50 ms" }

[run]
duration = "auto"
"""


@pytest.fixture
def write(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Callable[..., str]:
    """Write files into the working folder; returns the last name."""
    monkeypatch.chdir(tmp_path)

    def _write(text: str | bytes, name: str = "carriage.toml") -> str:
        (tmp_path / name).write_bytes(text if isinstance(text, bytes) else text.encode())
        return name

    return _write


@pytest.fixture
def read(write: Callable[..., str]) -> Callable[..., Case]:
    """Read the carriage with lines exchanged: ``read({"old": "new"}, more_text)``."""

    def _read(exchange: dict[str, str] | None = None, more: str = "", overrides: tuple[str, ...] = ()) -> Case:
        text = CARRIAGE
        for old, new in (exchange or {}).items():
            assert old in text, f"{old!r} is not in the case to spoil"
            text = text.replace(old, new, 1)
        return read_case(write(text + more), overrides)

    return _read


@pytest.fixture
def refusal(read: Callable[..., Case]) -> Callable[..., str]:
    """The message with which the spoilt carriage is refused."""

    def _refusal(exchange: dict[str, str] | None = None, more: str = "", overrides: tuple[str, ...] = ()) -> str:
        with pytest.raises(CaseError) as caught:
            read(exchange, more, overrides)
        message = str(caught.value)
        assert "\n" not in message
        return message

    return _refusal


@pytest.fixture
def everything(monkeypatch: pytest.MonkeyPatch) -> None:
    """Let through what is read already and solved later."""
    monkeypatch.setattr(later, "LATER", {})

"""A command line called in this process, with what it printed."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import pytest

from transient.cli import main


@dataclass(frozen=True)
class Said:
    """Exit status, standard output and standard error of one call."""

    status: int
    out: str
    err: str


@pytest.fixture
def call(capsys: pytest.CaptureFixture[str]) -> Callable[..., Said]:
    """``call("run", "a.toml")``: the command line without its own process."""

    def once(*arguments: object) -> Said:
        capsys.readouterr()
        status = main([str(argument) for argument in arguments])
        captured = capsys.readouterr()
        return Said(status, captured.out, captured.err)

    return once

"""A command line called in this process, with what it printed."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest

from transient.cli import main

CASES = Path(__file__).resolve().parents[2] / "cases"


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


@pytest.fixture(scope="session")
def finished(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The result file of the README's case, solved once for all tests that only read it."""
    folder = tmp_path_factory.mktemp("finished")
    assert main(["run", str(CASES / "flow_cell.toml"), "--quiet", "--out", str(folder)]) == 0
    return folder / "flow_cell.h5"

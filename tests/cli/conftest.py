"""A command line called in this process, with what it printed."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest

from transient.cli import main

COMPILING = "first run: preparing the compiled solver"
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
        # whichever test comes first in a fresh checkout finds the compiler at work, and is told so
        lines = captured.err.splitlines(keepends=True)
        return Said(status, captured.out, "".join(line for line in lines if not line.startswith(COMPILING)))

    return once


@pytest.fixture(scope="session")
def finished(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """The result file of the README's case, solved once for all tests that only read it."""
    folder = tmp_path_factory.mktemp("finished")
    assert main(["run", str(CASES / "flow_cell.toml"), "--quiet", "--out", str(folder)]) == 0
    return folder / "flow_cell.h5"

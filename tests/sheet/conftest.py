"""The made results serve here too, and cases of our own, solved once."""

from __future__ import annotations

import sys
from collections.abc import Callable
from functools import lru_cache
from pathlib import Path

import pytest

from transient.answer import run
from transient.case.read import read_case
from transient.result.result import Result
from transient.result.store import read, write

sys.path.insert(0, str(Path(__file__).parents[1] / "result"))

CASES = Path(__file__).parents[2] / "cases"


@pytest.fixture(scope="session")
def solved(tmp_path_factory: pytest.TempPathFactory) -> Callable[[str], Result]:
    """The result of a case in ``cases/``, as it comes back from its file."""
    folder = tmp_path_factory.mktemp("solved")

    @lru_cache
    def result(name: str) -> Result:
        path = folder / f"{name}.h5"
        write(run(read_case(CASES / f"{name}.toml")), path)
        return read(path)

    return result

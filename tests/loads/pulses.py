"""Results whose load history is a given one, written to a file as a run would leave it."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import numpy as np

from transient.cli import main
from transient.result.result import Result, Variable
from transient.result.store import write


def forced(
    time: np.ndarray | list[float],
    force: np.ndarray | list[float],
    start: str = "rest",
    variable: str = "wall_force",
    unit: str = "N",
    **summary: Any,
) -> Result:
    """A result whose upper wall carries ``force`` (n,) at ``time`` (n,), its lower wall nothing."""
    time, force = np.asarray(time, float), np.asarray(force, float)
    variables = {
        "time": Variable(("time",), time, "s", "time"),
        "wall": Variable(("wall",), np.array(["lower", "upper"]), "1", "wall"),
        variable: Variable(("time", "wall"), np.stack([0.0 * np.nan_to_num(force), force], axis=1), unit, "load"),
    }
    return Result(variables, {"title": "Made load", **summary}, f'[start]\nstate = "{start}"\n', {"title": "Made load"})


def measured(capsys: Any, folder: Path, result: Result, *options: str, every: str = "10 ms") -> dict[str, Any]:
    """What ``transient loads --json`` prints for the upper wall of ``result``: the whole path, file included."""
    path = folder / "made.h5"
    write(result, path)
    capsys.readouterr()
    status = main(["loads", str(path), "--wall", "upper", "--every", every, "--json", *options])
    said = capsys.readouterr()
    assert status == 0, said.err
    return json.loads(said.out)

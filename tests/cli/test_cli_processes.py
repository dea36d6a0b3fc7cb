"""Whole processes: what a compile cache shared by several, or one that cannot be written, does to a run."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

from transient.cli.progress import Bar, announce_compiling

HOUSE = Path(__file__).resolve().parents[2]
# A small kernel, compiled as the solver's is: the solver itself would take too long for a test of the cache.
KERNEL = """
import numpy as np
from transient.compiled import compiled

@compiled
def total(values):
    out = 0.0
    for i in range(len(values)):
        out += values[i]
    return out

print(total(np.arange(10.0)))
"""


def started(folder: Path, cache: Path, *command: str) -> subprocess.Popen[str]:
    """A process whose compile cache is ``cache``."""
    environment = {**os.environ, "NUMBA_CACHE_DIR": str(cache), "PYTHONPATH": str(folder)}
    return subprocess.Popen(
        [sys.executable, *command],
        env=environment,
        cwd=HOUSE,
        text=True,
        stdout=subprocess.PIPE,
        stderr=subprocess.PIPE,
    )


def test_processes_that_fill_one_compile_cache_at_once_do_not_harm_each_other(tmp_path):
    (tmp_path / "small.py").write_text(KERNEL, encoding="utf-8")
    cache = tmp_path / "cache"
    for _ in range(2):
        processes = [started(tmp_path, cache, "-c", "import small") for _ in range(2)]
        for process in processes:
            out, err = process.communicate(timeout=120)
            assert (process.returncode, out, err) == (0, "45.0\n", "")
    assert len(list(cache.rglob("*.nbi"))) == 1


def test_a_compile_cache_that_cannot_be_written_does_no_harm(tmp_path):
    (tmp_path / "small.py").write_text(KERNEL, encoding="utf-8")
    (tmp_path / "cache").write_text("a file, no folder", encoding="utf-8")
    process = started(tmp_path, tmp_path / "cache" / "deeper", "-c", "import small")
    out, err = process.communicate(timeout=120)
    assert (process.returncode, out) == (0, "45.0\n")
    assert "Traceback" not in err


def test_two_runs_at_once_both_succeed(tmp_path):
    command = ("-m", "transient", "run", "cases/flow_cell.toml", "--json", "--out")
    processes = [
        subprocess.Popen(
            [sys.executable, *command, str(tmp_path / "same")], cwd=HOUSE, text=True, stdout=subprocess.PIPE
        )
        for _ in range(2)
    ]
    said = [json.loads(process.communicate(timeout=300)[0]) for process in processes]
    assert [process.returncode for process in processes] == [0, 0]
    for part in ("settling", "walls", "flow"):
        assert said[0][part] == said[1][part]
    assert [path.name for path in (tmp_path / "same").iterdir()] == ["flow_cell.h5"]


def test_compiling_is_announced_once_and_only_when_it_happens(capsys, monkeypatch):
    import numba

    monkeypatch.setattr("transient.cli.progress._SAID", [])  # as in a process that has said nothing yet
    announce_compiling(Bar())
    assert capsys.readouterr().err == ""
    for factor in (2.0, 3.0):
        numba.njit(lambda x, factor=factor: factor * x)(1.0)
    assert capsys.readouterr().err == "first run: preparing the compiled solver, once, about 15 s\n"


def test_a_run_loads_nothing_that_it_does_not_need(tmp_path):
    # Start-up is what a user waits for most: each of these costs a tenth of a second and more.
    heavy = ("matplotlib", "scipy.optimize", "scipy.interpolate", "xarray", "rich", "jinja2")
    code = (
        "import sys; from transient.cli import main; "
        f"main(['run', 'cases/flow_cell.toml', '--quiet', '--out', {str(tmp_path)!r}]); "
        f"print([name for name in {heavy!r} if name in sys.modules])"
    )
    ended = subprocess.run([sys.executable, "-c", code], cwd=HOUSE, text=True, capture_output=True, check=True)
    assert ended.stdout == "[]\n"

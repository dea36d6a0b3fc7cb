"""The whole process of ``transient run`` beside the bare import of what it stands on, in one run.

python tests/benchmarks/process.py [case file] [repeats]
"""

from __future__ import annotations

import os
import statistics
import subprocess
import sys
import tempfile
import time
from pathlib import Path

HOUSE = Path(__file__).resolve().parents[2]
# As on a user's machine, where compiled modules are kept.
PLAIN = {name: value for name, value in os.environ.items() if name != "PYTHONDONTWRITEBYTECODE"}
IMPORTS = "import numpy, scipy.special, numba, h5py, pint, pydantic, typer"


def once(command: list[str]) -> tuple[float, float]:
    """Wall-clock seconds and peak memory (MB) of one process."""
    began = time.perf_counter()
    process = subprocess.Popen(command, stdout=subprocess.DEVNULL, stderr=subprocess.DEVNULL, cwd=HOUSE, env=PLAIN)
    _, status, usage = os.wait4(process.pid, 0)
    seconds = time.perf_counter() - began
    if os.waitstatus_to_exitcode(status) != 0:
        raise SystemExit(f"{' '.join(command)} ended with status {os.waitstatus_to_exitcode(status)}")
    # Linux counts in kB, macOS in bytes.
    return seconds, usage.ru_maxrss / (1024.0**2 if sys.platform == "darwin" else 1024.0)


def main() -> None:
    """Alternate the two, so that a busy moment of the machine meets both, and print medians and their ratio."""
    case = sys.argv[1] if len(sys.argv) > 1 else "cases/flow_cell.toml"
    repeats = int(sys.argv[2]) if len(sys.argv) > 2 else 11
    with tempfile.TemporaryDirectory() as out:
        commands = {
            "imports only": [sys.executable, "-c", IMPORTS],
            f"transient run {case}": [sys.executable, "-m", "transient", "run", case, "--out", out],
        }
        for command in commands.values():
            once(command)
        taken = {name: [] for name in commands}
        for _ in range(repeats):
            for name, command in commands.items():
                taken[name].append(once(command))
    medians = []
    for name, runs in taken.items():
        seconds = [run[0] for run in runs]
        medians.append(statistics.median(seconds))
        print(
            f"{name:45s} median {medians[-1]:.3f} s   fastest {min(seconds):.3f} s   "
            f"peak memory {max(run[1] for run in runs):.0f} MB"
        )
    print(f"ratio of medians {medians[1] / medians[0]:.2f} (wanted: at most 1.5) over {repeats} runs each")


if __name__ == "__main__":
    main()

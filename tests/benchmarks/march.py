"""Warm timings of every case in ``cases/`` at 0.1 %: each march, the whole solve, steps, points, peak memory.

    python tests/benchmarks/march.py [repeats]
"""

from __future__ import annotations

import functools
import resource
import statistics
import sys
import time
from pathlib import Path
from typing import Any

import transient.march.levels as levels
from transient.answer import run
from transient.case.model import Case
from transient.case.read import read_case

HOUSE = Path(__file__).resolve().parents[2]


class Stopwatch:
    """Stands in front of the march and notes how long each one takes."""

    def __init__(self, march: Any):
        self.march, self.taken = march, []

    def __call__(self, *args: Any, **more: Any) -> Any:
        began = time.perf_counter()
        out = self.march(*args, **more)
        self.taken.append(time.perf_counter() - began)
        return out


def measure(case: Case, watch: Stopwatch, repeats: int) -> dict[str, Any]:
    """Medians over ``repeats`` warm solves: s of the whole, of the longest and of the median march, and its work."""
    run(case)
    whole, longest, usual = [], [], []
    for _ in range(repeats):
        watch.taken.clear()
        began = time.perf_counter()
        result = run(case)
        whole.append(time.perf_counter() - began)
        longest.append(max(watch.taken))
        usual.append(statistics.median(watch.taken))
    return {"solve": statistics.median(whole), "longest": statistics.median(longest),
            "usual": statistics.median(usual), "marches": len(watch.taken), **result.summary["numerics"]}  # fmt: skip


def main() -> None:
    """Print one line per case."""
    repeats = int(sys.argv[1]) if len(sys.argv) > 1 else 15
    watch = Stopwatch(levels.march)
    levels.march = functools.partial(watch)
    print(f"{'case':22s} {'solve':>8s} {'march (usual, longest)':>24s} {'marches':>8s} {'points':>7s} {'steps':>6s}")
    for path in sorted((HOUSE / "cases").glob("*.toml")):
        case = read_case(path).replace({"run.accuracy": "0.1 %"})
        got = measure(case, watch, repeats)
        print(
            f"{path.stem:22s} {1e3 * got['solve']:5.1f} ms {1e3 * got['usual']:10.2f} ms {1e3 * got['longest']:8.2f} ms"
            f" {got['marches']:8d} {got['points']:7d} {got['steps']:6d}"
        )
    memory = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / (1024.0**2 if sys.platform == "darwin" else 1024.0)
    print(f"medians of {repeats}; wanted: march < 2 ms, solve < 20 ms; peak memory {memory:.0f} MB, wanted < 400 MB")


if __name__ == "__main__":
    main()

"""A sweep beside the usual solvers, side by side in one run: plates whose upper wall is ramped.

    python tests/benchmarks/sweep.py [cases] [sample]

The model problem: gap, viscosity and ramp varied, ramps of about 0.01 diffusion times (h^2/nu), run until settled
and a margin, which is 1.07 diffusion times.  Whole ``transient sweep`` processes (start-up and writing included) of
``cases`` (default 100,000), 4,000 and 1,000 rows against general solvers on ``sample`` (default 16) of such cases.
Each peer has finite volumes of its own and is tuned to the cheapest grid and tolerance with which every case of the
sample is within 0.1 % of the exact peak stress and settling time.  Then the kernel against the machine's own limit,
two workers against one, and 500 random rows against the exact series.  Times are processor times, so that other work
on the machine counts little; wall times stand beside them.
"""

from __future__ import annotations

import os
import platform
import subprocess
import sys
import tempfile
import time
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from functools import partial
from pathlib import Path

for name in ("OMP_NUM_THREADS", "OPENBLAS_NUM_THREADS", "MKL_NUM_THREADS"):
    os.environ.setdefault(name, "1")

import numpy as np  # noqa: E402

sys.path.insert(0, str(Path(__file__).parent))

import peers  # noqa: E402

from transient.case.read import read_case  # noqa: E402
from transient.sweep.plan import Plan, read_plan  # noqa: E402

WANTED = 1e-3
CASE = """
title = "Plates, upper wall brought up to speed"
[gap]
shape = "plates"
height = "1 mm"
length = "60 mm"
width = "25 mm"
[fluid]
density = "1000 kg/m^3"
viscosity = "1 mPa*s"
[wall.upper]
speed = { kind = "ramp", to = "0.1 m/s", over = "10 ms" }
[run]
duration = "1 s"
"""


@dataclass(frozen=True, eq=False)
class Rows:
    """Heights m, viscosities Pa s, ramps s, durations s, (n,) each."""

    height: np.ndarray
    viscosity: np.ndarray
    over: np.ndarray
    duration: np.ndarray

    @property
    def share(self) -> np.ndarray:
        """Ramps in diffusion times."""
        return self.over / self.duration


def drawn(count: int, seed: int = 1) -> Rows:
    """Random rows of the model problem."""
    generator = np.random.default_rng(seed)
    height = generator.uniform(0.3e-3, 1.2e-3, count)
    viscosity = generator.uniform(0.5e-3, 3e-3, count)
    duration = height**2 * 1000.0 / viscosity
    return Rows(height, viscosity, 0.01 * duration * generator.uniform(0.5, 2.0, count), duration)


VARY = """
case = "plates.toml"
[vary]
"gap.height" = {{ from = "0.4 mm", to = "0.6 mm", count = {0} }}
"fluid.viscosity" = {{ from = "0.8 mPa*s", to = "1.25 mPa*s", count = {1} }}
"wall.upper.speed.over" = {{ from = "1.5 ms", to = "4 ms", count = {2} }}
"""


def grid_file(folder: Path, count: int) -> Path:
    """A sweep over about ``count`` combinations."""
    (folder / "plates.toml").write_text(CASE.replace('duration = "1 s"', 'duration = "auto"'), encoding="utf-8")
    side = round(count ** (1.0 / 3.0))
    path = folder / f"grid{count}.toml"
    path.write_text(VARY.format(side, side, round(count / side**2)), encoding="utf-8")
    return path


def sweep_file(folder: Path, rows: Rows) -> Path:
    """A sweep over listed rows."""
    (folder / "plates.toml").write_text(CASE, encoding="utf-8")
    lines = ["gap.height [m],fluid.viscosity [Pa*s],wall.upper.speed.over [s],run.duration [s]"]
    columns = (rows.height, rows.viscosity, rows.over, rows.duration)
    lines += [",".join(repr(float(x)) for x in one) for one in zip(*columns, strict=True)]
    (folder / f"rows{len(rows.height)}.csv").write_text("\n".join(lines) + "\n", encoding="utf-8")
    path = folder / f"sweep{len(rows.height)}.toml"
    path.write_text(f'case = "plates.toml"\nrows = "rows{len(rows.height)}.csv"\n', encoding="utf-8")
    return path


def whole_process(path: Path, workers: int) -> tuple[float, float]:
    """(wall time, processor time of it and its workers) of a sweep's process, s."""
    out = path.with_suffix(f".{workers}.h5")
    out.unlink(missing_ok=True)
    command = [sys.executable, "-m", "transient", "sweep", str(path), "--out", str(out), "--workers", str(workers)]
    before = os.times()
    began = time.perf_counter()
    subprocess.run(command, check=True, capture_output=True)
    taken = time.perf_counter() - began
    after = os.times()
    out.unlink()
    return taken, after.children_user + after.children_system - before.children_user - before.children_system


def worst_errors(share: np.ndarray, peak: np.ndarray, settled: np.ndarray) -> float:
    """Worst relative error of peaks (over mu U / h) and settling times (in diffusion times) against the sine series."""
    worst = 0.0
    for one, a, b in zip(share, peak, settled, strict=True):
        true_peak, true_time = peers.exact(float(one))
        worst = max(worst, abs(a / true_peak - 1.0), abs(b / true_time - 1.0))
    return worst


def tuned(peer: peers.Peer, share: np.ndarray) -> tuple[str, float, float]:
    """(setting, s per case, worst error) of the cheapest setting of a peer that is accurate on the whole sample."""
    best = ("none is accurate enough", np.inf, np.inf)
    for cells in peers.CELLS:
        grid = peers.Grid(cells)
        for tolerance in peers.TOLERANCES:
            few = share[:4]
            if worst_errors(few, *np.array(solved(peer, grid, tolerance, few)).T) > WANTED:
                continue
            worst = worst_errors(share, *np.array(solved(peer, grid, tolerance, share)).T)
            if worst > WANTED:
                continue
            taken = min(clocked(partial(solved, peer, grid, tolerance, share)) for _ in range(3)) / len(share)
            if taken < best[1]:
                best = (f"{cells} cells, tolerance {tolerance:.0e}", taken, worst)
    return best


def solved(peer: peers.Peer, grid: peers.Grid, tolerance: float, share: np.ndarray) -> list[tuple[float, float]]:
    """Answers of a peer, case by case."""
    return [peer.solve(grid, float(one), tolerance) for one in share]


def clocked(what: Callable[[], object]) -> float:
    """Processor time of a call, s."""
    began = time.process_time()
    what()
    return time.process_time() - began


def scaling(plan: Plan) -> float:
    """Solving region only: one process's time over that of two with half the chunks each."""
    from multiprocessing import get_context

    from transient.sweep.places import solve_span

    def work(chunks: list[int], gate, ready) -> None:
        solve_span(plan, plan.span(chunks[0]))
        ready.release()
        gate.wait()
        for chunk in chunks:
            solve_span(plan, plan.span(chunk))

    def timed(workers: int) -> float:
        context = get_context("fork")
        gate, ready = context.Event(), context.Semaphore(0)
        chunks = list(range(plan.chunks // 2 * 2))
        parts = [chunks[i::workers] for i in range(workers)]
        team = [context.Process(target=work, args=(part, gate, ready)) for part in parts]
        for one in team:
            one.start()
        for _ in team:
            ready.acquire()
        began = time.perf_counter()
        gate.set()
        for one in team:
            one.join()
        return time.perf_counter() - began

    ratios = [timed(1) / timed(2) for _ in range(3)]
    return float(np.median(ratios))


def against_series(rows: Rows, folder: Path) -> Iterator[str]:
    """500 random rows against the series of each case: worst actual and stated errors, and whether the latter hold."""
    from transient.series.solution import solve as series
    from transient.sweep.places import solve_span

    plan = read_plan(str(sweep_file(folder, rows)))
    found: dict[str, list[np.ndarray]] = {}
    for chunk in range(plan.chunks):
        for name, column in solve_span(plan, plan.span(chunk)).columns.items():
            found.setdefault(name, []).append(column)
    out = {name: np.concatenate(parts) for name, parts in found.items()}
    base = read_case(folder / "plates.toml")
    worst, held, stated = np.zeros(2), np.zeros(2), np.zeros(2)
    for i in range(len(rows.height)):
        changes = {"gap.height": rows.height[i], "fluid.viscosity": rows.viscosity[i],
                   "wall.upper.speed.over": rows.over[i], "run.duration": rows.duration[i]}  # fmt: skip
        units = {"gap.height": "m", "fluid.viscosity": "Pa*s"}
        case = base.replace({key: f"{float(x)!r} {units.get(key, 's')}" for key, x in changes.items()})
        flow = series(case.problem(), rows.duration[i])
        peak = float(flow.stress(np.array([0]), np.array([rows.over[i]]))[0][0, 1])
        settled = peers.last_above(flow, rows.height[i], 0.1, 0.01, rows.over[i], rows.duration[i])
        pairs = (("peak_stress_upper", "peak_stress_error_upper", peak), ("settling_time", "settling_error", settled))
        for k, (name, error, true) in enumerate(pairs):
            off = abs(out[name][i] - true)
            worst[k] = max(worst[k], off / abs(true))
            stated[k] = max(stated[k], out[error][i] / abs(true))
            held[k] += off <= out[error][i]
    solved = int((out["status"] == 0).sum())
    yield f"{len(rows.height)} random rows against the series, {solved} solved"
    for k, name in enumerate(("peak stress", "settling time")):
        yield (
            f"  {name:14s} worst error {worst[k]:.1e}, largest stated {stated[k]:.1e}, "
            f"{int(held[k])} of {len(rows.height)} stated errors hold"
        )


def main() -> None:
    """Print the table."""
    count = int(sys.argv[1]) if len(sys.argv) > 1 else 100_000
    sample = int(sys.argv[2]) if len(sys.argv) > 2 else 16
    print(f"{platform.processor() or platform.machine()}, {os.cpu_count()} cores, Python {platform.python_version()}")
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        whole_process(grid_file(folder, 200), 1)  # whatever there is to compile
        sizes = {size: grid_file(folder, size) for size in (count, 4000, 1000)}
        per_case = {}
        for size, path in sizes.items():
            runs = [whole_process(path, 1) for _ in range(3)]
            wall, per_case[size] = (min(times) / size for times in zip(*runs, strict=True))
            clock = f"{1e6 * wall:.1f} us by the clock"
            print(f"{size:7d} cases: {1e6 * per_case[size]:8.1f} us per case and core, {clock}")
        ours = per_case[count]
        print("peers on the sample, each tuned to 0.1 %, processor time")
        share = drawn(sample, seed=2).share
        times: dict[str, list[float]] = {"numpy": [], "compiled": []}
        for peer in peers.available():
            setting, taken, worst = tuned(peer, share)
            times[peer.side].append(taken)
            times_ours = f"{taken / ours:7.1f} times ours"
            print(f"  {peer.name:44s} {1e6 * taken:9.0f} us, {times_ours}; {setting}, off {worst:.1e}")
        for side, floor, goal in (("numpy", 100, 300), ("compiled", 20, 60)):
            best = min(times[side], default=np.nan) / ours
            print(f"against the best with a right-hand side in {side}: {best:.0f} times; floor {floor}, goal {goal}")
        few, many = per_case[1000], per_case[count]
        print(f"time per case, {count} against 1000 cases: {many / few:.2f}; floor not more than 1, goal less")
        kernel, limit = peers.kernel_and_limit()
        print(
            f"kernel {1e9 * kernel:.2f} ns per cell and step; multiply-adds and divisions alone {1e9 * limit:.2f}: "
            f"{kernel / limit:.1f} times; floor 4, goal 2"
        )
        gain = scaling(read_plan(str(sizes[count])))
        print(f"two workers against one, solving only: {gain:.2f} times; floor 1.8, goal 1.95")
        for line in against_series(drawn(500, seed=3), folder):
            print(line)


if __name__ == "__main__":
    main()

"""The experiment behind the stated errors: random linear cases, each judged by answers that share no code with ours.

    python tests/benchmarks/experiment.py --cases 2000 --seed 1 --workers 2 [--without-series] [--only NUMBER]

Each case is solved through the Python interface and its headline numbers are compared with ``tests/reference``.
"""

from __future__ import annotations

import argparse
import json
import signal
import sys
import time
import traceback
from collections.abc import Callable, Iterator
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np

sys.path[:0] = [str(Path(__file__).resolve().parent), str(Path(__file__).resolve().parents[1])]

from draw import draw  # noqa: E402
from reference.cases import tree_of  # noqa: E402
from reference.judge import Judge  # noqa: E402

SURE = 1e-9  # the judge's own error, relative to the largest value of that quantity
SURE_MEAN = 2e-8  # the same for the mean velocity: off by 1.3e-8 after 4,000 diffusion times, judged at 45 digits
PATIENCE = 60  # s per case


@dataclass
class Verdict:
    """One headline number of one case: what was said, with what error, and the truth."""

    quantity: str
    said: float | None
    stated: float | None
    exact: float | None
    floor: float
    request: float | None = None

    @property
    def off(self) -> float:
        """Actual error."""
        return abs(self.said - self.exact) if self.said is not None and self.exact is not None else np.inf

    @property
    def held(self) -> bool:
        """Whether the stated error holds (null against null holds)."""
        if self.said is None or self.exact is None:
            return self.said is None and self.exact is None
        return self.stated is not None and self.off <= self.stated + self.floor

    @property
    def ratio(self) -> float:
        """Stated over actual, the actual error not below the judge's own."""
        return self.stated / max(self.off, self.floor, 1e-300) if self.stated is not None else np.nan


@dataclass
class Outcome:
    """One case: its verdicts, or why it was not solved."""

    number: int
    seconds: float = 0.0
    met: bool = False
    kind: str = ""
    verdicts: list[Verdict] = field(default_factory=list)
    trouble: str = ""


def judge_case(job: tuple[int, int, str]) -> Outcome:
    """Solve and judge case ``number`` of ``seed``."""
    seed, number, how = job
    outcome = Outcome(number)
    signal.signal(signal.SIGALRM, _too_long)
    signal.alarm(PATIENCE)
    try:
        case = draw(seed, number)
        result, outcome.seconds = _solve(case, how)
        outcome.met = bool(result.summary["accuracy"]["met"])
        outcome.verdicts = verdicts(case, result.summary)
        outcome.kind = result.summary["flow"].get("error_kind", "")
    except Exception as error:
        place = traceback.extract_tb(error.__traceback__)[-1]
        outcome.trouble = f"{type(error).__name__}: {str(error)[:160]} ({Path(place.filename).name}:{place.lineno})"
    finally:
        signal.alarm(0)
    return outcome


def _too_long(*_: Any) -> None:
    raise TimeoutError(f"longer than {PATIENCE} s")


def _solve(case: dict[str, Any], how: str) -> tuple[Any, float]:
    from transient.answer import run
    from transient.case.model import Case

    checked = Case(tree_of(case))
    began = time.perf_counter()
    result = run(checked, judge=how)
    return result, time.perf_counter() - began


def verdicts(case: dict[str, Any], summary: dict[str, Any]) -> list[Verdict]:
    """Every headline number with a stated error beside its exact value."""
    judge = Judge(case)
    final = judge.final()
    accuracy = case["accuracy"]
    out: list[Verdict] = []
    for end, name in enumerate(judge.gap.names):
        if name in summary["walls"]:
            out += _wall(judge, end, summary["walls"][name], float(final[end]), accuracy)
    flow = summary["flow"]
    peak = judge.peak(2)[0]
    floor = SURE_MEAN * abs(peak)
    peak = tied(judge, 2, peak, flow["peak_mean_velocity"], flow["peak_mean_velocity_error"])
    out.append(Verdict("peak mean", flow["peak_mean_velocity"], flow["peak_mean_velocity_error"], peak, floor))
    out.append(Verdict("final mean", flow["final_mean_velocity"], flow["final_mean_velocity_error"], final[2], floor))
    return out + _settling(judge, summary["settling"])


def tied(judge: Judge, channel: int, peak: float, said: float | None, error: float | None) -> float:
    """The exact peak, or where the opposite sign was said the exact extreme of that sign, if it is as large within
    the stated error: an oscillation has two."""
    if said is None or error is None or said * peak >= 0.0:
        return peak
    other = float((np.sign(said) * judge.state(judge.samples())[channel]).max())
    return np.sign(said) * abs(peak) if other >= abs(peak) - max(error, 1e-3 * abs(peak)) else peak


def _wall(judge: Judge, end: int, said: dict[str, Any], final: float, accuracy: float) -> list[Verdict]:
    k, at = judge.unbounded(end)
    out = []
    if k > 0.0 or said["unbounded"]:
        out.append(Verdict("unbounded K", said["unbounded_coefficient"], 1e-9 * k, k if k > 0 else None, 0.0))
        out.append(Verdict("unbounded time", said["peak_time"], 1e-9 * at, at, 0.0))
        scale = max(abs(final), k / np.sqrt(judge.gap.time))
    else:
        peak, when = judge.peak(end)
        scale = abs(peak)
        error = said["peak_stress_error"]
        peak = tied(judge, end, peak, said["peak_stress"], error)
        out.append(Verdict("peak stress", said["peak_stress"], error, peak, SURE * scale, accuracy * scale))
        if peak != 0.0 and said["peak_stress"] is not None:
            first = judge.first_at(end, abs(peak) - error)
            first = min(first, when)
            out.append(Verdict("peak time", said["peak_time"], said["peak_time_error"], first, 1e-6 * judge.until))
    out.append(Verdict("final stress", said["final_stress"], said["final_stress_error"], final, SURE * scale))
    return out


def _settling(judge: Judge, said: dict[str, Any]) -> list[Verdict]:
    exact = judge.settling()
    floor = 1e-7 * judge.until
    out = [
        Verdict(f"settling {key}", said[key], said["errors"][key], exact[key], floor) for key in ("velocity", "flow")
    ]
    for name in said["stress"]:
        out.append(Verdict("settling stress", said["stress"][name], said["errors"]["stress"][name], exact[name], floor))
    return out


def experiment(
    cases: int, seed: int, workers: int = 1, how: str = "series", minutes: float = np.inf, first: int = 0,
    judge: Callable[[tuple[int, int, str]], Outcome] = judge_case,
) -> list[Outcome]:  # fmt: skip
    """``judge`` ``cases`` cases of ``seed`` from ``first`` on; after ``minutes`` no further outcome is waited for."""
    jobs = [(seed, number, how) for number in range(first, first + cases)]
    if workers == 1:
        return _until(map(judge, jobs), minutes)
    with ProcessPoolExecutor(workers) as pool:
        outcomes = _until(pool.map(judge, jobs, chunksize=2), minutes)
        pool.shutdown(wait=False, cancel_futures=True)
    return outcomes


def _until(outcomes: Iterator[Outcome], minutes: float) -> list[Outcome]:
    end, out = time.monotonic() + 60.0 * minutes, []
    for outcome in outcomes:
        out.append(outcome)
        if time.monotonic() > end:
            break
    return out


def table(outcomes: list[Outcome]) -> str:
    """The compact report."""
    solved = [o for o in outcomes if not o.trouble]
    lines = [f"{len(outcomes)} cases, {len(solved)} solved, accuracy met in {sum(o.met for o in solved)}"]
    every = [(o, v) for o in solved for v in o.verdicts]
    lines.append(f"{'quantity':18s} {'judged':>7s} {'hold':>7s} {'share':>8s} {'stated/actual 50 %':>19s} {'90 %':>9s}")
    for name in [*dict.fromkeys(v.quantity for _, v in every), "all"]:
        mine = [v for _, v in every if name in ("all", v.quantity)]
        ratios = [v.ratio for v in mine if np.isfinite(v.ratio) and np.isfinite(v.off) and v.off > v.floor]
        half, most = (np.quantile(ratios, (0.5, 0.9)) if ratios else (np.nan, np.nan))
        held = sum(v.held for v in mine)
        share = 100 * held / max(len(mine), 1)
        lines.append(f"{name:18s} {len(mine):7d} {held:7d} {share:7.2f}% {half:19.3g} {most:9.3g}")
    bad = [(o, v) for o, v in every if not v.held]
    bad.sort(key=lambda ov: -ov[1].off / (ov[1].stated or 1e-300))
    lines.append(f"cases with all stated errors holding: {sum(all(v.held for v in o.verdicts) for o in solved)}")
    for o, v in bad[:25]:
        lines.append(f"  case {o.number}: {v.quantity} said {v.said} +- {v.stated}, exact {v.exact}")
    lines += [f"  case {o.number}: {o.trouble}" for o in outcomes if o.trouble][:15]
    slow = sorted(solved, key=lambda o: -o.seconds)[:5]
    lines.append("slowest: " + ", ".join(f"case {o.number} {o.seconds:.2f} s" for o in slow))
    lines.append(f"median solve {np.median([o.seconds for o in solved]):.3f} s" if solved else "none solved")
    return "\n".join(lines)


def main() -> None:
    """Command line."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--cases", type=int, default=2000)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--workers", type=int, default=2)
    parser.add_argument("--first", type=int, default=0)
    parser.add_argument("--minutes", type=float, default=np.inf)
    parser.add_argument("--without-series", action="store_true")
    parser.add_argument("--only", type=int)
    options = parser.parse_args()
    how = "refinement" if options.without_series else "series"
    if options.only is not None:
        print(json.dumps(draw(options.seed, options.only), indent=1))
        outcome = judge_case((options.seed, options.only, how))
        for v in outcome.verdicts:
            print(v, "off", v.off, "held", v.held)
        print(outcome.trouble, f"{outcome.seconds:.2f} s, met {outcome.met}")
        return
    began = time.perf_counter()
    outcomes = experiment(options.cases, options.seed, options.workers, how, options.minutes, options.first)
    print(table(outcomes))
    print(f"seed {options.seed}, judged by {how}, {time.perf_counter() - began:.0f} s in all")


if __name__ == "__main__":
    main()

"""The experiment behind the stated errors of bodies and prescribed flow: random linear ones, judged by finite elements.

    python tests/benchmarks/bodies.py --cases 1000 --seed 1 --workers 2 [--without-series] [--only NUMBER] [--nonlinear]

``--nonlinear``: force-speed curves and dry friction instead, judged by SciPy's Radau on Chebyshev points.
"""

from __future__ import annotations

import argparse
import itertools
import json
import signal
import sys
import time
import traceback
from collections.abc import Callable
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np

sys.path[:0] = [str(Path(__file__).resolve().parent), str(Path(__file__).resolve().parents[1])]

from draw_bodies import draw, draw_nonlinear  # noqa: E402
from experiment import Outcome, Verdict, _too_long, experiment, table  # noqa: E402
from reference.cases import tree_of  # noqa: E402
from reference.closed import Plant, Run, last_above  # noqa: E402
from reference.sliding import Sliding  # noqa: E402

SURE = 1e-6  # the judge's own error, relative to the largest value of that quantity
NODE = 2e-7  # of the liquid's mass, twice what the judge's wall node has: that much of a body set going is its error
PATIENCE = 90  # s per case
EARLY = 1e-6  # of the diffusion time: sooner after a break its elements do not follow a sudden motion


def judge_case(job: tuple[int, int, str]) -> Outcome:
    """Solve and judge case ``number`` of ``seed``."""
    seed, number, how = job
    outcome = Outcome(number)
    signal.signal(signal.SIGALRM, _too_long)
    signal.alarm(PATIENCE)
    try:
        case = (draw_nonlinear if how == "nonlinear" else draw)(seed, number)
        summary, outcome.seconds = solved(case, how)
        outcome.met = bool(summary["accuracy"]["met"])
        outcome.kind = summary["flow"].get("error_kind", "")
        outcome.verdicts = (sliding_verdicts if how == "nonlinear" else verdicts)(case, summary)
    except Exception as error:
        place = traceback.extract_tb(error.__traceback__)[-1]
        outcome.trouble = f"{type(error).__name__}: {str(error)[:160]} ({Path(place.filename).name}:{place.lineno})"
    finally:
        signal.alarm(0)
    return outcome


def solved(case: dict[str, Any], how: str) -> tuple[dict[str, Any], float]:
    """(summary, seconds) of a plain case."""
    from transient.answer import run
    from transient.case.model import Case

    checked = Case(tree_of(case))
    began = time.perf_counter()
    result = run(checked, judge="refinement" if how == "refinement" else "series")
    return result.summary, time.perf_counter() - began


class Course:
    """The judge's course, sampled where peaks and crossings are looked for."""

    def __init__(self, case: dict[str, Any]):
        self.case = case
        self.until = float(case["duration"])
        self.plant = Plant(case)
        self.run: Run = self.plant.run(self.until)
        edges = np.append(self.run.edges, self.until)
        early = EARLY * self.plant.gap.time
        swing = np.abs(self.plant.rates.imag[np.abs(self.plant.rates.real) < 30 * np.abs(self.plant.rates.imag)])
        parts = []
        for a, b in itertools.pairwise(edges):
            if b > a:
                parts += [np.geomspace(min(early, (b - a) / 10), b - a, 150) + a, np.linspace(a, b, 60)[1:]]
        if len(swing):
            parts.append(np.linspace(0.0, self.until, min(20_000, int(self.until * swing.max() * 4) + 2))[1:])
        self.times = np.unique(np.concatenate(parts))
        self.values = self.run.at(self.times)
        self.sure = SURE
        for body in self.plant.bodies.values():
            if body.get("initial_speed"):
                liquid = self.plant.gap.rho * (self.plant.gap.ro - self.plant.gap.ri) / body["factor"]
                liquid *= self.plant.r[-1] ** self.plant.metric
                self.sure = max(self.sure, NODE * liquid / body["mass"]) if body["mass"] else self.sure

    def peak(self, read: Callable[[dict[str, np.ndarray]], np.ndarray]) -> float:
        """Signed largest magnitude: samples narrowed around the best of them."""
        value = read(self.values)
        best = float(value[np.abs(value).argmax()])
        tops = np.flatnonzero(np.abs(value) > 0.98 * abs(best))
        tops = tops[np.argsort(-np.abs(value[tops]), kind="stable")[:300]]
        low = self.times[np.maximum(tops - 1, 0)]
        high = self.times[np.minimum(tops + 1, len(value) - 1)]
        for _ in range(6):
            at = low[:, None] + (high - low)[:, None] * np.linspace(0.0, 1.0, 13)
            at[:, 0] = np.maximum(at[:, 0], self.times[0])
            found = np.abs(read(self.run.at(at.ravel()))).reshape(at.shape)
            top = found.argmax(axis=1)
            rows = np.arange(len(at))
            low, high = at[rows, np.maximum(top - 1, 0)], at[rows, np.minimum(top + 1, 12)]
            best = float(np.sign(best) * max(abs(best), found.max()))
        return best


    def thrown(self, end: int) -> list[float]:
        """Accelerations right after each break: a load's jump acts on a body alone before the film answers."""
        edges, body = self.run.edges, self.plant.bodies[end]
        loads = [k for k in range(len(self.plant.signals)) if k not in self.plant.prescribed]
        own = loads[list(self.plant.bodies).index(end)]
        before = np.concatenate([[0.0], self.run.at(edges[1:])["acceleration"][end] if len(edges) > 1 else []])
        last = 0.0
        out = [0.0]
        for k, edge in enumerate(edges):
            now = float(self.run.inputs(k, np.zeros(1))[own, 0])
            spring = body.get("stiffness", 0.0) * body.get("initial_displacement", 0.0) if k == 0 else 0.0
            drag = body.get("damping", 0.0) * (body.get("initial_speed") or 0.0) if k == 0 else 0.0
            out.append(float(before[k] + (now - last - spring - drag) / body["mass"]))
            if k + 1 < len(edges):
                last = float(self.run.inputs(k, np.array([edges[k + 1] - edge]))[own, 0])
        return out


def verdicts(case: dict[str, Any], summary: dict[str, Any]) -> list[Verdict]:
    """Every headline number of bodies, walls and pressure that carries an error, beside its judged value."""
    course = Course(case)
    final = course.run.at(np.array([course.until]))
    out: list[Verdict] = []
    names = course.plant.gap.names
    for end, name in enumerate(names):
        if name not in summary["walls"]:
            continue
        said = summary["walls"][name]
        scale = float(np.abs(course.values["stress"][end]).max())
        calm = float(np.median(np.abs(course.values["stress"][end])))
        if not said["unbounded"] and not _sudden(course):
            scale = calm if scale == 0.0 else scale
            peak = tied(course, lambda v, e=end: v["stress"][e], said["peak_stress"], said["peak_stress_error"])
            floor = course.sure * scale
            out.append(Verdict("peak stress", said["peak_stress"], said["peak_stress_error"], peak, floor))
        exact = float(final["stress"][end, 0])
        # the largest value itself where a sudden motion has made no more of it than the elements can follow
        largest = calm if said["unbounded"] or _sudden(course) else scale
        # a stress is the difference of speeds, which are sure to their own size
        fast = float(np.abs(course.values["speed"]).max(initial=0.0))
        gap = course.plant.gap
        shear = gap.mu * fast / (1.0 if gap.kind == "rotating" else gap.ro - gap.ri)
        floor = course.sure * max(largest, abs(exact), shear)
        out.append(Verdict("final stress", said["final_stress"], said["final_stress_error"], exact, floor))
    for name, said in summary.get("bodies", {}).items():
        out += _body(course, names.index(name), said, final)
    if "gradient" in final and course.plant.flow:
        out += _pressure(course, summary["pressure"], float(final["gradient"][0]))
    return out + _settling(course, summary["settling"])


def _sudden(course: Course) -> bool:
    """Whether something in a prescribed flow jumps: what other walls feel then is faster than the elements follow."""
    plant = course.plant
    jumps = any(s.jumps(course.until, b) for s, b in zip(plant.signals, plant.before(), strict=True))
    return plant.flow and (jumps or any(body.get("initial_speed") for body in plant.bodies.values()))


def tied(
    course: Course, read: Callable[[dict[str, np.ndarray]], np.ndarray], said: float | None, error: float | None
) -> float:
    """The judged peak; of an oscillation's two, that of the sign which was said, if it is as large within the error."""
    peak = course.peak(read)
    if said is None or error is None or said * peak >= 0.0:
        return peak
    other = float((np.sign(said) * read(course.values)).max())
    return np.sign(said) * abs(peak) if other >= abs(peak) - max(error, 1e-3 * abs(peak)) else peak


def _body(course: Course, end: int, said: dict[str, Any], final: dict[str, np.ndarray]) -> list[Verdict]:
    speed, place = course.values["speed"][end], course.values["place"][end]
    fast, far = float(np.abs(speed).max()), float(np.abs(place).max())
    peak = tied(course, lambda v: v["speed"][end], said["peak_speed"], said["peak_speed_error"])
    first = abs(course.plant.bodies[end].get("initial_speed") or 0.0)
    if first >= abs(peak):
        peak = np.sign(course.plant.bodies[end]["initial_speed"]) * first
    out = [
        Verdict("peak speed", said["peak_speed"], said["peak_speed_error"], peak, course.sure * fast),
        Verdict("final speed", said["final_speed"], said["final_speed_error"], float(final["speed"][end, 0]),
                course.sure * fast),
        Verdict("final position", said["final_position"], said["final_position_error"], float(final["place"][end, 0]),
                course.sure * far),
    ]  # fmt: skip
    if said["peak_acceleration"] is not None and course.plant.bodies[end]["mass"] > 0.0 and not _sudden(course):
        read = partial(_acceleration, end=end)
        peak = tied(course, read, said["peak_acceleration"], said["peak_acceleration_error"])
        if not course.plant.flow:
            peak = max(peak, *course.thrown(end), key=abs)
        floor = 1e-4 * abs(peak)  # the elements' own, right after a break
        error = said["peak_acceleration_error"]
        out.append(Verdict("peak acceleration", said["peak_acceleration"], error, peak, floor))
    if said["speed_settling_time"] is not None and said["terminal_speed"] is not None:
        terminal = said["terminal_speed"]
        size = abs(terminal) if abs(terminal) > 1e-6 * abs(said["peak_speed"]) else abs(said["peak_speed"])
        within = course.case["settle_within"]
        exact = last_above(lambda t: np.abs(course.run.at(t)["speed"][end] - terminal), within * size, course.times)
        out.append(Verdict("speed settling", said["speed_settling_time"], said["speed_settling_error"], exact,
                           1e-6 * course.until))  # fmt: skip
    return out


def _acceleration(values: dict[str, np.ndarray], end: int) -> np.ndarray:
    return values["acceleration"][end]


def _pressure(course: Course, said: dict[str, Any], final: float) -> list[Verdict]:
    size = float(np.abs(course.values["gradient"]).max())
    calm = float(np.median(np.abs(course.values["gradient"])))
    floor = course.sure * max(calm, abs(final))
    error = said["final_drop_per_length_error"]
    out = [Verdict("final pressure drop", said["final_drop_per_length"], error, final, floor)]
    if not said["unbounded"] and not _sudden(course):
        error = said["peak_drop_per_length_error"]
        peak = tied(course, lambda v: v["gradient"], said["peak_drop_per_length"], error)
        out.append(Verdict("peak pressure drop", said["peak_drop_per_length"], error, peak, 1e-5 * size))
    return out


def _settling(course: Course, said: dict[str, Any]) -> list[Verdict]:
    """Settling of mean velocity and stresses where the end is steady: against the end state that was said."""
    if said["regime"] != "steady":
        return []
    inputs = np.array([s.eventual[0] == "constant" for s in course.plant.signals])
    if not inputs.all():
        return []
    values = np.array([sum(a.final for a in s.atoms) for s in course.plant.signals])
    z, _ = course.plant.steady(values, {})
    out = []
    mean = float(course.plant.mean @ z)
    size, within = said["relative_to"]["flow"], said["within"]
    if said["flow"] is not None and size and not course.plant.flow:
        exact = last_above(lambda t: np.abs(course.run.at(t)["mean"] - mean), within * size, course.times)
        out.append(Verdict("settling flow", said["flow"], said["errors"]["flow"], exact, 1e-6 * course.until))
    everywhere = course.plant.between()

    def off(t: np.ndarray) -> np.ndarray:
        return np.abs(everywhere @ (course.run.at(t)["z"] - z[:, None])).max(axis=0)

    size = said["relative_to"]["velocity"]
    if said["velocity"] is not None and size:
        exact = last_above(off, within * size, course.times)
        floor = 1e-6 * course.until
        out.append(Verdict("settling velocity", said["velocity"], said["errors"]["velocity"], exact, floor))
    return out


def sliding_verdicts(case: dict[str, Any], summary: dict[str, Any]) -> list[Verdict]:
    """What a body under a curve or dry friction ends in, and its largest speed, beside SciPy's."""
    course = Sliding(case)
    (name, said), *_ = summary["bodies"].items()
    speed, place = course.speed, course.place
    fast, far = float(np.abs(speed).max()), float(np.abs(place).max())
    out = [
        Verdict("final speed", said["final_speed"], said["final_speed_error"], float(speed[-1]), 1e-5 * fast),
        Verdict("final position", said["final_position"], said["final_position_error"], float(place[-1]), 1e-5 * far),
    ]
    peak = float(speed[np.abs(speed).argmax()])
    out.append(Verdict("peak speed", said["peak_speed"], said["peak_speed_error"], peak, 1e-4 * fast))
    wall = summary["walls"][name]
    size = course.body["area"] and course.room.gap.mu * fast / course.room.gap.time
    calm = abs(wall["peak_stress"] or 0.0) or size
    out.append(Verdict("final stress", wall["final_stress"], wall["final_stress_error"], course.final_stress(),
                       1e-4 * calm))  # fmt: skip
    stops = [rest for rest in course.rests if rest[1] - rest[0] > 1e-6 * case["duration"]]
    told = said["standstills"]
    if stops or told:
        out.append(Verdict("standstills", float(len(told)), 0.0, float(len(stops)), 0.0))
    return out


def main() -> None:
    """Command line."""
    parser = argparse.ArgumentParser(description=__doc__)
    parser.add_argument("--cases", type=int, default=1000)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--workers", type=int, default=2)
    parser.add_argument("--first", type=int, default=0)
    parser.add_argument("--minutes", type=float, default=np.inf)
    parser.add_argument("--without-series", action="store_true")
    parser.add_argument("--nonlinear", action="store_true")
    parser.add_argument("--only", type=int)
    options = parser.parse_args()
    how = "nonlinear" if options.nonlinear else "refinement" if options.without_series else "series"
    if options.only is not None:
        drawn = (draw_nonlinear if options.nonlinear else draw)(options.seed, options.only)
        print(json.dumps(drawn, indent=1))
        outcome = judge_case((options.seed, options.only, how))
        for v in outcome.verdicts:
            print(v, "off", v.off, "held", v.held)
        print(outcome.trouble, f"{outcome.seconds:.2f} s, met {outcome.met}")
        return
    began = time.perf_counter()
    outcomes = experiment(options.cases, options.seed, options.workers, how, options.minutes, options.first, judge_case)
    print(table(outcomes))
    exact = sum(o.kind == "exact" for o in outcomes)
    print(f"seed {options.seed}, judged by {how} ({exact} by the series), {time.perf_counter() - began:.0f} s in all")


if __name__ == "__main__":
    main()

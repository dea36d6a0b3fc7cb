"""Numbers that follow from the inputs without solving: what ``transient check`` prints below them."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import NamedTuple

import numpy as np

from transient.case.model import Case
from transient.drive.pieces import Drive
from transient.gap.problem import LOWER, UPPER, Problem

MOST_SAMPLES = 2_000_000


class Derived(NamedTuple):
    """One derived number in SI: ``dimension`` is a name for ``units.show`` ("number" for a pure one)."""

    name: str
    value: float
    dimension: str
    note: str


def derived(case: Case) -> tuple[Derived, ...]:
    """The derived numbers of a case; those that do not apply are left out."""
    problem = case.problem()
    found = [one for entry in ENTRIES for one in entry(case, problem)]
    return tuple(one for one in found if math.isfinite(one.value))


def _clearance(case: Case, problem: Problem) -> list[Derived]:
    gap = case.gap.ends.gap
    name = {"pipe": "radius of the pipe", "plates": "gap height"}.get(problem.shape, "radial clearance")
    return [Derived(name, gap, "length", "distance across which momentum diffuses")]


def _other_viscosity(case: Case, problem: Problem) -> list[Derived]:
    """The one of the two viscosities that was not typed."""
    if "viscosity" in case.tree["fluid"]:
        value = problem.viscosity / problem.density
        return [Derived("kinematic viscosity", value, "kinematic_viscosity", "viscosity / density")]
    return [Derived("dynamic viscosity", problem.viscosity, "viscosity", "kinematic viscosity x density")]


def _diffusion_time(case: Case, problem: Problem) -> list[Derived]:
    gap = case.gap.ends.gap
    time = gap**2 * problem.density / problem.viscosity
    across = "radius" if problem.shape == "pipe" else "gap"
    return [Derived("diffusion time", time, "time", f"{across}^2 / kinematic viscosity")]


def _areas(case: Case, problem: Problem) -> list[Derived]:
    walls = [wall for wall in problem.walls if wall.area is not None]
    out = [Derived(f"wetted area, {wall.name}", wall.area or 0.0, "area", "of one gap") for wall in walls]
    if problem.section is not None:
        out.append(Derived("flow section", problem.section, "area", "of one gap"))
    return out


def _peaks(case: Case, problem: Problem) -> list[Derived]:
    until = horizon(problem)
    dimension = "angular_speed" if problem.rotating else "speed"
    out = []
    for end, wall in enumerate(problem.walls):
        largest = peak(problem.speeds[end], until)
        if wall.kind != "axis" and largest > 0.0:
            out.append(Derived(f"peak speed, {wall.name}", largest, dimension, "largest magnitude of its history"))
    largest = peak(problem.gradient, until)
    if largest > 0.0:
        out.append(
            Derived("peak pressure drop per length", largest, "pressure_gradient", "largest magnitude of its history")
        )
    return out


def _reynolds(case: Case, problem: Problem) -> list[Derived]:
    """Reynolds number on the clearance (pipe: diameter) with the largest velocity that the inputs can make."""
    until, gap = horizon(problem), case.gap.ends.gap
    moving = max(peak(problem.speeds[end], until) * _lever(problem, end) for end in (LOWER, UPPER))
    steady = steady_mean_velocity(problem, gap, peak(problem.gradient, until))
    across = 2 * gap if problem.shape == "pipe" else gap
    width = "diameter" if problem.shape == "pipe" else "gap"
    per = problem.density * across / problem.viscosity
    out = []
    if moving > 0.0:
        out.append(
            Derived(
                "Reynolds number of the wall",
                moving * per,
                "number",
                f"peak wall speed x {width} / kinematic viscosity",
            )
        )
    if steady > 0.0:
        out.append(
            Derived("mean velocity at peak pressure", steady, "speed", "of the steady flow with the walls at rest")
        )
        out.append(
            Derived(
                "Reynolds number of the flow",
                steady * per,
                "number",
                f"that mean velocity x {width} / kinematic viscosity",
            )
        )
    return out


def _taylor(case: Case, problem: Problem) -> list[Derived]:
    """Taylor number of a turning inner wall."""
    turning = peak(problem.speeds[LOWER], horizon(problem)) if problem.rotating else 0.0
    if turning == 0.0:
        return []
    value = turning**2 * problem.inner * case.gap.ends.gap**3 * (problem.density / problem.viscosity) ** 2
    note = "(inner speed)^2 x inner radius x gap^3 / kinematic viscosity^2"
    return [Derived("Taylor number", value, "number", note)]


def _lever(problem: Problem, end: int) -> float:
    return problem.walls[end].radius if problem.rotating else 1.0


def steady_mean_velocity(problem: Problem, gap: float, gradient: float) -> float:
    """Mean velocity (m/s) of steady laminar flow driven by ``gradient`` (Pa/m) between walls at rest.

    Plates G h^2 / 12 mu; pipe G R^2 / 8 mu; annulus with k = R1/R2:
    G R2^2 / 8 mu ((1 + k^2) - (1 - k^2) / ln(1/k)) (White, Fluid Mechanics, sec. 6.6; from memory).
    """
    if problem.metric == 0:
        return gradient * gap**2 / (12 * problem.viscosity)
    if problem.inner == 0.0:
        return gradient * problem.outer**2 / (8 * problem.viscosity)
    if problem.rotating:
        return 0.0
    k = problem.inner / problem.outer
    if gap < 1e-3 * problem.outer:  # the two terms cancel; a narrow annulus is a pair of plates to (gap/R)^2
        return gradient * gap**2 / (12 * problem.viscosity)
    return gradient * problem.outer**2 / (8 * problem.viscosity) * ((1 + k * k) - (1 - k * k) / math.log(1 / k))


def horizon(problem: Problem) -> float:
    """A time (s) by which the drives have shown what they do."""
    shown = max([span(drive) for drive in problem.drives])
    return shown if problem.duration is None else min(shown, problem.duration)


def span(drive: Drive) -> float:
    """Time (s) until the last break that is not a repetition, and two periods more."""
    once = [float(t.pieces.starts[-1]) for t in drive.tracks if not math.isfinite(t.every)]
    cycles = [t.every for t in drive.tracks if math.isfinite(t.every)]
    return max(once, default=0.0) + 2.0 * max([drive.eventual.period or 0.0, *cycles])


def peak(drive: Drive, until: float) -> float:
    """Largest magnitude of a drive over [0, until] and of what it ends in, by samples of each smooth piece."""
    pieces = drive.pieces(until)
    ends = np.append(pieces.starts[1:], max(until, pieces.starts[-1]))
    share = np.linspace(0.0, 1.0, int(np.clip(MOST_SAMPLES // len(ends), 3, 257)))
    offset = (ends - pieces.starts)[:, None] * share[None, :]
    which = np.broadcast_to(np.arange(len(ends))[:, None], offset.shape)
    largest = float(np.abs(pieces.at(which.ravel(), offset.ravel())).max())
    end = drive.eventual.drive
    if end is None or end is drive or end.eventual.drive is not end:
        return largest
    return max(largest, peak(end, span(end)))


ENTRIES: tuple[Callable[[Case, Problem], list[Derived]], ...] = (
    _clearance,
    _other_viscosity,
    _diffusion_time,
    _areas,
    _peaks,
    _reynolds,
    _taylor,
)

"""The hand formulas beside the answer: steady stress of each instant, diffusion time, decay time, massless film."""

from __future__ import annotations

import math
from collections.abc import Iterator

from transient.case.model import Case
from transient.sheet.document.blocks import Block, Formula, Table, Words
from transient.sheet.document.facts import Facts, brief, printed

Row = tuple[str, str, str, str]

# Smallest zero of the Bessel function J0 (Abramowitz & Stegun 1964, table 9.5).
J0_ZERO = 2.404825557695773
STEADY = {
    "plates": ("τ_lower = μ (U_upper − U_lower)/h + G h/2,   τ_upper = −μ (U_upper − U_lower)/h + G h/2",
               "plane Couette and Poiseuille flow at the speeds and the pressure of each instant"),
    "pipe": ("τ_bore = G R/2", "Hagen-Poiseuille flow at the pressure of each instant"),
    "axial annulus": ("u = A + B ln r − G r²/(4 μ)", "A and B from the wall speeds of each instant"),
    "rotating annulus": ("ω = A + B/r²", "A and B from the wall speeds of each instant"),
}  # fmt: skip


def hand(facts: Facts) -> tuple[Block, ...]:
    """Formula, values beside the answer, and whether they would have been enough."""
    part = facts.summary.get("quasi_steady") or {}
    blocks: list[Block] = []
    case = facts.case
    if case is not None and case.fluid.law == "constant":
        key = "axial annulus" if case.gap.shape.motion == "axial" else case.gap.shape.name
        formula = STEADY.get(case.gap.shape.name) or STEADY.get(key.replace("_", " "))
        if case.gap.shape.metric == 3:
            formula = STEADY["rotating annulus"]
        elif formula is None and case.gap.shape.metric == 1:
            formula = STEADY["axial annulus"]
        if formula is not None:
            blocks.append(Formula(*formula))
    rows = [*_stresses(facts), *_times(facts), *_bodies(facts)]
    if rows:
        blocks.append(Table(("number", "by hand", "this run", "difference"), tuple(rows), numbers=(1, 2, 3)))
    if part:
        verdict = "Enough here" if part.get("enough") else "Not enough here"
        note = part.get("note") or "the hand formula stands alone"
        blocks.append(Words(f"{verdict}: {note}."))
    return tuple(blocks) or (Words("This result holds no hand formula."),)


def _stresses(facts: Facts) -> Iterator[Row]:
    part = facts.summary.get("quasi_steady") or {}
    for name, value in (part.get("peak_stress") or {}).items():
        wall = facts.walls.get(name) or {}
        run = "unbounded" if wall.get("unbounded") else brief(wall.get("peak_stress"), "Pa")
        apart = (part.get("difference") or {}).get(name)
        yield f"peak stress, {name}", brief(value, "Pa"), run, "–" if apart is None else f"{100 * apart:.2g} %"


def _times(facts: Facts) -> Iterator[Row]:
    """Diffusion time, and the time in which the slowest part of the flow falls to 1/e, from the settling levels."""
    case = facts.case
    if case is None or case.fluid.law != "constant":
        return
    problem = case.problem()
    yield "diffusion time, gap²ρ/μ", brief(problem.diffusion_time, "s"), "–", "–"
    by_hand, measured = _decay(case), _measured_decay(facts)
    if by_hand is None or problem.closed:
        return
    apart = "–" if measured is None else printed(f"{100 * (by_hand / measured - 1):+.2g} %")
    yield "time constant of the decay", brief(by_hand, "s"), brief(measured, "s"), apart


def _decay(case: Case) -> float | None:
    """Time constant (s) of the slowest mode: h^2/(pi^2 nu) between two walls that hold the liquid, four times that
    under a shear-free one; R^2/(j0^2 nu) in a pipe (Szymanski 1932).  None elsewhere."""
    time = case.problem().diffusion_time
    slips = any(wall is not None and wall.slip_length for wall in case.walls)
    if slips or case.pressure.kind in ("flow_rate", "mean_velocity", "sealed"):
        return None
    if case.gap.shape.axis:
        return time / J0_ZERO**2
    if case.gap.shape.metric != 0:
        return None
    free = sum(wall is not None and wall.shear_free for wall in case.walls)
    return time / math.pi**2 * 4.0**free


def _measured_decay(facts: Facts) -> float | None:
    """From the times at which the velocity came within 1 % and 0.1 % of its end: ten times less between them."""
    if facts.periodic:
        return None
    levels = (facts.summary.get("settling") or {}).get("levels") or {}
    first, last = ((levels.get(name) or {}).get("velocity") for name in ("1 %", "0.1 %"))
    if first is None or last is None or not last > first > 0.0:
        return None
    return (last - first) / math.log(10.0)


def _bodies(facts: Facts) -> Iterator[Row]:
    for name, body in ((facts.summary.get("quasi_steady") or {}).get("bodies") or {}).items():
        film = body.get("massless_film") or {}
        run = ((facts.summary.get("bodies") or {}).get(name) or {}).get("speed_settling_time")
        if film.get("time_constant") is not None:
            yield f"time constant of the body, {name}", brief(film["time_constant"], "s"), "–", "–"
        if film.get("speed_settling_time") is not None:
            apart = film.get("settling_difference")
            told = "–" if apart is None else f"{100 * apart:.2g} %"
            by_hand = brief(film["speed_settling_time"], "s")
            yield f"speed settled, {name} (massless film)", by_hand, brief(run, "s"), told

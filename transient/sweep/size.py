"""The question turned round: the value of one input at which a headline number meets its limit."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, field
from itertools import pairwise
from typing import Any

import numpy as np

from transient.answer import run
from transient.case.model import Case, CaseError
from transient.case.source import Source
from transient.sweep.facts import learn
from transient.sweep.goal import Goal
from transient.sweep.keys import Varied
from transient.sweep.stated import state
from transient.units import QuantityError, quantity, si_unit

SCAN = 9  # values at which the whole interval is looked at
TURNS = 3  # times that a place where the quantity turns back is looked at more closely
WIDE = 10.0  # ratio of the ends from which the values are spaced evenly in the logarithm
CLOSE = 1e-6  # of the interval: a bracket this narrow is a value
MOST_STEPS = 60


@dataclass(frozen=True)
class Point:
    """The input's value, the quantity's magnitude there and the bound of its error, SI; its verdict."""

    value: float
    magnitude: float
    error: float
    verdict: str


@dataclass(frozen=True)
class Sized:
    """What was found.

    ``found`` the bounding value, which meets the limit, None where the limit is met everywhere or nowhere; ``ends``
    the two ends; ``met`` the intervals in which it is met; ``monotone`` whether the quantity rises or falls throughout,
    as far as the values tried tell; ``evaluations`` how many there were.
    """

    key: str
    unit: str
    dimension: str
    goal: Goal
    found: Point | None
    ends: tuple[Point, Point]
    met: tuple[tuple[float, float], ...]
    monotone: bool
    evaluations: int

    def as_dict(self) -> dict[str, Any]:
        """Plain values in SI for JSON; an infinite magnitude is null."""
        point = self.found
        return {
            "key": self.key,
            "value": None if point is None else point.value,
            "unit": self.unit,
            "quantity": self.goal.name,
            "at_value": None if point is None else _finite(point.magnitude),
            "error": None if point is None else point.error,
            "evaluations": self.evaluations,
            "limit": self.goal.limit,
            "condition": "<=" if self.goal.below else ">=",
            "verdict": None if point is None else point.verdict,
            "monotone": self.monotone,
            "met": [list(one) for one in self.met],
            "ends": [
                {"value": one.value, "at_value": _finite(one.magnitude), "error": one.error} for one in self.ends
            ],
        }


def _finite(value: float) -> float | None:
    return value if math.isfinite(value) else None


@dataclass
class Asked:
    """The case as a function of one input; every answer is kept and counted."""

    case: Case
    key: Varied
    goal: Goal
    points: dict[float, Point] = field(default_factory=dict)

    def at(self, value: float) -> Point:
        """The quantity at a value; raises ``CaseError`` and ``SolveError``."""
        if value not in self.points:
            summary = run(self.case.replace({self.key.name: self.key.typed(value)})).summary
            magnitude, error = self.goal.read(summary)
            self.points[value] = Point(value, magnitude, error, summary["verdict"])
        return self.points[value]

    def known(self) -> list[Point]:
        """All points so far, by rising value."""
        return [self.points[value] for value in sorted(self.points)]


def ends(case: Case, key: str, between: tuple[str, str]) -> tuple[Varied, float, float]:
    """The key and the two ends in SI, rising; raises ``CaseError``."""
    stated = state({"vary": {key: {"values": list(between)}}}, Source("--vary"))
    facts = learn(case, stated, {key: tuple(between)})[0][key]
    if facts.kind != "quantity":
        raise CaseError(f"--vary {key}: is no quantity between two values; a quantity is needed, such as gap.height")
    values = []
    for text in between:
        try:
            values.append(quantity(text, facts.dimension))
        except QuantityError as error:
            raise CaseError(f"--between {key}: {error}") from None
    if values[0] == values[1]:
        raise CaseError(f"--between {key}: the ends are the same; two different values are needed")
    return Varied(key, "quantity", facts.dimension, si_unit(facts.dimension)), min(values), max(values)


def size(case: Case, key: str, between: tuple[str, str], goal: Goal, watch: Callable[[int], None]) -> Sized:
    """The value of ``key`` between two at which ``goal`` is just met; ``watch`` is told of each evaluation.

    The interval is looked at as a whole first, so that a quantity that turns back does not hide the crossing; each
    crossing is then closed in on.  Raises ``CaseError`` and ``SolveError``, also where a value between makes no case.
    """
    varied, low, high = ends(case, key, between)
    asked = Asked(case, varied, goal)
    grid = _grid(low, high)
    for value in (grid[0], grid[-1], *grid[1:-1]):
        asked.at(value)
        watch(len(asked.points))
    for _ in range(TURNS):
        for value in _beside_turns(asked):
            asked.at(value)
            watch(len(asked.points))
    tried = [point.value for point in asked.known()]
    crossings = [
        _crossing(asked, a, b, watch)
        for a, b in pairwise(tried)
        if goal.met(asked.at(a).magnitude) != goal.met(asked.at(b).magnitude)
    ]
    met = _met(asked, low, high, crossings)
    return Sized(
        key, varied.unit, varied.dimension, goal, _chosen(asked, met, low, high, crossings),
        (asked.at(low), asked.at(high)), met, _monotone(asked.known()), len(asked.points),
    )  # fmt: skip


def _grid(low: float, high: float) -> list[float]:
    """Values over the interval, even in the logarithm where its ends lie far apart."""
    if low > 0.0 and high / low >= WIDE:
        return [float(value) for value in np.geomspace(low, high, SCAN)]
    return [float(value) for value in np.linspace(low, high, SCAN)]


def _beside_turns(asked: Asked) -> list[float]:
    """Values beside those at which the quantity turns towards the limit without passing it, as far as is known."""
    points, goal = asked.known(), asked.goal
    sign = 1.0 if goal.below else -1.0
    out: list[float] = []
    for before, here, after in zip(points[:-2], points[1:-1], points[2:], strict=True):
        turns = all(sign * (here.magnitude - one.magnitude) > here.error + one.error for one in (before, after))
        if turns and goal.met(here.magnitude):
            out += [0.5 * (before.value + here.value), 0.5 * (here.value + after.value)]
    return out


def _crossing(asked: Asked, a: float, b: float, watch: Callable[[int], None]) -> float:
    """The value that meets the limit at the crossing between ``a`` and ``b``, of which one does.

    Regula falsi in the variant of Illinois (Dowell & Jarratt 1971), which keeps the crossing bracketed, and halving
    where a magnitude is infinite or the bracket shrinks slowly.
    """
    goal = asked.goal
    tolerance = CLOSE * abs(b - a)
    at_a, at_b = asked.at(a).magnitude - goal.limit, asked.at(b).magnitude - goal.limit
    b_met = goal.met(asked.at(b).magnitude)
    stayed = ""
    for step in range(MOST_STEPS):
        if abs(b - a) <= max(tolerance, 4e-16 * abs(a)) or _just(asked.at(b if b_met else a), goal):
            break
        new = _between(a, b, at_a, at_b, step)
        point = asked.at(new)
        watch(len(asked.points))
        # An end that stays a second time loses half its weight, so that it is left behind sooner.
        if goal.met(point.magnitude) == b_met:
            b, at_b = new, point.magnitude - goal.limit
            at_a, stayed = (0.5 * at_a if stayed == "a" else at_a), "a"
        else:
            a, at_a = new, point.magnitude - goal.limit
            at_b, stayed = (0.5 * at_b if stayed == "b" else at_b), "b"
    return b if b_met else a


def _between(a: float, b: float, at_a: float, at_b: float, step: int) -> float:
    if step % 5 == 4 or not (math.isfinite(at_a) and math.isfinite(at_b)) or at_a == at_b:
        return 0.5 * (a + b)
    new = b - at_b * (b - a) / (at_b - at_a)
    inner = 1e-3 * abs(b - a)
    return float(np.clip(new, min(a, b) + inner, max(a, b) - inner))


def _just(point: Point, goal: Goal) -> bool:
    """Met so closely that the number's own error covers the rest."""
    return goal.met(point.magnitude) and abs(point.magnitude - goal.limit) <= 0.5 * point.error


def _met(asked: Asked, low: float, high: float, crossings: list[float]) -> tuple[tuple[float, float], ...]:
    """The intervals in which the limit is met, between the crossings and the ends."""
    met = asked.goal.met(asked.at(low).magnitude)
    marks = [low] if met else []
    marks += crossings
    if asked.goal.met(asked.at(high).magnitude):
        marks.append(high)
    return tuple(zip(marks[0::2], marks[1::2], strict=True))


def _chosen(
    asked: Asked, met: tuple[tuple[float, float], ...], low: float, high: float, crossings: list[float]
) -> Point | None:
    """The bound of the widest interval in which the limit is met; of its two bounds the one that is no end."""
    if not crossings:
        return None
    wide = max(met, key=lambda one: one[1] - one[0])
    inner = [value for value in wide if value not in (low, high)] or crossings[:1]
    return asked.at(inner[0])


def _monotone(points: list[Point]) -> bool:
    """Whether the magnitudes only rise or only fall, as far as their errors tell."""
    rises = falls = False
    for one, other in pairwise(points):
        slack = one.error + other.error
        rises |= other.magnitude > one.magnitude + slack
        falls |= other.magnitude < one.magnitude - slack
    return not (rises and falls)

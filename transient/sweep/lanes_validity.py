"""Does the model apply, for many rows at once: the checks of ``trust.validity`` on arrays.

Limits and formulas are those of the checks themselves; statuses are 0 pass, 1 caution, 2 fail.
"""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import dataclass

import numpy as np

from transient.gap.problem import Problem
from transient.sweep.columns import VERDICTS
from transient.trust.check import NEAR
from transient.trust.validity import entrance, heating, reynolds
from transient.trust.validity.motion import GAS_BELOW
from transient.trust.validity.pressure_wave import CAUTION as WAVE_CAUTION
from transient.trust.validity.pressure_wave import GAS, LIQUID
from transient.trust.validity.pressure_wave import LIMIT as WAVE_LIMIT
from transient.trust.validity.taylor import NARROW

PASS, CAUTION, FAIL = 0, 1, 2


@dataclass(frozen=True, eq=False)
class Seen:
    """What the checks look at, SI, (n,) each: sizes, properties, largest motions (see ``lanes_headline``), the largest
    work per volume and power, the pressure's swing over its steepest rate (0 with a jump, inf where constant)."""

    gap: np.ndarray
    inner: np.ndarray
    outer: np.ndarray
    length: np.ndarray | None
    section: np.ndarray | None
    density: np.ndarray
    kinematic: np.ndarray
    time: np.ndarray
    pressed: np.ndarray
    spread: np.ndarray
    relative: np.ndarray
    turning: np.ndarray  # [n, 2], each wall's largest speed
    spun_up: np.ndarray
    work: np.ndarray
    power: np.ndarray
    rise: np.ndarray


@dataclass(frozen=True, eq=False)
class Found:
    """One check of all rows: ``value`` (n,), the limits of a caution and of a failure, ``status`` (n,)."""

    name: str
    value: np.ndarray
    caution_at: float
    fail_at: float
    status: np.ndarray


def checks(problem: Problem, seen: Seen) -> Iterator[Found]:
    """Every check that applies, in the order of the registry."""
    moving = any(wall.kind == "moving" for wall in problem.walls)
    axis = problem.walls[0].kind == "axis"
    height = seen.gap * (2.0 if any(wall.kind == "shear_free" for wall in problem.walls) else 1.0)
    wall = np.zeros_like(seen.gap)
    if moving and not axis:
        faster = np.where(seen.turning[:, 1] >= seen.turning[:, 0], seen.outer, seen.inner)
        reach = faster if problem.rotating else 1.0
        wall = seen.spread * reach * height / seen.kinematic
        yield _judged("Reynolds number, wall-driven", wall, NEAR * reynolds.COUETTE, reynolds.COUETTE)
    if moving and not problem.rotating:
        number, limit = seen.relative / seen.kinematic, reynolds.PIPE
        if axis:
            number = number * 2.0 * seen.outer
        elif problem.metric == 0:
            number, limit = number * height, reynolds.CHANNEL
        else:
            number = number * 2.0 * height
        number = number if axis else np.where(seen.pressed, number, 0.0)
        yield _judged("Reynolds number, pressure-driven", number, NEAR * limit, limit)
        if not axis:
            both = np.where(seen.pressed & (wall > 0.0), wall / reynolds.COUETTE + number / limit, 0.0)
            yield _judged("Reynolds number, walls and pressure together", both, NEAR, 1.0)
    if problem.rotating:
        yield _taylor(seen)
    yield from _along(problem, seen, height, axis)
    if moving:
        value = np.minimum(
            seen.work / (seen.density * heating.SPECIFIC_HEAT), seen.power * seen.gap**2 / (8.0 * heating.CONDUCTIVITY)
        )
        yield _judged("viscous heating", value, heating.NOTICEABLE, np.inf)
    if seen.length is not None:
        yield _judged("gap over length", (2.0 * seen.outer if axis else seen.gap) / seen.length, 0.1, 1.0)
    if problem.metric == 0 and seen.section is not None:
        yield _judged("height over width", seen.gap**2 / seen.section, 0.05, 0.5)
    thin = np.where(seen.gap >= 1e-6, PASS, np.where(seen.gap >= 1e-8, CAUTION, FAIL))
    yield Found("very thin gap", seen.gap, 1e-6, 1e-8, thin)


def _along(problem: Problem, seen: Seen, height: np.ndarray, axis: bool) -> Iterator[Found]:
    """Entrance length and pressure waves: of gaps of known length that a pressure drives."""
    if seen.length is None or problem.rotating:
        return
    size = 2.0 * seen.outer if axis else height
    entered = entrance.pipe_entrance if axis else entrance.channel_entrance
    needed = size * entered(seen.relative * size / seen.kinematic)  # type: ignore[arg-type]
    value = np.where(seen.pressed, needed / seen.length, 0.0)
    yield _judged("entrance length", value, entrance.CAUTION, entrance.LIMIT)
    sound = np.where(seen.density < GAS_BELOW, GAS, LIQUID)
    value = np.where(np.isfinite(seen.rise), seen.length / sound / np.maximum(seen.rise, seen.time), 0.0)
    yield _judged("pressure-wave time", value, WAVE_CAUTION, WAVE_LIMIT)


def _taylor(seen: Seen) -> Found:
    """A bound from above: all of the angular momentum lost across the whole gap, at the lowest critical number.

    Nothing is lost where the inner wall rests and the outer one only gains speed: then the angular momentum grows
    outwards everywhere, being a sum of steps' answers that all do.
    """
    fall = np.where(seen.spun_up, 0.0, 1.1 * (seen.turning.max(axis=1) * seen.outer**2) ** 2)
    share = fall * seen.gap**3 / (seen.inner**3 * seen.kinematic**2) / NARROW
    return _judged("Taylor number", share, NEAR, 1.0)


def _judged(name: str, value: np.ndarray, caution_at: float, fail_at: float) -> Found:
    status = np.where(value > fail_at, FAIL, np.where(value > caution_at, CAUTION, PASS))
    return Found(name, value, caution_at, fail_at, np.where(np.isnan(value), FAIL, status))


def verdicts(problem: Problem, seen: Seen) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """(verdict codes, messages, whether each row's verdict is sure) of all rows (n,).

    The Taylor number is only bounded here: where the bound does not pass, a row's own profiles must tell.
    """
    worst = np.zeros(len(seen.gap), np.int64)
    message = np.full(len(seen.gap), "", object)
    sure = np.ones(len(seen.gap), bool)
    for found in checks(problem, seen):
        if found.name == "Taylor number":
            sure &= found.status == PASS
        higher = np.flatnonzero(found.status > worst)
        for row in higher:
            fails = found.status[row] == FAIL
            limit = f"the limit is {found.fail_at:.4g}" if fails else f"a caution from {found.caution_at:.4g} on"
            message[row] = f"{found.name}: {found.value[row]:.3g}, {limit}"
        worst = np.maximum(worst, found.status)
    code = np.array([VERDICTS.index(name) for name in ("good", "caution", "outside")])
    return code[worst].astype(np.int8), message, sure

"""Do the bodies' own momentum and energy close, and where does the drive's work go?

From stored rows alone: what the body gains against the impulse and the work of drive, film, damper, spring, friction
and of the pressure on its face.  Together with the balances of the fluid this closes the whole machine.
"""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import numpy as np

from transient.gap.problem import Body, Problem
from transient.result.history import History
from transient.result.run import BodyFacts, Run
from transient.trust.balance import SOURCE, Closure, increments, judged, power, young_rows
from transient.trust.check import Check, judge
from transient.trust.nodes import forms, quadratic
from transient.trust.quasi_steady import lever


@dataclass(frozen=True, eq=False)
class Ledger:
    """A body's forces by name, each (value, rate) on n rows; ``moves`` (n-1,): intervals in which it is not held."""

    piece: np.ndarray
    offset: np.ndarray
    speed: np.ndarray
    acceleration: np.ndarray
    forces: dict[str, tuple[np.ndarray, np.ndarray]]
    moves: np.ndarray

    def impulse(self, name: str) -> np.ndarray:
        """Increments (n-1,) of a force's impulse."""
        value, rate = self.forces[name]
        return np.where(self.moves, increments(self.piece, self.offset, value, rate), 0.0)

    def work(self, name: str) -> np.ndarray:
        """Increments (n-1,) of a force's work."""
        value, rate = self.forces[name]
        changes = rate * self.speed + value * self.acceleration
        return np.where(self.moves, increments(self.piece, self.offset, value * self.speed, changes), 0.0)

    def gain(self, value: np.ndarray) -> np.ndarray:
        """Changes (n-1,) of a quantity within the pieces; a blow between them is no force of finite size."""
        return np.where(self.piece[1:] == self.piece[:-1], np.diff(value), 0.0)


def ledger(problem: Problem, history: History, body: BodyFacts, use: np.ndarray) -> Ledger:
    """The forces on a body at the rows ``use`` (n,) of a history."""
    own = problem.walls[body.end].body
    assert own is not None
    speed, acceleration = history.speed[use, body.end], history.acceleration[use, body.end]
    piece, place = history.piece[use], history.place[use, body.end]
    slope = body.curve_slope(speed)
    nothing = np.zeros_like(speed)
    forces = {
        "drive": (body.load[use] + body.curve_load(speed), body.load_rate[use] + slope * acceleration),
        "film": (body.grip * history.stress[use, body.end], body.grip * history.stress_rate[use, body.end]),
        "damping": (-own.damping * speed, -own.damping * acceleration),
        "spring": (-own.stiffness * place, -own.stiffness * speed),
        "pressure": (body.face * history.gradient[use], body.face * history.gradient_rate[use])
        if body.face
        else (nothing, nothing),
        "friction": (_friction(own, piece, speed), nothing),
    }
    held = (speed[1:] == 0.0) & (speed[:-1] == 0.0) if body.sticks else np.zeros(len(speed) - 1, bool)
    return Ledger(piece, history.offset[use], speed, acceleration, forces, ~held)


def _friction(body: Body, piece: np.ndarray, speed: np.ndarray) -> np.ndarray:
    """Dry friction (n,) against the way of the piece: at its ends the speed itself is zero."""
    if body.sliding == 0.0:
        return np.zeros_like(speed)
    way = np.zeros(int(piece.max()) + 1)
    np.add.at(way, piece, speed)
    return -body.sliding * np.sign(np.where(speed != 0.0, speed, way[piece]))


def _rows(problem: Problem, history: History) -> np.ndarray:
    """All rows but those that follow an infinite stress too soon to be judged by."""
    return np.flatnonzero(~young_rows(problem, history))


def momentum_closure(problem: Problem, history: History, body: BodyFacts) -> Closure:
    """Change of the body's momentum against the impulse of all that acts on it, over the gross impulse."""
    own = problem.walls[body.end].body
    assert own is not None

    def residual(use: np.ndarray) -> tuple[np.ndarray, float]:
        sheet = ledger(problem, history, body, use)
        parts = [sheet.impulse(name) for name in sheet.forces]
        return sheet.gain(own.mass * sheet.speed) - sum(parts), float(sum(np.abs(part).sum() for part in parts))

    return _closure(residual, _rows(problem, history), history.piece)


def energy_closure(problem: Problem, history: History, body: BodyFacts) -> Closure:
    """Change of the body's and its spring's energy against the work of all else that acts on it, over the gross."""
    own = problem.walls[body.end].body
    assert own is not None

    def residual(use: np.ndarray) -> tuple[np.ndarray, float]:
        sheet = ledger(problem, history, body, use)
        place = history.place[use, body.end]
        stored = 0.5 * own.mass * sheet.speed**2 + 0.5 * own.stiffness * place**2
        parts = [sheet.work(name) for name in sheet.forces if name != "spring"]
        gained = sheet.gain(stored)
        return gained - sum(parts), float(sum(np.abs(part).sum() for part in parts) + np.abs(gained).sum())

    return _closure(residual, _rows(problem, history), history.piece)


def _closure(residual, use: np.ndarray, piece: np.ndarray) -> Closure:
    """Largest running residual over the gross; what every second row makes of it tells how well rows allow to judge."""
    found, gross = residual(use)
    if gross == 0.0:
        return Closure(0.0, 0.0)
    if len(use) < 3:
        return Closure(0.0, math.inf)
    # ends of pieces stay, so that no piece loses its limits
    ends = np.append(piece[use][1:] != piece[use][:-1], True) | np.append(True, piece[use][1:] != piece[use][:-1])
    coarse, _ = residual(use[ends | (np.arange(len(use)) % 2 == 0)])
    # Cubics on twice the spacing err 16 times as much; beside kinks of the drive 4 times.
    resolution = abs(float(np.abs(np.cumsum(coarse)).max()) - float(np.abs(np.cumsum(found)).max())) / 3.0
    return Closure(float(np.abs(np.cumsum(found)).max()) / gross, resolution / gross)


def body_checks(problem: Problem, run: Run) -> list[Check]:
    """Momentum and energy of every body against the accuracy asked for."""
    return list(_checks(problem, run))


def _checks(problem: Problem, run: Run) -> Iterator[Check]:
    names = {wall.end: wall.name for wall in run.walls}
    for body in run.bodies:
        for word, closure in (
            ("momentum", momentum_closure(problem, run.history, body)),
            ("energy", energy_closure(problem, run.history, body)),
        ):
            limit = max(problem.accuracy, closure.resolution)
            status = judge(closure.residual, limit, limit)
            note = f"{word} of the body closes with all that acts on it to {closure.residual:.1e}"
            if math.isinf(closure.resolution):
                note = "the run is too short to judge by"
            elif closure.resolution > problem.accuracy:
                note += f"; what was kept allows to judge to {closure.resolution:.1e} only"
            name = f"{names[body.end]} body, {word}"
            yield Check(name, "numerics", status, closure.residual, limit, SOURCE, note)


def accounts(problem: Problem, run: Run) -> dict[str, Any] | None:
    """Where the work of the whole run went, J; None without bodies.

    ``bodies``: of each the work of its drive, what damper and friction took, what it and its spring store more than
    at t = 0; ``film``: work done on it, dissipated in it, lost where it slips, stored in its motion (None where two
    bodies of unlike areas share it).
    """
    if not run.bodies:
        return None
    history = run.history
    names = {wall.end: wall.name for wall in run.walls}
    use = _rows(problem, history)
    out: dict[str, Any] = {}
    for body in run.bodies:
        own = problem.walls[body.end].body
        assert own is not None
        sheet = ledger(problem, history, body, use)
        speed, place = history.speed[[0, -1], body.end], history.place[[0, -1], body.end]
        out[names[body.end]] = {
            "drive_work": float(sheet.work("drive").sum()),
            "given_to_film": 0.0 - float(sheet.work("film").sum()),
            "given_to_pressure": 0.0 - float(sheet.work("pressure").sum()),
            "damping_loss": 0.0 - float(sheet.work("damping").sum()),
            "friction_loss": 0.0 - float(sheet.work("friction").sum()),
            "kinetic_gain": 0.5 * own.mass * float(np.diff(speed**2)[0]),
            "spring_gain": 0.5 * own.stiffness * float(np.diff(place**2)[0]),
        }
    return {"bodies": out, "film": _film(problem, run)}


def _film(problem: Problem, run: Run) -> dict[str, float] | None:
    reach = lever(problem)
    factors = [body.grip / reach[body.end] for body in run.bodies]
    if max(factors) - min(factors) > 1e-9 * max(factors):
        return None
    history = judged(problem, run.history)
    work, lost, _ = power(problem, history)
    w = history.profile[[0, -1]]
    kinetic = 0.5 * problem.density * quadratic(forms(history.position, problem.metric).mass, w, w)
    gained = float(np.diff(kinetic)[0])
    total, slipped = float(work.sum()), float(np.sum(lost))
    return {
        "work": factors[0] * total,
        "dissipated": factors[0] * (total - slipped - gained),
        "slip_loss": factors[0] * slipped,
        "kinetic_gain": factors[0] * gained,
    }

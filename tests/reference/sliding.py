"""A judge for force-speed curves and dry friction: Chebyshev collocation across the gap, SciPy's Radau in time.

One body on the outer (upper) wall of a gap whose other wall stands still.  Breaks of the drive are landed on, and so
are stops and breakings-away, by SciPy's events.
"""

from __future__ import annotations

import itertools
from typing import Any

import numpy as np
from scipy.integrate import solve_ivp

from .chebyshev import Collocation, _within
from .drives import signal
from .gap import gap_of

STUCK, FORWARD, BACKWARD = 0, 1, -1
MOST_EVENTS = 200


class Sliding:
    """The course of one plain case on [0, until] (form: ``cases.py``; ``curve`` (speeds, values), ``dry_friction`` and
    ``breakaway_friction`` beside a body's other keys)."""

    def __init__(self, case: dict[str, Any], points: int = 40):
        self.case = case
        self.room = Collocation(gap_of(case), points)
        gap = self.room.gap
        self.body = case["walls"][gap.names[1]]["body"]
        self.grip = self.body["area"] * (gap.ro if gap.kind == "rotating" else 1.0)
        self.sliding = self.body.get("dry_friction", 0.0)
        self.breakaway = self.body.get("breakaway_friction", self.sliding)
        self.first = 0 if gap.kind == "pipe" else 1
        self.n = len(self.room.r) - 1 - self.first
        self.linear = self._linear()
        self.force = signal(self.body.get("force", 0.0))
        self.times: list[np.ndarray] = []
        self.states: list[np.ndarray] = []
        self.rests: list[list[float]] = []
        self.march(float(case["duration"]))

    def _linear(self) -> np.ndarray:
        """Rates of the state per unit of each of its entries, curve and friction left out."""
        curve = self.body.pop("curve", None)
        out = np.empty((self.n + 2, self.n + 2))
        for k, unit in enumerate(np.eye(self.n + 2)):
            fluid = (self.room.gap.nu * self.room.operator @ self.whole(unit))[self.first : self.first + self.n]
            out[:, k] = np.concatenate([fluid, [self.net(unit, 0.0) / self.body["mass"], unit[self.n]]])
        if curve is not None:
            self.body["curve"] = curve
        return out

    def whole(self, y: np.ndarray) -> np.ndarray:
        """Velocities at all points of a state: fluid (n,), speed, place."""
        left = [0.0] if self.first else []
        return np.concatenate([left, y[: self.n], [y[self.n]]])

    def net(self, y: np.ndarray, force: float) -> float:
        """All that acts on the body but dry friction."""
        speed = y[self.n]
        load = force + self.grip * self.room.stress(self.whole(y))[1]
        load -= self.body.get("damping", 0.0) * speed + self.body.get("stiffness", 0.0) * y[self.n + 1]
        if "curve" in self.body:
            load += float(np.interp(speed, *self.body["curve"]))
        return load

    def march(self, until: float) -> None:
        edges = np.append(self.force.breaks(until), until)
        y = np.zeros(self.n + 2)
        y[self.n] = self.body.get("initial_speed", 0.0)
        mode = 0
        for a, b in itertools.pairwise(edges):
            force = _within(self.force, a, b)
            t = a
            if self.breakaway:
                mode = self._mode(y, force(a), mode)
            for _ in range(MOST_EVENTS):
                t, y, mode = self._stretch(t, b, y, force, mode)
                if t >= b:
                    break
            else:
                raise ArithmeticError("too many stops")

    def _mode(self, y: np.ndarray, force: float, mode: int) -> int:
        if y[self.n] != 0.0:
            return FORWARD if y[self.n] > 0.0 else BACKWARD
        net = self.net(y, force)
        if abs(net) <= self.breakaway:
            return STUCK
        return FORWARD if net > 0.0 else BACKWARD

    def _stretch(self, a: float, b: float, y: np.ndarray, force: Any, mode: int) -> tuple[float, np.ndarray, int]:
        """Integrate in one mode to ``b`` or to the next event."""
        free = slice(self.first, self.first + self.n)
        linear = self.room.gap.nu * self.room.operator
        stuck = self.breakaway > 0.0 and mode == STUCK

        def rate(t: float, y: np.ndarray) -> np.ndarray:
            fluid = (linear @ self.whole(y))[free]
            if stuck:
                return np.concatenate([fluid, [0.0, 0.0]])
            push = self.net(y, force(t)) - mode * self.sliding
            return np.concatenate([fluid, [push / self.body["mass"], y[self.n]]])

        def jacobian(t: float, y: np.ndarray) -> np.ndarray:
            out = self.linear.copy()
            if stuck:
                out[self.n :] = 0.0
            elif "curve" in self.body:
                at, value = (np.array(row) for row in self.body["curve"])
                slope = np.concatenate([[0.0], np.diff(value) / np.diff(at), [0.0]])
                out[self.n, self.n] += slope[np.searchsorted(at, y[self.n], side="right")] / self.body["mass"]
            return out

        def stops(t: float, y: np.ndarray) -> float:
            return y[self.n] if t > a else float(mode)

        def breaks(t: float, y: np.ndarray) -> float:
            return abs(self.net(y, force(t))) - self.breakaway

        event = breaks if stuck else stops
        event.terminal = True  # type: ignore[attr-defined]
        event.direction = 1.0 if stuck else -float(mode)  # type: ignore[attr-defined]
        events = [event] if self.breakaway else None
        if stuck and not (self.rests and self.rests[-1][1] == a):
            self.rests.append([a, b])
        run = solve_ivp(
            rate, (a, b), y, "Radau", events=events, rtol=1e-9, atol=1e-13, first_step=(b - a) * 1e-7,
            max_step=(b - a) / 60, dense_output=True, jac=jacobian,
        )  # fmt: skip
        if not run.success:
            raise ArithmeticError(run.message)
        between = np.unique(np.concatenate([np.linspace(u, v, 9) for u, v in itertools.pairwise(run.t)]))
        self.times.append(between)
        self.states.append(run.sol(between).T)
        end, y = float(run.t[-1]), run.y[:, -1].copy()
        if stuck:
            self.rests[-1][1] = end
        if run.status != 1:
            return b, y, mode
        if stuck:
            return end, y, FORWARD if self.net(y, force(end)) > 0.0 else BACKWARD
        y[self.n] = 0.0
        net = self.net(y, force(end))
        return end, y, STUCK if abs(net) <= self.breakaway else (FORWARD if net > 0.0 else BACKWARD)

    @property
    def speed(self) -> np.ndarray:
        """Speeds at all steps."""
        return np.concatenate([part[:, self.n] for part in self.states])

    @property
    def place(self) -> np.ndarray:
        """Places at all steps."""
        return np.concatenate([part[:, self.n + 1] for part in self.states])

    def final_stress(self) -> float:
        """Stress on the body's wall in the end."""
        return float(self.room.stress(self.whole(self.states[-1][-1]))[1])

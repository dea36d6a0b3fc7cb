"""A judge for bodies on walls and prescribed flow: high-order finite elements across the gap, closed forms in time.

Legendre-Gauss-Lobatto elements of degree 12, graded towards both walls down to 1e-5 of the gap, hold every layer that a
run makes; the weak form gives each wall's stress as its reaction (from memory: Canuto et al., Spectral Methods,
2006).  Bodies are masses on the wall nodes, what is prescribed is a constraint with its reaction.  The resulting linear
system is taken to its own modes, in which polynomials and exponentials integrate in closed form.  It shares
nothing with the product: no transfer function, no contour, no eigenfunction of a gap.
"""

from __future__ import annotations

from collections.abc import Callable
from functools import lru_cache
from math import factorial
from typing import Any

import numpy as np
from scipy.linalg import null_space
from scipy.optimize import brentq

from .drives import Piece, Signal, signal
from .gap import gap_of, steady

DEGREE = 12
EDGES = (0.0, 1e-5, 1e-4, 1e-3, 1e-2, 0.06, 0.2, 0.5)
GRAVITY = 9.80665


@lru_cache(maxsize=2)
def lobatto(n: int) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """(points, weights, derivative matrix) of n + 1 Legendre-Gauss-Lobatto points on [-1, 1]."""
    legendre = np.polynomial.Legendre.basis(n)
    x = np.concatenate([[-1.0], np.sort(legendre.deriv().roots().real), [1.0]])
    value = legendre(x)
    weight = 2.0 / (n * (n + 1) * value**2)
    apart = x[:, None] - x[None, :] + np.eye(n + 1)
    d = value[:, None] / value[None, :] / apart
    np.fill_diagonal(d, 0.0)
    d[0, 0], d[-1, -1] = -n * (n + 1) / 4.0, n * (n + 1) / 4.0
    return x, weight, d


class Plant:
    """One case as ``M dz/dt + K z = R reaction + loads``, ``C' z = prescribed``, in SI.

    Inputs: one Signal per prescribed wall, body and pressure; a body's place is part of the state where it is sprung.
    """

    def __init__(self, case: dict[str, Any]):
        self.case, self.gap = case, gap_of(case)
        self.metric = {"plates": 0, "pipe": 1, "axial": 1, "rotating": 3}[self.gap.kind]
        self._elements()
        self._walls()
        self._reduce()

    # --- space -------------------------------------------------------------------------------------------------

    def _elements(self) -> None:
        gap = self.gap
        edges = np.array(EDGES)
        share = np.concatenate([edges, 1.0 - edges[-2::-1]])
        if gap.kind == "pipe":
            share = np.concatenate([[0.0, 0.25], 1.0 - edges[::-1]])
        x, weight, d = lobatto(DEGREE)
        count = (len(share) - 1) * DEGREE + 1
        self.r = np.empty(count)
        mass, stiff, volume = np.zeros(count), np.zeros((count, count)), np.zeros(count)
        mean = np.zeros(count)
        gauss, gauss_weight = np.polynomial.legendre.leggauss(DEGREE + 4)
        at = _lagrange(x, gauss)
        full = np.zeros((count, count))
        for e in range(len(share) - 1):
            own = slice(e * DEGREE, (e + 1) * DEGREE + 1)
            half = (share[e + 1] - share[e]) / 2 * (gap.ro - gap.ri)
            low = gap.ri + share[e] * (gap.ro - gap.ri)
            self.r[own] = low + half * (x + 1)
            r = low + half * (gauss + 1)
            slope = at @ d / half
            measure = gauss_weight * half * r**self.metric
            stiff[own, own] += gap.mu * slope.T @ (measure[:, None] * slope)
            full[own, own] += gap.rho * at.T @ (measure[:, None] * at)
            volume[own] += at.T @ measure
            mean[own] += at.T @ (gauss_weight * half * (r if self.metric else 1.0))
        del mass, weight
        self.mass, self.stiff, self.volume = full, stiff, volume
        self.liquid = full  # before bodies are added
        self.r[0], self.r[-1] = gap.ri, gap.ro
        self.mean = mean / (mean.sum() if self.metric != 3 else gap.ro - gap.ri)

    def _walls(self) -> None:
        """Bodies and constraints; ``labels`` of the inputs in order."""
        case, gap, n = self.case, self.gap, len(self.r)
        walls = case.get("walls", {})
        self.signals: list[Signal] = []
        self._said: list[Any] = []
        self.bodies: dict[int, dict[str, Any]] = {}
        constraint, reaction, loads = [], [], []
        self.scale = np.array([gap.ri, gap.ro]) ** (2 if self.metric == 3 else self.metric)
        self.known: list[tuple[str, int]] = []
        for end, name in enumerate(gap.names):
            node = np.zeros(n)
            node[0 if end == 0 else -1] = 1.0
            wall = walls.get(name, {})
            if (gap.kind == "pipe" and end == 0) or wall.get("shear_free"):
                continue
            body = wall.get("body")
            if body is None:
                self._hear(wall.get("speed"))
                constraint.append(node)
                reaction.append(node)
                self.known.append(("wall", end))
                continue
            grip = body["area"] * case.get("count", 1) * (self.r[0 if end == 0 else -1] if self.metric == 3 else 1.0)
            factor = self.scale[end] / grip
            self.bodies[end] = {**body, "grip": grip, "factor": factor, "node": node}
            self.mass = self.mass + body["mass"] * factor * np.outer(node, node)
            self.stiff = self.stiff + body.get("damping", 0.0) * factor * np.outer(node, node)
            self._hear(body.get("force", 0.0))
            loads.append((len(self.signals) - 1, factor * node))
        pressure = case.get("pressure")
        self.flow = isinstance(pressure, dict) and ("mean_velocity" in pressure or "sealed" in pressure)
        if self.flow:
            self._hear(pressure.get("mean_velocity", 0.0))
            vector, push = self.mean.copy(), self.volume.copy()
            for body in self.bodies.values():
                if body.get("displaces"):
                    section = case["width"] * (gap.ro - gap.ri) if not self.metric else np.pi * (gap.ro**2 - gap.ri**2)
                    vector = vector + body["displaces"] / (section * case.get("count", 1)) * body["node"]
                    push = push + body["factor"] * body["displaces"] * case["length"] * body["node"]
            constraint.append(vector)
            reaction.append(push)
            self.known.append(("flow", 2))
        elif self.metric != 3:
            self._hear(pressure)
            loads.append((len(self.signals) - 1, self.volume))
        self.constraint = np.array(constraint).reshape(-1, n).T
        self.reaction = np.array(reaction).reshape(-1, n).T
        self.prescribed = [k for k in range(len(self.signals)) if k not in {i for i, _ in loads}]
        self.load = np.zeros((n, len(self.signals)))
        for i, vector in loads:
            self.load[:, i] += vector

    def _hear(self, history: Any) -> None:
        self.signals.append(signal(history))
        self._said.append(history)

    def _reduce(self) -> None:
        """State (q, places of sprung bodies) in its modes: da/dt = rates a + source inputs; z = N q + lift inputs."""
        n = len(self.r)
        weighed = np.linalg.solve(self.mass, self.reaction)
        self.grip = np.linalg.inv(self.constraint.T @ weighed) if self.prescribed else np.zeros((0, 0))
        self.lift = np.zeros((n, len(self.signals)))
        if self.prescribed:
            self.lift[:, self.prescribed] = weighed @ self.grip
        space = null_space(self.constraint.T) if self.prescribed else np.eye(n)
        test = null_space(self.reaction.T) if self.prescribed else np.eye(n)
        self.space = space
        self.sprung = [end for end, body in self.bodies.items() if body.get("stiffness", 0.0) > 0.0]
        spring = np.array([self.bodies[e]["stiffness"] * self.bodies[e]["factor"] * self.bodies[e]["node"]
                           for e in self.sprung]).reshape(-1, n).T  # fmt: skip
        self.spring = spring
        size = space.shape[1]
        total = size + len(self.sprung)
        weight, matrix = np.eye(total), np.zeros((total, total))
        source = np.zeros((total, len(self.signals)))
        weight[:size, :size] = test.T @ self.mass @ space
        matrix[:size, :size] = -test.T @ self.stiff @ space
        matrix[:size, size:] = -test.T @ spring
        source[:size] = test.T @ (self.load - self.stiff @ self.lift)
        for k, end in enumerate(self.sprung):
            matrix[size + k, :size] = self.bodies[end]["node"] @ space
            source[size + k] = self.bodies[end]["node"] @ self.lift
        self._modes(matrix, weight, source)
        self.project = np.linalg.inv(test.T @ self.mass @ space) @ test.T @ self.mass

    def _modes(self, matrix: np.ndarray, weight: np.ndarray, source: np.ndarray) -> None:
        """Modes of ``weight dy/dt = matrix y + source u``, from shifted inverses: near a shift they keep their digits.

        One shift beside the fluid's own rates, and one beside the slowest of the bodies'.
        """
        own = 1.0 / self.gap.time
        rates, modes, given = _shifted(matrix, weight, source, own)
        slow = np.abs(rates) < 1e-2 * own
        moving = np.abs(rates[slow])
        moving = moving[moving > 1e-11 * own]
        if len(moving):
            again = _shifted(matrix, weight, source, 0.7 * float(moving.min()))
            own_slow = np.argsort(np.abs(again[0]))[: int(slow.sum())]
            rates = np.concatenate([rates[~slow], again[0][own_slow]])
            modes = np.concatenate([modes[:, ~slow], again[1][:, own_slow]], axis=1)
            given = np.concatenate([given[~slow], again[2][own_slow]])
        self.rates, self.modes, self.source = rates, modes, given
        self.back = np.linalg.inv(modes)

    def between(self, parts: int = 300) -> np.ndarray:
        """(m, n): from the nodes to ``parts`` points of every element; times the radius in a rotating gap."""
        at = _lagrange(lobatto(DEGREE)[0], np.linspace(-1.0, 1.0, parts))
        count = (len(self.r) - 1) // DEGREE
        out = np.zeros((count * parts, len(self.r)))
        for e in range(count):
            out[e * parts : (e + 1) * parts, e * DEGREE : (e + 1) * DEGREE + 1] = at
        return out * (out @ self.r)[:, None] if self.metric == 3 else out

    # --- time --------------------------------------------------------------------------------------------------

    def before(self) -> np.ndarray:
        """Inputs just before t = 0."""
        if self.case.get("start", "rest") == "rest":
            return np.zeros(len(self.signals))
        pairs = zip(self.signals, self._said, strict=True)
        return np.array([s.before if isinstance(h, dict) or h is None else float(h) for s, h in pairs])

    def steady(self, inputs: np.ndarray, held: dict[int, float]) -> tuple[np.ndarray, np.ndarray]:
        """(z, places of sprung bodies) of the steady state; bodies are ``held`` at given speeds or by their springs."""
        rows, right = [self.constraint.T], [inputs[self.prescribed]]
        reactions = [self.reaction]
        stopped = [end for end in self.bodies if end in held or end in self.sprung]
        for end in stopped:
            rows.append(self.bodies[end]["node"][None])
            right.append(np.array([held.get(end, 0.0)]))
            reactions.append(self.bodies[end]["node"][:, None])
        c, r = np.concatenate(rows), np.concatenate(reactions, axis=1)
        whole = np.block([[self.stiff, -r], [c, np.zeros((len(c), r.shape[1]))]])
        found = np.linalg.solve(whole, np.concatenate([self.load @ inputs, *right]))
        z = found[: len(self.r)]
        # what a stopped body's reaction carries its spring has to carry
        force = found[len(self.r) + self.reaction.shape[1] :]
        places = []
        for end in self.sprung:
            body = self.bodies[end]
            push = -force[stopped.index(end)] / body["factor"]
            places.append(push / body["stiffness"])
        return z, np.array(places)

    def start(self) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """(state, places (2,) at t = 0, the inputs before)."""
        inputs = self.before()
        place = np.zeros(2)
        given = {end: b["initial_speed"] for end, b in self.bodies.items() if b.get("initial_speed") is not None}
        for end, body in self.bodies.items():
            place[end] = body.get("initial_displacement", 0.0)
        size = self.space.shape[1]
        if self.case.get("start", "rest") == "rest":
            # impulses that leave the bodies at their speeds, whatever else they set in motion
            q = np.zeros(size)
            moved = [end for end in given if given[end]]
            if moved:
                nodes = np.array([self.bodies[end]["node"] for end in moved]).T
                answer = self.project @ np.linalg.solve(self.mass, nodes)
                share = np.linalg.solve(nodes.T @ self.space @ answer, [given[end] for end in moved])
                q = answer @ share
        else:
            z, own = self.steady(inputs, given)
            q = self.project @ (z - self.lift @ inputs)
            for k, end in enumerate(self.sprung):
                if end not in given:
                    place[end] = own[k]
        return np.concatenate([q, place[self.sprung]])[: size + len(self.sprung)], place, inputs

    def run(self, until: float) -> Run:
        """The course on [0, until]."""
        return Run(self, until)


class Run:
    """The course of a plant: exact at any time, one-sided at breaks (from the left, but at t = 0)."""

    def __init__(self, plant: Plant, until: float):
        self.plant, self.until = plant, until
        edges = np.unique(np.concatenate([s.breaks(until) for s in plant.signals] + [[0.0]]))
        keep = np.concatenate([[True], np.diff(edges) > 1e-12 * until])
        self.edges = edges[keep]
        self.owners = [self._pieces(t, e) for t, e in zip(self.edges, np.append(self.edges[1:], until), strict=True)]
        state, self.place, _ = plant.start()
        amplitude = plant.back @ state.astype(complex)
        position = self.place.astype(complex)
        self.amplitudes, self.places = [amplitude], [position]
        for k, length in enumerate(np.diff(self.edges)):
            amplitude, position = self._advance(k, np.array([length]))
            self.amplitudes.append(amplitude[:, 0])
            self.places.append(position[:, 0])

    def _pieces(self, begin: float, end: float) -> list[list[Piece]]:
        middle = (begin + min(end, begin + 1e30)) / 2 if end > begin else begin
        out = []
        for own in self.plant.signals:
            out.append([[p for p in atom.expand(0.0, max(end, 1e-300)) if p.start <= middle][-1] for atom in own.atoms])
        return out

    def inputs(self, k: int, x: np.ndarray, order: int = 0) -> np.ndarray:
        """(inputs, n) at local times ``x`` of stretch k."""
        t = self.edges[k] + x
        return np.array([sum((p.value(t, order) for p in own), np.zeros(len(x))) for own in self.owners[k]])

    def _advance(self, k: int, x: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Modal amplitudes (modes, n) and places (2, n) at local times ``x`` of stretch k."""
        plant = self.plant
        rates = plant.rates[:, None]
        source = plant.source
        begin = self.amplitudes[k]
        out = np.exp(rates * x) * begin[:, None]
        travel = x * _phi(rates * x, 1) * begin[:, None]  # integral of the amplitudes
        direct = np.zeros((len(plant.signals), len(x)), complex)  # integral of the inputs
        for i, own in enumerate(self.owners[k]):
            for piece in own:
                shift = self.edges[k] - piece.start
                poly = np.polynomial.Polynomial(piece.poly)
                for d in range(len(piece.poly)):
                    c = float(poly.deriv(d)(shift)) if d else float(poly(shift))
                    if c == 0.0:
                        continue
                    out += c * source[:, i : i + 1] * x ** (d + 1) * _phi(rates * x, d + 1)
                    travel += c * source[:, i : i + 1] * x ** (d + 2) * _phi(rates * x, d + 2)
                    direct[i] += c * x ** (d + 1) / factorial(d + 1)
                for c, sigma in piece.waves:
                    c = c * np.exp(sigma * shift)
                    for half, s in ((c / 2, sigma), (np.conj(c) / 2, np.conj(sigma))):
                        grown, summed = _wave(rates, s, x)
                        out += half * source[:, i : i + 1] * grown
                        travel += half * source[:, i : i + 1] * summed
                        direct[i] += half * x * _phi(s * x, 1)
        size = plant.space.shape[1]
        moved = plant.space @ (plant.modes[:size] @ travel) + plant.lift @ direct
        place = self.places[k][:, None] + np.stack([moved[0], moved[-1]])
        return out, place

    def at(self, times: np.ndarray) -> dict[str, np.ndarray]:
        """Channels (n,) or (2, n) at ``times``: stress, speed, place, acceleration (2, n), mean, gradient (n,), z."""
        times = np.atleast_1d(np.asarray(times, dtype=float))
        owner = np.clip(np.searchsorted(self.edges, times, side="left") - 1, 0, None)
        parts: dict[str, np.ndarray] = {}
        for k in np.unique(owner):
            here = np.flatnonzero(owner == k)
            for name, value in self._outputs(int(k), times[here] - self.edges[k]).items():
                parts.setdefault(name, np.zeros((*value.shape[:-1], len(times))))[..., here] = value
        return parts

    def _outputs(self, k: int, x: np.ndarray) -> dict[str, np.ndarray]:
        plant = self.plant
        amplitude, place = self._advance(k, x)
        u, slope = self.inputs(k, x), self.inputs(k, x, 1)
        state = (plant.modes @ amplitude).real
        size = plant.space.shape[1]
        z = plant.space @ state[:size] + plant.lift @ u
        gradient = np.zeros(len(x))
        stress = np.zeros((2, len(x)))
        if not plant.flow and plant.metric != 3:
            gradient = u[-1]
        # what the steady flow of this instant would exert, less what its liquid takes up (the momentum equation times
        # the steady profile of that wall's own motion): local balances would magnify the modes' round-off
        moving = (plant.modes @ (plant.rates[:, None] * amplitude + plant.source @ u)).real[:size]
        moving = plant.space @ moving + plant.lift @ slope
        calm = steady(plant.gap, np.maximum(plant.r, 1e-12 * plant.gap.ro))
        if plant.flow:  # the same with the profile of a unit pressure drop
            still = calm[2, 3:]
            taken = (still @ plant.liquid) @ moving + plant.volume @ z
            pulled = (calm[2, :2] * plant.scale) @ z[[0, -1]]
            gradient = (taken - pulled) / (still @ plant.volume)
        for end, scale in enumerate(plant.scale):
            if scale > 0.0 or plant.gap.kind != "pipe":
                taken = (calm[end, 3:] @ plant.liquid) @ moving / scale
                stress[end] = calm[0, end] * z[0] + calm[1, end] * z[-1] + calm[2, end] * gradient - taken
        return {
            "stress": stress, "speed": z[[0, -1]], "place": place.real, "acceleration": moving[[0, -1]],
            "mean": plant.mean @ z, "gradient": gradient, "z": z,
        }  # fmt: skip


def _shifted(
    matrix: np.ndarray, weight: np.ndarray, source: np.ndarray, shift: float
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """(rates, modes, sources of the modes' amplitudes), from the inverse at ``shift``."""
    moved = matrix - shift * weight
    inverse, modes = np.linalg.eig(np.linalg.solve(moved, weight))
    given = (np.linalg.inv(modes) @ np.linalg.solve(moved, source)) / inverse[:, None]
    return shift + 1.0 / inverse, modes, given


def _lagrange(nodes: np.ndarray, x: np.ndarray) -> np.ndarray:
    """(x, nodes) Lagrange polynomials."""
    out = np.ones((len(x), len(nodes)))
    for j in range(len(nodes)):
        for k in range(len(nodes)):
            if k != j:
                out[:, j] *= (x - nodes[k]) / (nodes[j] - nodes[k])
    return out


def _phi(z: np.ndarray, k: int) -> np.ndarray:
    """phi_k(z) = sum z^j / (j + k)!."""
    small = np.abs(z) < 2.0
    near = np.where(small, z, 0.0)
    series = np.zeros_like(near)
    for j in range(30, -1, -1):
        series = series * near + 1.0 / factorial(j + k)
    far = np.where(small, 1.0, z)
    last = np.exp(far)
    for j in range(1, k + 1):
        last = (last - 1.0 / factorial(j - 1)) / far
    return np.where(small, series, last)


def _wave(rates: np.ndarray, s: complex, x: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Integral of exp(rate (x - t) + s t) over [0, x], and the integral of that over x."""
    apart = s - rates
    near = np.abs(apart * x) < 1e-3
    safe = np.where(np.abs(apart) > 0.0, apart, 1.0)
    free = np.exp(rates * x)
    grown = np.where(near, free * x * _phi(apart * x * near, 1), (np.exp(s * x) - free) / safe)
    whole = (x * _phi(s * x, 1) - x * _phi(rates * x, 1)) / safe
    return grown, np.where(near, x**2 * _phi(rates * x, 2), whole)


def last_above(value: Callable[[np.ndarray], np.ndarray], band: float, times: np.ndarray) -> float | None:
    """Last time at which ``value`` falls below ``band``; 0 if never above, None if still above at the end."""
    above = value(times) > band
    if above[-1]:
        return None
    if not above.any():
        return 0.0
    i = int(np.flatnonzero(above)[-1])
    tight = 1e-13 * float(times[-1])
    return float(brentq(lambda t: float(value(np.array([t]))[0]) - band, times[i], times[i + 1], xtol=tight))

"""Exact headline numbers of a linear case by the contract's definitions."""

from __future__ import annotations

import itertools
from collections.abc import Callable
from typing import Any

import numpy as np

from .drives import Signal, signal, slope
from .gap import gap_of
from .laplace import Cycles, Response, chains, long_past
from .profile import Profile

RECENT = 4  # cycles of a periodic drive that are answered piece by piece
ZERO = 1e-6  # the contract's "zero": this share of the run's largest value
Function = Callable[[np.ndarray], np.ndarray]


def _within_cycle(t: np.ndarray, every: float) -> np.ndarray:
    """Times modulo ``every``, in (0, every]: a break counts from the left, as elsewhere."""
    phase = t - np.floor(t / every) * every
    near = phase <= 4e-16 * t
    return np.where(near, every, phase)


class Judge:
    """One plain case (see ``cases.py``), exact at any time of its run.

    Channels: 0 and 1 the stresses (inner wall first), 2 the mean velocity.
    """

    def __init__(self, case: dict[str, Any], duration: float | None = None):
        self.case, self.gap = case, gap_of(case)
        self.until = float(duration if duration is not None else case["duration"])
        self.within = case.get("settle_within", 0.01)
        self.rest = case.get("start", "rest") == "rest"
        walls = [case.get("walls", {}).get(name, {}) for name in self.gap.names]
        speeds = [slope(signal(w["displacement"])) if "displacement" in w else signal(w.get("speed")) for w in walls]
        bare = [w.get("speed") for w in walls] + [case.get("pressure")]
        self.signals: list[Signal] = [*speeds, signal(case.get("pressure"))]
        self.before = [
            0.0 if self.rest else (s.before if isinstance(b, dict) or b is None else float(b))
            for s, b in zip(self.signals, bare, strict=True)
        ]
        self.profile = Profile(self.gap)
        self.response = Response(self.gap, self.profile.r)
        self.count = 3 + len(self.profile.r)
        self._inputs = []
        for s, was, own in zip(self.signals, self.before, bare, strict=True):
            links = chains(s, self.rest, self.until)
            self._inputs.append(links if isinstance(own, dict) or own is None else [(links[0][0], was)])
        self.regime, self.period = self._regime()
        self._samples: dict[float, np.ndarray] = {}

    # --- histories -----------------------------------------------------------------------------------------------

    def state(self, t: np.ndarray, channels: int = 3, order: int = 0) -> np.ndarray:
        """(channels, n) at times t > 0."""
        return self.response.histories(self._inputs, np.asarray(t, dtype=float), channels, order)

    def velocity(self, t: np.ndarray, r: np.ndarray) -> np.ndarray:
        """(n, M) velocity (tangential in a rotating gap) at radii ``r``."""
        r = np.asarray(r, dtype=float)
        safe = np.maximum(r, 1e-12 * self.gap.ro) if self.gap.kind == "pipe" else r
        other = Response(self.gap, safe)
        w = other.histories(self._inputs, np.asarray(t, dtype=float), 3 + len(r))[3:].T
        return w * r if self.gap.kind == "rotating" else w

    def settled(self, t: np.ndarray, channels: int = 3) -> np.ndarray:
        """The regime that the drive ends in (channels, n) at times ``t``."""
        t = np.asarray(t, dtype=float)
        out = np.zeros((channels, len(t)))
        loops: dict[float, tuple[list[list[tuple]], list[Cycles]]] = {}
        for row, s in enumerate(self.signals):
            for atom in s.atoms:
                if atom.final is not None:
                    out += atom.final * self.response.steady[row, :channels, None]
                elif atom.every is None:
                    last = atom.pieces[-1]
                    out += last.poly[0] * self.response.steady[row, :channels, None]
                    for c, sigma in last.waves:
                        wave = c * np.exp(sigma * (t - last.start))
                        out += (self.response.wave(sigma)[row, :channels, None] * wave).real
                else:
                    recent, past = loops.setdefault(atom.every, ([[], [], []], []))
                    begin = -RECENT * atom.every
                    pieces = atom.expand(begin, atom.every)
                    # the cycles that came before end at this cycle's last value
                    recent[row].append((pieces, float(atom.pieces[-1].value(np.array(atom.every)))))
                    past += long_past(row, list(atom.pieces), atom.every, begin, self.gap.memory)
        for every, (recent, past) in loops.items():
            out += self.response.histories(recent, _within_cycle(t, every), channels, past=tuple(past))
        return out

    def deviation(self, t: np.ndarray, channels: int = 3) -> np.ndarray:
        """State minus the regime that it ends in."""
        return self.state(t, channels) - self.settled(t, channels)

    def _regime(self) -> tuple[str, float | None]:
        ends = [s.eventual for s in self.signals]
        if any(kind == "neither" for kind, _ in ends):
            return "neither", None
        if all(kind == "constant" for kind, _ in ends):
            return "constant", None
        every = Signal(tuple(a for s in self.signals for a in s.atoms))
        return every.eventual

    # --- sampling ------------------------------------------------------------------------------------------------

    @property
    def breaks(self) -> np.ndarray:
        """All break times in [0, until)."""
        times = np.unique(np.concatenate([s.breaks(self.until) for s in self.signals]))
        keep = np.concatenate([[True], np.diff(times) > 1e-12 * np.maximum(times[1:], 1e-300)])
        return times[keep]

    def samples(self, least: float = 1e-10) -> np.ndarray:
        """Times dense in every decade after each break and in every turn of a wave; breaks count from the left."""
        if least not in self._samples:
            self._samples[least] = self._dense(self.breaks, self.until, least)
        return self._samples[least]

    def _dense(self, breaks: np.ndarray, until: float, least: float) -> np.ndarray:
        edges = np.append(breaks[breaks < until], until)
        many = len(edges) > 60
        turns = max([abs(sg.imag) for s in self.signals for a in s.atoms for p in a.pieces for _, sg in p.waves] or [0])
        out = [edges[1:]]
        for a, b in itertools.pairwise(edges):
            span = b - a
            low = max(least * min(span, self.gap.time), 4e-16 * b)
            if low < span:
                out.append(a + np.geomspace(low, span, int(np.log10(span / low) * (6 if many else 14)) + 4)[:-1])
            steps = (16 if many else 60) + int(min(turns * span * 6, 60_000))
            out.append(a + span * np.arange(1, steps) / steps)
        return np.unique(np.concatenate(out))

    # --- numbers -------------------------------------------------------------------------------------------------

    def unbounded(self, end: int) -> tuple[float, float]:
        """(K, time of that jump) of the largest jump of a wall's own speed; K = 0 where there is none.

        Stokes' first problem (Schlichting, Boundary-Layer Theory, from memory): |stress| = |dU| sqrt(rho mu / (pi t)).
        """
        if self.gap.slip[end] or self.gap.free[end] or (self.gap.kind == "pipe" and end == 0):
            return 0.0, 0.0
        radius = (self.gap.ri, self.gap.ro)[end] if self.gap.kind == "rotating" else 1.0
        jumps = self.signals[end].jumps(self.until, self.before[end])
        size = max((abs(j) for _, j in jumps), default=0.0)
        # of equal jumps, which a repeat makes but for round-off, the first
        at = -min((t for t, j in jumps if abs(j) >= (1.0 - 1e-9) * size), default=0.0)
        return float(radius * size * np.sqrt(self.gap.rho * self.gap.mu / np.pi)), -at

    def peak(self, channel: int) -> tuple[float, float]:
        """(signed value, time) of the largest magnitude over 0 < t <= until."""
        t = self.samples()
        y = np.abs(self.state(t)[channel])
        inner = (y >= np.append(0.0, y[:-1])) & (y >= np.append(y[1:], 0.0)) & (y > 0.95 * y.max())
        spots = np.flatnonzero(inner)
        spots = spots[np.argsort(-y[spots])][:80]  # the summits of a wave tie to the sampling
        best = (float(self.state(t[[y.argmax()]])[channel, 0]), float(t[y.argmax()]))
        for i in spots:
            lo, hi = self._bracket(t, i)
            found = self._summit(channel, lo, hi)
            if abs(found[0]) > abs(best[0]):
                best = found
        return max([best, self._first_instant(channel), *self._limits(channel)], key=lambda p: abs(p[0]))

    def _first_instant(self, channel: int) -> tuple[float, float]:
        """(value, 0) that the run begins with, where the wall's own speed does not jump then."""
        if channel < 2 and any(t == 0.0 for t, _ in self.signals[channel].jumps(self.until, self.before[channel])):
            return 0.0, 0.0
        return float(np.array(self.before) @ self.response.steady[:, channel]), 0.0

    def _limits(self, channel: int) -> list[tuple[float, float]]:
        """(stress, time) just after each jump of a slipping wall's own speed: mu/b times the change at once."""
        if channel > 1 or not self.gap.slip[channel]:
            return []
        radius = (self.gap.ri, self.gap.ro)[channel] if self.gap.kind == "rotating" else 1.0
        stiff = self.gap.mu * radius / self.gap.slip[channel]
        out = []
        for t, jump in self.signals[channel].jumps(self.until, self.before[channel]):
            was = np.array(self.before) @ self.response.steady[:, channel] if t == 0 else self.state([t])[channel, 0]
            out.append((float(was) - stiff * jump, float(t)))
        return out

    def _bracket(self, t: np.ndarray, i: int) -> tuple[float, float]:
        """The neighbours of sample i, not across a break from the sample."""
        return float(t[max(i - 1, 0)]), float(t[min(i + 1, len(t) - 1)])

    def _summit(self, channel: int, lo: float, hi: float) -> tuple[float, float]:
        breaks = self.breaks
        inside = breaks[(breaks > lo * (1 + 1e-14)) & (breaks < hi * (1 - 1e-14))]
        edges = np.concatenate([[lo], inside, [hi]])
        best = (0.0, lo)
        for a, b in itertools.pairwise(edges):
            for _ in range(9):
                # close to the ends, for the summit may lie beside one, but on this side of any break
                x = np.linspace(a + 1e-9 * (b - a), b - 1e-9 * (b - a), 18)
                y, rate = self.state(x)[channel], self.state(x, order=1)[channel] * 1.0
                slope_of = np.sign(y) * rate
                turn = np.flatnonzero((slope_of[:-1] > 0) & (slope_of[1:] <= 0))
                k = int(np.abs(y).argmax())
                if abs(y[k]) > abs(best[0]):
                    best = (float(y[k]), float(x[k]))
                if not len(turn) or x[0] == x[-1]:
                    break
                j = int(turn[np.abs(y[turn]).argmax()])
                a, b = x[j], x[j + 1]
                if b - a <= 1e-13 * b:
                    break
        return best

    def first_at(self, channel: int, level: float) -> float:
        """First time at which the magnitude reaches ``level``; that of the peak where only the peak does."""
        found = self._first(self.samples(), lambda x: np.abs(self.state(x)[channel]) - level)
        return self.peak(channel)[1] if np.isnan(found) else found

    def _first(self, t: np.ndarray, above: Function) -> float:
        on = np.flatnonzero(above(t) >= 0)
        if not len(on):
            return float("nan")
        if on[0] == 0:
            return float(t[0])
        lo, hi = t[on[0] - 1], t[on[0]]
        for _ in range(9):
            x = np.linspace(lo, hi, 18)
            k = max(int(np.argmax(above(x) >= 0)), 1)
            lo, hi = x[k - 1], x[k]
        return float(hi)

    def final(self) -> np.ndarray:
        """(3,) state at the end of the run."""
        return self.state(np.array([self.until]))[:, 0]

    # --- settling ------------------------------------------------------------------------------------------------

    def settling(self) -> dict[str, float | None]:
        """Times by "velocity", "flow" and each wall's name; None as in the contract."""
        keys = ["velocity", "flow", *self.gap.names]
        if self.regime == "neither":
            return dict.fromkeys(keys)
        out: dict[str, float | None] = {}
        t = self.samples()
        late = self.samples(1e-6)
        out["velocity"] = self._last_above(late, self._largest_deviation, self.within * self.velocity_size())
        out["flow"] = self._last_above(t, lambda x: np.abs(self.deviation(x)[2]), self.within * self.size(2))
        for end, name in enumerate(self.gap.names):
            size = self.size(end)
            if not np.isfinite(size) or self.gap.free[end]:
                out[name] = None
                continue
            out[name] = self._last_above(t, lambda x, k=end: np.abs(self.deviation(x)[k]), self.within * size)
        return out

    def _largest_deviation(self, t: np.ndarray) -> np.ndarray:
        parts = np.array_split(t, max(len(t) // 3000, 1))
        return np.concatenate([self.profile.largest(self.deviation(x, self.count)[3:]) for x in parts])

    def size(self, channel: int) -> float:
        """What a stress's or the mean's deviation is relative to; infinite: nothing."""
        own = abs(self.settled(np.array([self.until]))[channel, 0])
        unbounded = channel < 2 and self.unbounded(channel)[0] > 0.0
        if self.regime == "periodic":
            if channel < 2 and self._jumps_for_ever(channel):
                return np.inf
            own = self._largest(lambda x: np.abs(self.settled(x)[channel]), self._one_period())
            own = max([own, *self._repeated_limits(channel)])
        if unbounded:
            other = np.abs(self.settled(np.array([self.until]))[:2]).max()
            return own if own > ZERO * other else np.inf
        peak = abs(self.peak(channel)[0])
        return own if own > ZERO * peak else peak

    def _repeated_limits(self, channel: int) -> list[float]:
        """Magnitudes just after each jump that a slipping wall's speed repeats for ever, as in ``_limits``."""
        if channel > 1 or not self.gap.slip[channel]:
            return []
        radius = (self.gap.ri, self.gap.ro)[channel] if self.gap.kind == "rotating" else 1.0
        stiff = self.gap.mu * radius / self.gap.slip[channel]
        out = []
        for atom in self.signals[channel].atoms:
            if atom.every is None:
                continue
            ends = [float(atom.pieces[k].value(np.array(at))) for k, at in ((0, 0.0), (-1, atom.every))]
            inner = [j for j in Signal((atom,)).jumps(atom.every * (1 - 1e-9), atom.before) if j[0] > 0.0]
            for t, jump in [(atom.every, ends[0] - ends[1]), *inner]:
                was = float(self.settled(np.array([t * (1.0 - 1e-15)]))[channel, 0])
                out.append(abs(was - stiff * jump))
        return out

    def velocity_size(self) -> float:
        """What the profile's deviation is relative to."""
        t = self.samples(1e-6)
        times = np.array([self.until]) if self.regime == "constant" else self._one_period()
        own = self._largest(lambda x: self.profile.largest(self.settled(x, self.count)[3:]), times)
        run = self._largest(lambda x: self.profile.largest(self.state(x, self.count)[3:]), t)
        return own if own > ZERO * run else run

    def _jumps_for_ever(self, channel: int) -> bool:
        if self.gap.slip[channel]:
            return False
        loops = [a for a in self.signals[channel].atoms if a.every is not None]
        ends = [(float(a.pieces[0].value(np.array(0.0))), float(a.pieces[-1].value(np.array(a.every)))) for a in loops]
        seam = sum(p for p, _ in ends) - sum(q for _, q in ends)
        inner = [j for a in loops for j in Signal((a,)).jumps(a.every * (1 - 1e-9), a.before) if j[0] > 0.0]
        scale = sum(abs(p) + abs(q) for p, q in ends) + 1e-300
        return bool(inner) or abs(seam) > 1e-10 * scale

    def _one_period(self) -> np.ndarray:
        assert self.period is not None
        loops = Signal(tuple(a for s in self.signals for a in s.atoms if a.every is not None))
        breaks = loops.breaks(self.period) if loops.atoms else np.zeros(1)
        return np.append(self._dense(breaks, self.period, 1e-8), self.period)

    def _largest(self, magnitude: Function, t: np.ndarray) -> float:
        y = magnitude(t)
        best = float(y.max())
        spots = np.flatnonzero((y >= np.append(0, y[:-1])) & (y >= np.append(y[1:], 0)) & (y > 0.9 * best))
        for i in spots[np.argsort(-y[spots])][:5]:
            if len(t) == 1:
                break
            lo, hi = t[max(i - 1, 0)], t[min(i + 1, len(t) - 1)]
            for _ in range(6):
                x = np.linspace(lo, hi, 17)
                v = magnitude(x)
                k = int(v.argmax())
                best = max(best, float(v[k]))
                lo, hi = x[max(k - 1, 0)], x[min(k + 1, 16)]
        return best

    def _last_above(self, t: np.ndarray, magnitude: Function, level: float) -> float | None:
        """Last time at which the deviation exceeds ``level``: 0 if it never does, None if it does at the end."""
        y = magnitude(t)
        if level == 0.0:
            return 0.0
        if y[-1] > level:
            return None
        over = np.flatnonzero(y > level)
        last = int(over[-1]) if len(over) else -1
        rest = np.arange(max(last + 1, 1), len(t) - 1)
        tops = rest[(y[rest] >= y[rest - 1]) & (y[rest] >= y[rest + 1]) & (y[rest] > 0.9 * level)]
        for i in tops[::-1]:
            x = np.linspace(t[i - 1], t[i + 1], 65)
            v = magnitude(x)
            if v.max() > level:
                lo, hi = x[np.flatnonzero(v > level)[-1]], x[min(np.flatnonzero(v > level)[-1] + 1, 64)]
                return self._narrow(magnitude, level, lo, hi)
        if last < 0:
            return 0.0
        return self._narrow(magnitude, level, t[last], t[last + 1])

    @staticmethod
    def _narrow(magnitude: Function, level: float, lo: float, hi: float) -> float:
        for _ in range(9):
            x = np.linspace(lo, hi, 18)
            on = np.flatnonzero(magnitude(x) > level)
            k = min(int(on[-1]) if len(on) else 0, 16)
            lo, hi = x[k], x[k + 1]
        return float(hi)

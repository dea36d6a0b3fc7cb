"""Histories of a march: rows at the times it stepped to, with rates, so that values between rows are known."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property, lru_cache

import numpy as np

from transient.compiled import compiled, part
from transient.result.curve import Curve

STENCIL = 5
FEW = 256  # coordinates at which every profile is looked at
NEIGHBOURS = 6
BULGE = 0.25  # of the least bend x spacing^2 about: so far a largest may rise above the nodes (a parabola: an eighth)
ROOM = 0.25  # of the range of its neighbours: so far a value between nodes may leave that range
# Into which a step is cut in which the place of the largest velocity moves, then the part in which it still does, ...
CORNER_PARTS = (12, 8, 8, 8, 8)
LOOK = np.linspace(0.0, 1.0, 33)  # where between the neighbours of the largest node its polynomial is looked at


@dataclass(frozen=True, eq=False)
class Largest:
    """``curve`` over j instants ``piece``, ``offset`` (j,); ``owner`` (j,) the kept profile at or before each."""

    curve: Curve
    piece: np.ndarray
    offset: np.ndarray
    owner: np.ndarray


@dataclass(frozen=True, eq=False)
class History:
    """n rows in time, two ends (lower/inner first), N nodes.

    A break of the drive after t = 0 is two rows of equal time: the limit from the left (last row of its piece)
    and from the right (first row of the next).  Between neighbouring rows of one piece every quantity is the
    cubic through values and rates.

    ``time`` (n,) s; ``piece`` (n,) number of the smooth piece; ``offset`` (n,) s, the exact time is
    ``starts[piece] + offset``; ``stress``, ``stress_rate`` (n, 2) Pa, Pa/s, traction of the fluid on the wall,
    NaN where infinite; ``speed``, ``acceleration`` (n, 2) m/s or rad/s, and per s; ``mean``, ``mean_rate`` (n,)
    mean velocity m/s, m/s^2; ``gradient``, ``gradient_rate`` (n,) pressure drop per length, Pa/m, and per s (NaN
    where infinite); ``place`` (n, 2) displacement of the walls since t = 0, m or rad (a body's from its own zero).
    ``position`` (N,) m, coordinate r; ``profile_row`` (k,) the rows at which profiles were kept;
    ``profile``, ``profile_rate``, ``travel`` (k, N) velocity w, its rate, and its integral since t = 0
    (in a rotating gap: angular); ``lever`` (N,) what makes velocities in m/s of them where that is not 1.
    """

    time: np.ndarray
    piece: np.ndarray
    offset: np.ndarray
    stress: np.ndarray
    stress_rate: np.ndarray
    speed: np.ndarray
    acceleration: np.ndarray
    mean: np.ndarray
    mean_rate: np.ndarray
    gradient: np.ndarray
    gradient_rate: np.ndarray
    place: np.ndarray
    position: np.ndarray
    profile_row: np.ndarray
    profile: np.ndarray
    profile_rate: np.ndarray
    travel: np.ndarray
    lever: np.ndarray | None = None

    @cached_property
    def step(self) -> np.ndarray:
        """Lengths of the intervals between rows (n-1,) s, exact also long after t = 0; 0 across a break."""
        return np.where(self.piece[1:] == self.piece[:-1], np.diff(self.offset), 0.0)

    @cached_property
    def _curves(self) -> dict[str, Curve]:
        return {}

    def _curve(self, name: str, make: Callable[[], Curve]) -> Curve:
        """A curve made once, with all that it finds out about itself."""
        if name not in self._curves:
            self._curves[name] = make()
        return self._curves[name]

    def stress_curve(self, wall: int) -> Curve:
        """The stress on one wall over time."""
        return self._curve(
            f"stress {wall}",
            lambda: Curve(self.time, self.stress[:, wall], self.stress_rate[:, wall], self.step, self.offset[:-1]),
        )

    def speed_curve(self, wall: int) -> Curve:
        """The speed of one wall over time."""
        return Curve(self.time, self.speed[:, wall], self.acceleration[:, wall], self.step)

    def gradient_curve(self) -> Curve:
        """The pressure drop per length over time."""
        return Curve(self.time, self.gradient, self.gradient_rate, self.step, self.offset[:-1])

    def mean_curve(self) -> Curve:
        """The mean velocity over time."""
        return self._curve("mean", lambda: Curve(self.time, self.mean, self.mean_rate, self.step, self.offset[:-1]))

    def profile_step(self) -> np.ndarray:
        """Lengths of the intervals between kept profiles (k-1,) s."""
        piece, offset = self.piece[self.profile_row], self.offset[self.profile_row]
        plain = np.maximum(np.diff(self.time[self.profile_row]), 0.0)
        return np.where(piece[1:] == piece[:-1], np.diff(offset), plain)

    @cached_property
    def largest(self) -> Largest:
        """The largest speed over the gap, m/s, as a curve over the kept profiles, and over more instants where the
        place of the largest moves from one part of the gap to another: such a curve has a corner there."""
        piece, offset = self.piece[self.profile_row], self.offset[self.profile_row]
        owner = np.arange(len(piece))
        value, rate, at = self._tops(self.profile, self.profile_rate)
        for parts in CORNER_PARTS:
            moves = np.flatnonzero(_moves(at) & (piece[1:] == piece[:-1]) & (np.diff(offset) > 0.0))
            if len(moves) == 0:
                break
            inside = np.repeat(moves, parts - 1)
            share = np.tile(np.arange(1, parts) / parts, len(moves))
            low, high = np.sqrt(offset[inside]), np.sqrt(offset[inside + 1])
            when = (low + share * (high - low)) ** 2
            kept = owner[inside]
            more = self._tops(*self._profile_between(kept, when - self.offset[self.profile_row][kept]))
            order = np.argsort(np.concatenate([np.arange(len(at)), inside + share]), kind="stable")
            owner, piece, offset, value, rate, at = (
                np.concatenate(pair)[order]
                for pair in zip(
                    (owner, piece, offset, value, rate, at), (kept, piece[inside], when, *more), strict=True
                )
            )
        base = self.time[self.profile_row] - self.offset[self.profile_row]
        time = base[owner] + offset
        # where the corner itself lies the curve is a straight line, between rows of its own
        lower = np.flatnonzero(_moves(at) & (piece[1:] == piece[:-1]) & (np.diff(time) > 0.0))
        if len(lower):
            twice = np.sort(np.concatenate([np.arange(len(time)), lower, lower + 1]))
            slope = np.diff(value)[lower] / np.diff(time)[lower]
            first = np.searchsorted(twice, lower, side="right") - 1
            last = np.searchsorted(twice, lower + 1, side="left")
            piece, offset, owner, time, value, rate = (of[twice] for of in (piece, offset, owner, time, value, rate))
            rate[first], rate[last] = slope, slope
        same = piece[1:] == piece[:-1]
        step = np.where(same, np.maximum(np.diff(offset), 0.0), 0.0)  # across a break nothing is known between
        begins = np.where(same, offset[:-1], 0.0)
        return Largest(Curve(time, value, rate, step, begins), piece, offset, owner)

    def _tops(self, profile: np.ndarray, rate: np.ndarray) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
        """Largest speeds (k,) in m/s of profiles (k, N), their rates, and the node of each, -2 - node where the
        velocity there is negative."""
        lever = 1.0 if self.lever is None else self.lever
        profile = profile * lever
        value, change = largest(self.position, profile, rate * lever)
        at = np.abs(profile).argmax(axis=1)
        return value, change, np.where(profile[np.arange(len(at)), at] < 0.0, -2 - at, at)

    @cached_property
    def around_largest(self) -> np.ndarray:
        """Coordinates (m,) that tell the largest speed at all kept instants: nodes and midpoints near where it lies at
        any of them, and enough others that none elsewhere is missed."""
        count = 2 * len(self.position) - 1
        dense = np.interp(np.arange(count) / 2.0, np.arange(len(self.position)), self.position)
        if count <= FEW:
            return dense
        lever = 1.0 if self.lever is None else self.lever
        at = 2 * np.unique(np.abs(self.profile * lever).argmax(axis=1))
        pick = np.zeros(count, bool)
        for beside in range(-STENCIL, STENCIL + 1):
            pick[np.clip(at + beside, 0, count - 1)] = True
        found = np.flatnonzero(pick)
        pick[found] = False
        pick[found[:: len(found) // FEW + 1]] = True  # where it wanders through the whole gap
        pick[:: count // FEW + 1] = True
        pick[-1] = True
        return dense[pick]

    def largest_curve(self) -> Curve:
        """The curve of ``largest``."""
        return self.largest.curve

    def _profile_between(self, interval: np.ndarray, passed: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Profiles (m, N) and their rates ``passed`` s after the kept profiles ``interval`` (m,)."""
        step = self.profile_step()[interval][:, None]
        s = passed[:, None] / step
        v0, v1 = self.profile[interval], self.profile[interval + 1]
        r0, r1 = self.profile_rate[interval] * step, self.profile_rate[interval + 1] * step
        rise = v1 - v0
        bend, twist = 3.0 * rise - 2.0 * r0 - r1, r0 + r1 - 2.0 * rise
        value = v0 + s * (r0 + s * (bend + s * twist))
        rate = (r0 + s * (2.0 * bend + 3.0 * s * twist)) / step
        begins = self._begins(interval)[:, None]
        root = np.sqrt(s)
        with np.errstate(divide="ignore", invalid="ignore"):
            early = rise / (2.0 * np.where(root > 0.0, root, 1.0)) / step
        return np.where(begins, v0 + root * rise, value), np.where(begins, early, rate)

    def _begins(self, interval: np.ndarray) -> np.ndarray:
        """Whether intervals between kept profiles (m,) begin at a break: rates there may be those of a layer without
        thickness, and what follows goes with the root of the time."""
        return self.offset[self.profile_row[interval]] == 0.0

    def profiles_at(self, time: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Velocity and travel (m, N) at absolute times (m,), by cubics between the kept profiles."""
        kept = self.time[self.profile_row]
        interval = np.clip(np.searchsorted(kept, time, side="right") - 1, 0, max(len(kept) - 2, 0))
        step = self.profile_step()[interval][:, None]
        safe = np.where(step > 0, step, 1.0)
        share = np.clip(np.where(step > 0, (time - kept[interval])[:, None] / safe, 1.0), 0.0, 1.0)
        low, high = interval, np.minimum(interval + 1, len(kept) - 1)
        begins = self._begins(low)[:, None]
        piece = self.piece[self.profile_row]
        apart = (piece[low] != piece[high])[:, None]  # profiles kept far apart, with a break between them

        def between(value: np.ndarray, rate: np.ndarray) -> np.ndarray:
            v0, v1, r0, r1 = value[low], value[high], rate[low] * step, rate[high] * step
            rise = v1 - v0
            bend, twist = 3.0 * rise - 2.0 * r0 - r1, r0 + r1 - 2.0 * rise
            value = v0 + share * (r0 + share * (bend + share * twist))
            value = np.where(begins, v0 + np.sqrt(share) * rise, value)
            return np.where(apart, v0 + share * rise, value)

        return between(self.profile, self.profile_rate), between(self.travel, self.profile)


def _moves(at: np.ndarray) -> np.ndarray:
    """Between which instants (k-1,) the place of the largest leaves its neighbourhood; ``at`` as of ``_tops``."""
    return np.abs(np.diff(at)) > 1


def largest(position: np.ndarray, profile: np.ndarray, rate: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Largest magnitude over the gap of each profile (k,), between nodes too, and how it changes (k,).

    Around the largest node the profile is the polynomial through it and its four neighbours.
    """
    value, change = np.empty(len(profile)), np.empty(len(profile))
    _fill_largest(np.ascontiguousarray(position), np.ascontiguousarray(profile), np.ascontiguousarray(rate), LOOK,
                  value, change)  # fmt: skip
    return value, change


@part
def _bend(position, profile, i):  # type: ignore[no-untyped-def]
    """Magnitude of the second derivative around a node, or the nearest that has two neighbours."""
    i = min(max(i, 1), len(profile) - 2)
    before, after = position[i] - position[i - 1], position[i + 1] - position[i]
    rise = (profile[i + 1] - profile[i]) / after - (profile[i] - profile[i - 1]) / before
    return 2.0 * abs(rise) / (before + after)


@compiled
def _fill_largest(position, profile, rate, look, value, change):  # type: ignore[no-untyped-def]
    nodes, points = len(position), min(STENCIL, len(position))
    basis, height = np.empty(points), np.empty(len(look))
    for k in range(len(profile)):
        at = 0
        for i in range(nodes):
            if abs(profile[k, i]) > abs(profile[k, at]):
                at = i
        sign = -1.0 if profile[k, at] < 0.0 else 1.0
        value[k], change[k] = abs(profile[k, at]), sign * rate[k, at]
        if nodes < STENCIL:
            continue
        start = min(max(at - STENCIL // 2, 0), nodes - STENCIL)
        low, high = position[max(at - 1, 0)] - position[at], position[min(at + 1, nodes - 1)] - position[at]
        # Newton's form through the nodes around the largest
        for i in range(points):
            basis[i] = sign * profile[k, start + i]
        for order in range(1, points):
            for i in range(points - 1, order - 1, -1):
                basis[i] = (basis[i] - basis[i - 1]) / (position[start + i] - position[start + i - order])
        best = 0
        for g in range(len(look)):
            x = low + (high - low) * look[g]
            height[g] = basis[points - 1]
            for i in range(points - 2, -1, -1):
                height[g] = basis[i] + (x - (position[start + i] - position[at])) * height[g]
            if height[g] > height[best]:
                best = g
        x = low + (high - low) * look[best]
        change[k] = 0.0
        for i in range(points):
            share = 1.0
            for j in range(points):
                if i != j:
                    share *= (x - (position[start + j] - position[at])) / (position[start + i] - position[start + j])
            change[k] += sign * share * rate[k, start + i]
        top = height[best]
        if 0 < best < len(look) - 1:
            bend = height[best - 1] - 2.0 * height[best] + height[best + 1]
            if bend < 0.0:
                top -= (height[best + 1] - height[best - 1]) ** 2 / (8.0 * bend)
        # a wall that has just jumped is no smooth neighbour: so high only as the nodes beside it allow as well
        bend = min(
            _bend(position, profile[k], at - 1), _bend(position, profile[k], at), _bend(position, profile[k], at + 1)
        )
        room = BULGE * bend * max(high, -low) ** 2
        if top > value[k] + room:
            top, change[k] = value[k] + room, sign * rate[k, at]
        value[k] = max(top, value[k])


def between(profile: np.ndarray, parts: int, straight: np.ndarray) -> np.ndarray:
    """Profiles (k, N) with ``parts`` - 1 values added in each interval, (k, (N-1) x parts + 1).

    The grid is smooth in the node's number, so a polynomial in that number through ``NEIGHBOURS`` serves; it is kept
    near the range of the four nearest.  Rows marked ``straight`` (k,) have a layer without thickness at a wall and
    are joined linearly.
    """
    if parts == 1:
        return profile
    out = np.empty((len(profile), (profile.shape[1] - 1) * parts + 1))
    _fill_between(np.ascontiguousarray(profile), parts, straight, _weights(profile.shape[1], parts), out)
    return out


@lru_cache(maxsize=8)
def _weights(nodes: int, parts: int) -> np.ndarray:
    """(points, q) weights of the q nearest of ``nodes`` at every ``parts``-th of the intervals between them."""
    at = np.arange((nodes - 1) * parts + 1) / parts
    points = min(NEIGHBOURS, nodes)
    start = np.clip(np.minimum(at.astype(int), nodes - 2) - points // 2 + 1, 0, nodes - points)
    weight = np.ones((len(at), points))
    for i in range(points):
        for j in range(points):
            if i != j:
                weight[:, i] *= (at - start - j) / (i - j)
    return weight


@compiled
def _fill_between(profile, parts, straight, weight, out):  # type: ignore[no-untyped-def]
    nodes, points = profile.shape[1], weight.shape[1]
    for k in range(len(profile)):
        for low in range(nodes - 1):
            start = min(max(low - points // 2 + 1, 0), nodes - points)
            least = most = profile[k, low]
            for i in range(max(low - 1, 0), min(low + 2, nodes - 1) + 1):
                least, most = min(least, profile[k, i]), max(most, profile[k, i])
            room = ROOM * (most - least)
            for step in range(parts + 1 if low == nodes - 2 else parts):
                g = low * parts + step
                value = 0.0
                if straight[k]:
                    value = profile[k, low] + (profile[k, low + 1] - profile[k, low]) * step / parts
                else:
                    for i in range(points):
                        value += weight[g, i] * profile[k, start + i]
                    value = min(max(value, least - room), most + room)
                out[k, g] = value

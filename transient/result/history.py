"""Histories of a march: rows at the times it stepped to, with rates, so that values between rows are known."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.result.curve import Curve

STENCIL = 5
LOOK = np.linspace(0.0, 1.0, 33)  # where between the neighbours of the largest node its polynomial is looked at


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
    (in a rotating gap: angular).
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

    @property
    def step(self) -> np.ndarray:
        """Lengths of the intervals between rows (n-1,) s, exact also long after t = 0; 0 across a break."""
        return np.where(self.piece[1:] == self.piece[:-1], np.diff(self.offset), 0.0)

    def stress_curve(self, wall: int) -> Curve:
        """The stress on one wall over time."""
        return Curve(self.time, self.stress[:, wall], self.stress_rate[:, wall], self.step, self.offset[:-1])

    def speed_curve(self, wall: int) -> Curve:
        """The speed of one wall over time."""
        return Curve(self.time, self.speed[:, wall], self.acceleration[:, wall], self.step)

    def gradient_curve(self) -> Curve:
        """The pressure drop per length over time."""
        return Curve(self.time, self.gradient, self.gradient_rate, self.step, self.offset[:-1])

    def mean_curve(self) -> Curve:
        """The mean velocity over time."""
        return Curve(self.time, self.mean, self.mean_rate, self.step, self.offset[:-1])

    def profile_step(self) -> np.ndarray:
        """Lengths of the intervals between kept profiles (k-1,) s."""
        piece, offset = self.piece[self.profile_row], self.offset[self.profile_row]
        plain = np.diff(self.time[self.profile_row])
        return np.where(piece[1:] == piece[:-1], np.diff(offset), plain)

    def largest_curve(self) -> Curve:
        """The largest |profile| over the gap as a curve over the kept profiles."""
        value, rate = largest(self.position, self.profile, self.profile_rate)
        piece, offset = self.piece[self.profile_row], self.offset[self.profile_row]
        begins = np.where(piece[1:] == piece[:-1], offset[:-1], 0.0)
        return Curve(self.time[self.profile_row], value, rate, self.profile_step(), begins)

    def profiles_at(self, time: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        """Velocity and travel (m, N) at absolute times (m,), by cubics between the kept profiles."""
        kept = self.time[self.profile_row]
        interval = np.clip(np.searchsorted(kept, time, side="right") - 1, 0, max(len(kept) - 2, 0))
        step = self.profile_step()[interval][:, None]
        safe = np.where(step > 0, step, 1.0)
        share = np.clip(np.where(step > 0, (time - kept[interval])[:, None] / safe, 1.0), 0.0, 1.0)
        low, high = interval, np.minimum(interval + 1, len(kept) - 1)

        def between(value: np.ndarray, rate: np.ndarray) -> np.ndarray:
            v0, v1, r0, r1 = value[low], value[high], rate[low] * step, rate[high] * step
            rise = v1 - v0
            bend, twist = 3.0 * rise - 2.0 * r0 - r1, r0 + r1 - 2.0 * rise
            return v0 + share * (r0 + share * (bend + share * twist))

        return between(self.profile, self.profile_rate), between(self.travel, self.profile)


def largest(position: np.ndarray, profile: np.ndarray, rate: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Largest magnitude over the gap of each profile (k,), between nodes too, and how it changes (k,).

    Around the largest node the profile is the polynomial through it and its four neighbours.
    """
    rows = np.arange(len(profile))
    at = np.abs(profile).argmax(axis=1)
    sign = np.where(profile[rows, at] < 0.0, -1.0, 1.0)
    nodes = len(position)
    if nodes < STENCIL:
        return np.abs(profile[rows, at]), sign * rate[rows, at]
    window = np.clip(at - STENCIL // 2, 0, nodes - STENCIL)[:, None] + np.arange(STENCIL)
    x = position[window] - position[at][:, None]
    low, high = position[np.maximum(at - 1, 0)] - position[at], position[np.minimum(at + 1, nodes - 1)] - position[at]
    where = low[:, None] + (high - low)[:, None] * LOOK
    basis = _lagrange(x, where)
    height = sign[:, None] * np.einsum("kgq,kq->kg", basis, profile[rows[:, None], window])
    best = height.argmax(axis=1)
    inner = np.clip(best, 1, len(LOOK) - 2)
    before, middle, after = (height[rows, inner + k] for k in (-1, 0, 1))
    bend = before - 2.0 * middle + after
    with np.errstate(all="ignore"):
        top = np.where((best == inner) & (bend < 0), middle - (after - before) ** 2 / (8.0 * bend), height[rows, best])
    change = sign * np.einsum("kq,kq->k", basis[rows, best], rate[rows[:, None], window])
    return np.maximum(top, np.abs(profile[rows, at])), change


def _lagrange(nodes: np.ndarray, x: np.ndarray) -> np.ndarray:
    """Values (k, g, q) at ``x`` (k, g) of the Lagrange polynomials on ``nodes`` (k, q)."""
    out = np.ones((*x.shape, nodes.shape[1]))
    for i in range(nodes.shape[1]):
        for j in range(nodes.shape[1]):
            if i != j:
                out[..., i] *= (x - nodes[:, j, None]) / (nodes[:, i] - nodes[:, j])[:, None]
    return out

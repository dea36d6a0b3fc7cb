"""Texts set beside the curves that they name, clear of each other and of other curves."""

from __future__ import annotations

from dataclasses import dataclass, field
from itertools import pairwise
from typing import TYPE_CHECKING, Any

import numpy as np

if TYPE_CHECKING:
    from matplotlib.axes import Axes

# Mean width of a character and height of a line, in units of the font size.
_WIDE, _TALL = 0.64, 1.25
# More points than these are no finer in print.
MOST_POINTS, MOST_SAMPLES = 4000, 20_000
# Costs of covering, in the order in which they are to be avoided.
_TEXT, _OUTSIDE, _CURVE, _AWAY = 1000.0, 400.0, 6.0, 0.4


@dataclass
class Board:
    """One axes while its texts are placed; limits must be final.  All boxes and curves are in pixels.

    ``factor`` is what turns SI into the values of the axis.
    """

    axes: Axes
    factor: float = 1.0
    size: float = 8.0
    curves: list[np.ndarray] = field(default_factory=list)
    taken: list[tuple[float, float, float, float]] = field(default_factory=list)

    def curve(self, x: np.ndarray, y: np.ndarray, **style: Any) -> None:
        """Draws a curve through points (n,), of very many only those that show, and makes it known."""
        x, y = thinned(x, y)
        self.axes.plot(x, y, **style)
        self.add_curve(x, y)

    def add_curve(self, x: np.ndarray, y: np.ndarray) -> None:
        """Makes a drawn curve known, densely enough that no text slips between its points."""
        points = self.axes.transData.transform(np.column_stack([x, y]))
        points = points[np.isfinite(points).all(axis=1)]
        if len(points) < 2:
            self.curves.append(points)
            return
        along = np.concatenate([[0.0], np.cumsum(np.hypot(*np.diff(points, axis=0).T))])
        step = max(2.0, along[-1] / MOST_SAMPLES)
        even = np.arange(0.0, along[-1] + step, step)
        self.curves.append(np.column_stack([np.interp(even, along, points[:, i]) for i in range(2)]))

    def on_curve(self, index: int, text: str, **style: Any) -> None:
        """Sets ``text`` into the curve number ``index``, interrupting it where it is clear of the others."""
        points = self._inside(self.curves[index])
        if len(points) == 0:
            return
        others = [curve for i, curve in enumerate(self.curves) if i != index]
        tries = points[np.linspace(0.06, 0.94, 45).dot(len(points) - 1).astype(int)]
        middle = np.abs(np.linspace(-1, 1, len(tries)))
        costs = [self._cost(self._box(text, at), others) + 0.5 * far for at, far in zip(tries, middle, strict=True)]
        at = tries[int(np.argmin(costs))]
        self.taken.append(self._box(text, at))
        self._text(at, text, bbox={"fc": "white", "ec": "none", "pad": 0.8}, **style)

    def mark(self, x: float, y: float) -> np.ndarray:
        """Keeps the place of a mark at a point (data coordinates) free; the point in pixels (2,)."""
        point = self.axes.transData.transform((x, y))
        half = 0.5 * self._pixels()
        self.taken.append((point[0] - half, point[1] - half, point[0] + half, point[1] + half))
        return point

    def beside(self, x: float, y: float, text: str, **style: Any) -> None:
        """Sets ``text`` near the mark at a point (data coordinates), wherever around it there is most room."""
        point = self.mark(x, y)
        wide, tall = self._extent(text)
        best, cost = point, np.inf
        for far in (0.5, 1.1, 2.0, 3.2):
            for angle in np.arange(0, 2 * np.pi, np.pi / 8):
                way = np.array([np.cos(angle), np.sin(angle)])
                at = point + way * (far * self._pixels() + np.array([wide, tall]) / 2 * np.abs(way) ** 0.5)
                price = self._cost(self._box(text, at), self.curves) + _AWAY * far
                if price < cost:
                    best, cost = at, price
        self.taken.append(self._box(text, best))
        self._text(best, text, bbox={"fc": "white", "ec": "none", "pad": 0.5, "alpha": 0.8}, **style)

    def at_ends(self, ends: list[tuple[float, str, dict[str, Any]]]) -> None:
        """Names beside the right edge at heights y (data), spread so that none overlaps."""
        if not ends:
            return
        box = self.axes.bbox
        edge = self.axes.get_xlim()[1]
        wanted = np.array([self.axes.transData.transform((edge, y))[1] for y, *_ in ends])
        places = spread(np.clip(wanted, box.y0, box.y1), self._pixels() * _TALL, box.y0, box.y1)
        for (_, text, style), place in zip(ends, places, strict=True):
            share = (place - box.y0) / box.height
            self.axes.text(
                1.02, share, text, transform=self.axes.transAxes, ha="left", va="center", size=self.size, **style
            )

    def _pixels(self) -> float:
        return self.size * self.axes.figure.dpi / 72

    def _extent(self, text: str) -> tuple[float, float]:
        lines = text.split("\n")
        return max(map(len, lines)) * _WIDE * self._pixels(), len(lines) * _TALL * self._pixels()

    def _box(self, text: str, at: np.ndarray) -> tuple[float, float, float, float]:
        wide, tall = self._extent(text)
        return at[0] - wide / 2, at[1] - tall / 2, at[0] + wide / 2, at[1] + tall / 2

    def _inside(self, points: np.ndarray) -> np.ndarray:
        box = self.axes.bbox
        keep = (points >= [box.x0, box.y0]).all(axis=1) & (points <= [box.x1, box.y1]).all(axis=1)
        return points[keep]

    def _cost(self, box: tuple[float, float, float, float], curves: list[np.ndarray]) -> float:
        x0, y0, x1, y1 = box
        edge = self.axes.bbox
        cost = _OUTSIDE * (x0 < edge.x0 or x1 > edge.x1 or y0 < edge.y0 or y1 > edge.y1)
        for a0, b0, a1, b1 in self.taken:
            cost += _TEXT * (x0 < a1 and a0 < x1 and y0 < b1 and b0 < y1)
        for curve in curves:
            if len(curve):
                inside = (curve >= [x0 - 2, y0 - 1]).all(axis=1) & (curve <= [x1 + 2, y1 + 1]).all(axis=1)
                cost += _CURVE * min(int(inside.sum()), 40) / 4
        return cost

    def _text(self, at: np.ndarray, text: str, **style: Any) -> None:
        x, y = self.axes.transAxes.inverted().transform(at)
        self.axes.text(
            x, y, text, transform=self.axes.transAxes, ha="center", va="center", size=self.size, zorder=6, **style
        )


def thinned(x: np.ndarray, y: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Points (m,) of a curve that look like all of its points (n,): of each group of neighbours the first, the last,
    the lowest and the highest, and whatever is not finite.  Few points are all kept."""
    if len(x) <= MOST_POINTS:
        return x, y
    edges = np.linspace(0, len(x), MOST_POINTS // 4 + 1).astype(int)
    keep = [edges[:-1], edges[1:] - 1, np.flatnonzero(~np.isfinite(y))]
    for lowest in (True, False):
        values = np.where(np.isfinite(y), y if lowest else -y, np.inf)
        keep.append(np.array([a + int(np.argmin(values[a:b])) for a, b in pairwise(edges)]))
    rows = np.unique(np.concatenate(keep))
    return x[rows], y[rows]


def spread(wanted: np.ndarray, least: float, low: float, high: float) -> np.ndarray:
    """Places near ``wanted`` (n,), in the same order, at least ``least`` apart and inside [low, high] if that fits."""
    order = np.argsort(wanted, kind="stable")
    places = wanted[order].astype(float)
    for _ in range(200):
        gaps = np.diff(places)
        tight = np.flatnonzero(gaps < least - 1e-9)
        if len(tight) == 0:
            break
        for i in tight:
            short = (least - (places[i + 1] - places[i])) / 2
            if short > 0:
                places[i] -= short
                places[i + 1] += short
        places += max(low - places[0], 0.0) - max(places[-1] - high, 0.0)
    out = np.empty_like(places)
    out[order] = places
    return out

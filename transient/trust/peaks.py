"""How far a march's peaks are from the exact ones: the series is searched wherever the march comes near its peak."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

from transient.result.curve import Curve
from transient.result.history import History
from transient.series.solution import Solution

# Narrowings of the interval around a peak at which the exact curve is looked at, each by ``FINER``; its error is then
# FINER^-2n of the curve's sagitta over one step.
NARROWINGS = 4
FINER = 5.0
AROUND = np.linspace(-1.0, 1.0, 11)
PEAK_MARGIN = 1.02  # for what is compared point by point
SAME = 1e-12  # of a peak: closer values are the same but for round-off
CLOSE = 65  # places around the largest speed
MOST_PLACES = 400  # a periodic peak comes back: the highest of its copies will do


@dataclass(frozen=True, eq=False)
class _Search:
    """One quantity's places at which the exact peak may lie: ``column`` of the series' outputs, ``value`` the march's
    peak; (piece, offset, half width) (m,) of the places."""

    column: int
    value: float
    piece: np.ndarray
    offset: np.ndarray
    half: np.ndarray


def peak_errors(curves: Sequence[Curve], history: History, exact: Solution, rows: np.ndarray) -> np.ndarray:
    """(c,) |largest of the march - largest of the series| of ``curves``: the stresses on both walls, the mean velocity.

    ``rows`` (n, c): their errors at the history's rows.
    """
    out = np.array([float(np.max(own, initial=0.0)) for own in rows.T])
    places = _Rows(history.time, history.piece, history.offset, history.step)
    found = [_search(curve, places, column, rows[:, column]) for column, curve in enumerate(curves)]
    searches = [search for search in found if search is not None]
    if not searches:
        return out
    for search, off in zip(searches, _narrowed(searches, places, exact.stress_and_mean), strict=True):
        # the rows beside the peak know as much
        top = int(np.nanargmax(np.abs(curves[search.column].value)))
        beside = float(rows[max(top - 1, 0) : top + 2, search.column].max())
        out[search.column] = max(PEAK_MARGIN * off, beside)
    return out


def speed_error(history: History, exact: Solution, rows: np.ndarray) -> float:
    """|largest speed over gap and time of the march - that of the series|, m/s; ``rows`` (j,) the errors of
    ``history.largest`` at its instants."""
    told = history.largest
    places = _Rows(told.curve.time, told.piece, told.offset, told.curve.step)
    search = _search(told.curve, places, 0, rows)
    if search is None:
        return float(np.max(rows, initial=0.0))
    # closely where the march has it, since between places nothing is looked at
    top = told.owner[int(np.nanargmax(told.curve.value))]
    own = 1.0 if history.lever is None else history.lever
    at = int(np.abs(history.profile[top] * own).argmax())
    low, high = history.position[max(at - 1, 0)], history.position[min(at + 1, len(history.position) - 1)]
    dense = np.union1d(history.around_largest, np.linspace(low, high, CLOSE))
    lever = 1.0 if history.lever is None else dense

    def look(piece: np.ndarray, offset: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
        field, bound = exact.velocity(piece, offset, dense)
        # at the places themselves: what a polynomial makes of a wall that has just jumped is none of the exact answer
        return np.abs(field * lever).max(axis=1)[:, None], bound[:, None]

    return PEAK_MARGIN * _narrowed([search], places, look)[0]


@dataclass(frozen=True, eq=False)
class _Rows:
    """Instants (n,) in time, as (piece, offset), and the steps (n-1,) between them, 0 across a break."""

    time: np.ndarray
    piece: np.ndarray
    offset: np.ndarray
    step: np.ndarray


def _search(curve: Curve, history: _Rows, column: int, rows: np.ndarray) -> _Search | None:
    value, _ = curve.magnitude()
    if not np.isfinite(value) or value == 0.0:
        return None
    time, tops, interval = curve.turning
    height = np.abs(curve.value)
    near = abs(value) - 3.0 * float(np.max(rows[np.isfinite(height)], initial=0.0))
    return _Search(column, value, *_places(history, time, tops, interval, height, min(near, 0.999 * abs(value))))


def _narrowed(
    searches: list[_Search], history: _Rows, look: Callable[[np.ndarray, np.ndarray], tuple[np.ndarray, np.ndarray]]
) -> list[float]:
    """How far off each peak is, the series' bound and what the last narrowing still added (which stands for what the
    next ones would) included."""
    owner = np.repeat(np.arange(len(searches)), [len(search.piece) for search in searches])
    column = np.array([search.column for search in searches])[owner]
    sign = np.sign([search.value for search in searches])[owner]
    piece, offset, half = (
        np.concatenate([getattr(search, name) for search in searches]) for name in ("piece", "offset", "half")
    )
    best = np.full(len(searches), -np.inf)
    reached, bound_there = best, np.zeros(len(searches))
    for _ in range(NARROWINGS):
        first = np.flatnonzero(np.append(True, np.diff(owner) > 0))
        rows = np.arange(len(piece))
        at = np.clip(offset[:, None] + half[:, None] * AROUND, 0.0, _lengths(history, piece)[:, None])
        found, bound = look(np.repeat(piece, len(AROUND)), at.ravel())
        found = found.reshape(*at.shape, -1)[rows, :, column]
        found = np.where(np.isfinite(found), sign[:, None] * found, -np.inf)
        top = found.argmax(axis=1)
        reached = best
        winner = np.maximum.reduceat(found[rows, top], first)
        sure = np.maximum.reduceat(bound.reshape(*at.shape, -1)[rows, top, column], first)
        bound_there = np.where(winner >= best, sure, bound_there)
        best = np.maximum(winner, best)
        # between the places looked at a curve rises by less than it falls to the lower of the neighbours
        beside = np.minimum(found[rows, np.maximum(top - 1, 0)], found[rows, np.minimum(top + 1, len(AROUND) - 1)])
        rise = np.where(np.isfinite(beside), found[rows, top] - beside, np.inf)
        keep = found[rows, top] + rise >= best[owner] - SAME * np.abs(best[owner])
        owner, column, sign, piece = (of[keep] for of in (owner, column, sign, piece))
        offset, half = at[rows, top][keep], half[keep] / FINER
    value = np.abs([search.value for search in searches])
    return list(np.abs(value - best) + bound_there + np.maximum(best - reached, 0.0))


def _places(
    history: _Rows, time: np.ndarray, tops: np.ndarray, interval: np.ndarray, height: np.ndarray, near: float
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """(piece, offset, half width) of the instants around which the peak may lie: extremes inside steps, and rows."""
    step = np.append(history.step, 0.0)
    wide = np.maximum(step, np.append(0.0, history.step))
    inner = np.abs(tops) >= near
    with np.errstate(invalid="ignore"):
        # of the rows, those that are not below a neighbour
        known = np.where(np.isfinite(height), height, -np.inf)
        outer = (height >= near) & (height >= np.append(-np.inf, known[:-1]))
        outer &= height >= np.append(known[1:], -np.inf)
    if not outer.any() and not inner.any():
        outer = height >= np.nanmax(height)
    row = np.flatnonzero(outer)
    inside = interval[inner]
    piece = np.concatenate([history.piece[row], history.piece[inside]])
    offset = np.concatenate([history.offset[row], history.offset[inside] + (time[inner] - history.time[inside])])
    half = np.concatenate([wide[row], step[inside]])
    if len(piece) > MOST_PLACES:
        score = np.concatenate([height[row], np.abs(tops[inner])])
        best = np.argsort(-score, kind="stable")[:MOST_PLACES]
        piece, offset, half = piece[best], offset[best], half[best]
    return piece, offset, half


def _lengths(history: _Rows, piece: np.ndarray) -> np.ndarray:
    """Length (m,) of the given pieces: the offset of their last rows."""
    last = np.flatnonzero(np.append(history.piece[1:] != history.piece[:-1], True))
    return history.offset[last][piece - history.piece[0]]

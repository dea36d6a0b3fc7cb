"""Stored rows and headline numbers of a march beside the exact flow of the textbooks."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from scipy.optimize import brentq, minimize_scalar

from transient.gap.problem import Problem
from transient.result.local import local_size
from transient.trust.verification.motion import Motion
from transient.trust.verification.solved import Marched
from transient.trust.verification.textbook import Textbook
from transient.trust.verification.unit_jump import WALLS

PLACES = 16  # velocities compared across the gap
DIGITS = 2e-8  # of the largest magnitude: what the textbook sums themselves are good to
NOTHING = 1e-9  # of the largest stress: no stress at all, as on a shear-free wall
SLOW_MODES, DENSE = 24, 801  # for settling profiles, long after the last change
BRACKET = 0.2  # around a settling time in which the exact one is looked for


@dataclass(frozen=True)
class Found:
    """``stored``: worst difference of stress, mean velocity and profiles as a share of the largest magnitude (after
    an infinite stress of the local one); ``stated``: worst ratio of a difference to the error stated for it."""

    stored: float
    stated: float


def histories(marched: Marched, motions: dict[int, Motion], series: str = "") -> Found:
    """Stored rows of a run against the textbook; all walls, the mean velocity and the kept profiles."""
    history = marched.history
    nodes = np.unique(np.linspace(0, len(history.position) - 1, PLACES).round().astype(int))
    book = Textbook(marched.problem, motions, history.position[nodes], series=series)
    known = book.known(history.time) & ~_young(marched, book)
    exact = book.at(history.time)
    stored, stated = [], []
    errors = marched.run.errors
    columns = [(history.stress[:, end], errors.stress[:, end], exact[:, end]) for end in (0, 1)]
    columns.append((history.mean, errors.mean, exact[:, 2]))
    largest = max(float(np.abs(column[known & np.isfinite(column)]).max()) for column, _, _ in columns[:2])
    for number, (value, error, true) in enumerate(columns):
        use = known & np.isfinite(value)
        scale = _scale(value, true, use)
        if number < 2 and scale.max() < NOTHING * largest:
            stored.append(float(np.abs(value[use]).max(initial=0.0)) / largest)
            continue
        off = np.abs(value - true)[use]
        stored.append(float((off / scale).max()))
        stated.append(float((off / (error[use] + DIGITS * np.abs(true[use]).max())).max()))
    stored.append(_profiles(marched, nodes, known, exact[:, WALLS:]))
    return Found(max(stored), max(stated))


def _young(marched: Marched, book: Textbook) -> np.ndarray:
    wait = max(start.wait for start, _ in book.parts)
    offset = marched.history.offset
    return (offset > 0.0) & (offset < wait)


def _scale(value: np.ndarray, true: np.ndarray, use: np.ndarray) -> np.ndarray:
    """What errors of the used rows are relative to."""
    if np.isnan(value).any():
        return local_size(np.where(np.isnan(value), np.nan, true))[use]
    return np.full(int(use.sum()), np.abs(true[use]).max())


def _profiles(marched: Marched, nodes: np.ndarray, known: np.ndarray, exact: np.ndarray) -> float:
    """Worst velocity inside the pieces (at a break the wall's own value is that of the other side)."""
    history = marched.history
    inside = known[history.profile_row] & (history.offset[history.profile_row] > 0.0)
    velocity = history.profile[inside][:, nodes]
    true = exact[history.profile_row[inside]]
    return float(np.abs(velocity - true).max() / np.abs(true).max())


def headline_numbers(marched: Marched, motions: dict[int, Motion], series: str = "") -> Found:
    """Peak, final stress and settling times of a start-up that ends steady, against the textbook.

    ``stored`` is relative to each number (a final stress to at least 1 % of the peak).
    """
    problem, parts = marched.problem, marched.parts
    book = Textbook(problem, motions, np.array([problem.outer]), series=series)
    checked: list[tuple[float, float, float]] = []  # (difference, size, stated error)
    for fact in marched.run.walls:
        if not fact.shear_free:
            checked += _wall(marched, book, parts["walls"][fact.name], fact.end)
    checked += _settling(marched, motions, series)
    stored = max(off / size for off, size, _ in checked)
    return Found(stored, max(off / (stated + DIGITS * size) for off, size, stated in checked))


def _wall(marched: Marched, book: Textbook, said: dict, end: int) -> list[tuple[float, float, float]]:
    last = np.array([marched.history.time[-1]])
    final = float(book.at(last)[0, end])
    out = []
    peak = abs(final)
    if not said["unbounded"]:
        peak = _peak(marched, book, end)
        out.append((abs(abs(said["peak_stress"]) - peak), peak, said["peak_stress_error"]))
        # the time of a flat peak is loose, the stress at that time is not
        there = abs(float(book.at(np.array([said["peak_time"]]))[0, end]))
        out.append((abs(peak - there), peak, said["peak_stress_error"] + np.nanmax(marched.run.errors.stress[:, end])))
    size = max(abs(final), 0.01 * peak, NOTHING * _shear(marched))
    out.append((abs(said["final_stress"] - final), size, said["final_stress_error"]))
    return out


def _shear(marched: Marched) -> float:
    return float(np.nanmax(np.abs(marched.history.stress)))


def _peak(marched: Marched, book: Textbook, end: int) -> float:
    """Largest |stress| of the exact flow, looked for around the highest of many instants."""
    rows = np.unique(marched.history.time)
    times = np.sort(np.concatenate([rows, 0.5 * (rows[1:] + rows[:-1])]))
    height = np.where(book.known(times), np.abs(book.at(times)[:, end]), 0.0)
    best = int(height.argmax())
    low, high = times[max(best - 1, 0)], times[min(best + 1, len(times) - 1)]
    found = minimize_scalar(
        lambda t: -abs(float(book.at(np.array([t]))[0, end])), bounds=(low, high), method="bounded",
        options={"xatol": 1e-9 * (high - low)},
    )  # fmt: skip
    return max(float(height[best]), -float(found.fun))


def _settling(marched: Marched, motions: dict[int, Motion], series: str) -> list[tuple[float, float, float]]:
    """(difference, time, stated error) of every settling time that the summary gives."""
    problem, said = marched.problem, marched.parts["settling"]
    inner, outer = problem.inner, problem.outer
    place = np.linspace(inner, outer, DENSE)
    book = Textbook(problem, motions, place, SLOW_MODES, series)
    steady = book.steady(np.inf)
    # the profile that settles is that of the tangential speed
    weight = np.concatenate([np.ones(WALLS), place if problem.rotating else np.ones(DENSE)])
    quantities = {"velocity": (slice(WALLS, None), said["velocity"], said["errors"]["velocity"])}
    quantities["flow"] = (slice(2, 3), said["flow"], said["errors"]["flow"])
    for fact in marched.run.walls:
        name = fact.name
        quantities[name] = (slice(fact.end, fact.end + 1), said["stress"][name], said["errors"]["stress"][name])
    out = []
    for pick, time, error in quantities.values():
        away = _away(book, steady, weight, pick)
        band = problem.settle_within * _largest((weight * steady)[pick])
        if time and band > NOTHING * _shear(marched):
            true = _crossing(away, band, time)
            out.append((abs(time - true), time, error))
    return out


def _away(book: Textbook, steady: np.ndarray, weight: np.ndarray, pick: slice) -> Callable[[float], float]:
    """Largest distance of the picked outputs from their steady values at a time."""
    return lambda t: _largest((weight * (book.at(np.array([t]))[0] - steady))[pick])


def _largest(values: np.ndarray) -> float:
    """Largest magnitude of values at even places, between places by the parabola through the top three."""
    height = np.abs(values)
    at = int(height.argmax())
    if not 0 < at < len(height) - 1:
        return float(height[at])
    before, top, after = height[at - 1 : at + 2]
    bend = before - 2.0 * top + after
    return float(top - (after - before) ** 2 / (8.0 * bend)) if bend < 0.0 else float(top)


def _crossing(away: Callable[[float], float], band: float, near: float) -> float:
    """The time at which the band is entered; infinitely far off where that is not near ``near``."""
    low, high = (1.0 - BRACKET) * near, (1.0 + BRACKET) * near
    if not away(low) > band > away(high):
        return np.inf
    return float(brentq(lambda t: away(t) - band, low, high, xtol=1e-12 * near))


def general_series(marched: Marched) -> float:
    """Worst stated error of stress (walls that are never infinite) and mean velocity as a share of the largest."""
    run = marched.run
    worst = [float(run.errors.mean.max() / np.abs(run.history.mean).max())]
    for fact in run.walls:
        stress = run.history.stress[:, fact.end]
        if not np.isnan(stress).any() and not fact.shear_free:
            worst.append(float(run.errors.stress[:, fact.end].max() / np.abs(stress).max()))
    return max(worst)


def series_itself(problem: Problem, motions: dict[int, Motion], until: float, series: str = "") -> float:
    """The product's general series against the textbook: stress, mean velocity and profiles at even instants."""
    from transient.series.solution import solve

    y = np.linspace(problem.inner, problem.outer, 9)
    book = Textbook(problem, motions, y, series=series)
    t = until * (np.arange(60) + 0.37) / 60
    t = t[book.known(t)]
    exact = solve(problem, until)
    where = exact.locate(t)
    general = np.column_stack([exact.stress_and_mean(*where)[0], exact.velocity(*where, y)[0]])
    off = np.abs(general - book.at(t))
    size = np.abs(general).max(axis=0)
    groups = (slice(0, 2), slice(2, 3), slice(WALLS, None))
    return max(float(off[:, g].max() / size[g].max()) for g in groups)

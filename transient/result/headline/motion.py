"""How deep the walls' influence has reached into the gap, and when the two wall layers meet."""

from __future__ import annotations

from typing import Any
from weakref import WeakKeyDictionary

import numpy as np

from transient.result.history import between
from transient.result.run import Run

FELT = 0.01  # a layer ends where the change falls to this share of the largest change so far ("1 % depth")
DENSER = 8  # parts into which an interval between nodes is cut to find the edge of a layer
UNTOUCHED = 0.02  # the layers have met when no more than this share of the gap is left between them


def motion(run: Run) -> dict[str, Any]:
    """``layers_meet`` s (None if they do not in the run) and the deepest reach of each wall's layer, m."""
    depth = reach(run)
    gap = run.history.position[-1] - run.history.position[0]
    left = 1.0 - depth.sum(axis=1) / gap
    time = run.history.time[run.history.profile_row]
    met = np.flatnonzero(left <= UNTOUCHED)
    meet = None
    if len(met):
        i = int(met[0])
        meet = float(time[i])
        if i > 0 and left[i - 1] > left[i]:
            share = (left[i - 1] - UNTOUCHED) / (left[i - 1] - left[i])
            meet = float(time[i - 1] + share * (time[i] - time[i - 1]))
    return {
        "layers_meet": meet,
        "depth_share": FELT,
        "deepest": {wall.name: float(depth[:, wall.end].max(initial=0.0)) for wall in run.walls},
    }


def reach(run: Run) -> np.ndarray:
    """Depth (k, 2) in m of each wall's layer at the kept profiles, worked out once: see ``_reach``."""
    if run not in _KNOWN:
        _KNOWN[run] = _reach(run)
    return _KNOWN[run]


_KNOWN: WeakKeyDictionary[Run, np.ndarray] = WeakKeyDictionary()


def _reach(run: Run) -> np.ndarray:
    """Depth (k, 2) in m of each wall's layer at the kept profiles.

    The layer is where the fluid moves otherwise than the pressure alone would have moved it since t = 0: from the
    wall inwards, as long as that difference is above 1 % of its largest value so far.
    """
    history = run.history
    # between the nodes too: a layer's edge is thinner than a cell of the core
    position = between(history.position[None, :], DENSER, np.zeros(1, bool))[0]
    linear = np.isnan(history.stress[history.profile_row]).any(axis=1)
    start = history.profile[0].copy()
    if len(start) > 2:  # walls that jumped at t = 0 have moved already; the fluid beside them has not
        start[0], start[-1] = _before(history.profile[0], 0), _before(history.profile[0], -1)
    moved = history.profile - start - run.fluid_impulse[:, None]
    change = np.abs(between(moved, DENSER, linear))
    largest = np.maximum.accumulate(change.max(axis=1))
    felt = change >= FELT * np.where(largest > 0, largest, np.inf)[:, None]
    level = FELT * largest[:, None]
    return np.stack(
        [
            _depth(position, change, felt, level),
            _depth(-position[::-1], change[:, ::-1], felt[:, ::-1], level),
        ],
        axis=1,
    )


def _before(profile: np.ndarray, end: int) -> float:
    """A wall node's speed before a jump at t = 0, read off its unmoved neighbour."""
    return float(profile[1] if end == 0 else profile[-2])


def _depth(position: np.ndarray, change: np.ndarray, felt: np.ndarray, level: np.ndarray) -> np.ndarray:
    """Distance (k,) from the first node to where ``change`` first falls to ``level``, linear between nodes."""
    nodes = len(position)
    ends = np.where(felt.all(axis=1), nodes, np.argmin(felt, axis=1))
    inside = np.clip(ends, 1, nodes - 1)
    rows = np.arange(len(change))
    high, low = change[rows, inside - 1], change[rows, inside]
    share = np.where(high > low, (high - level[:, 0]) / np.where(high > low, high - low, 1.0), 0.0)
    depth = position[inside - 1] + np.clip(share, 0.0, 1.0) * (position[inside] - position[inside - 1]) - position[0]
    return np.where(ends == 0, 0.0, np.where(ends == nodes, position[-1] - position[0], depth))

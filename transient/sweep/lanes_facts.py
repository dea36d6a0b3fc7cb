"""What rows end in, from the grids' own steady states: exact on any grid."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.march import lanes_layout as layout
from transient.sweep import lanes_headline as headline
from transient.sweep.lanes_batch import Batch


@dataclass(frozen=True, eq=False)
class Facts:
    """What rows end in, exact on any grid: ``ends`` [n, FACTS]; ``calm`` [n, 3, 3] steady stresses of both walls and
    mean per unit input; ``reach`` [n, 2] of a wall's stress times speed in the work per volume; ``middle`` (n,) what a
    mean speed is divided by to compare it with wall speeds."""

    ends: np.ndarray
    calm: np.ndarray
    reach: np.ndarray
    middle: np.ndarray


def facts_of(
    batch: Batch, rows: np.ndarray, grid: np.ndarray, tables: list, places: np.ndarray
) -> Facts:
    facts, n = np.zeros((len(rows), headline.FACTS)), len(rows)
    calm, reach, middle = np.zeros((n, 3, 3)), np.zeros((n, 2)), np.ones(n)
    facts[:, headline.LEVEL] = batch.within[rows]
    final = batch.final[rows]
    for place, levels in enumerate(tables):
        own = np.flatnonzero(grid == place) if len(tables) > 1 else slice(None)
        table, ends = levels[-1]
        steady = table[layout.STEADY :]  # [3, node, side]
        known = _calm(steady, table, ends)
        unit = batch.units[places[place]]
        calm[own] = known
        power = 2 if unit.rotating else unit.metric
        volume = 0.5 * (unit.inner + unit.outer) if unit.metric else 1.0
        reach[own] = np.array([unit.inner**power, unit.outer**power]) / volume
        middle[own] = 0.5 * (unit.inner + unit.outer) if unit.rotating else 1.0
        facts[own, headline.CALM_SPEED] = _largest(final[own], steady, table)
    return Facts(facts, calm, reach, middle)


def _calm(steady: np.ndarray, table: np.ndarray, ends: np.ndarray) -> np.ndarray:
    """Steady stresses of both walls, and the mean, that one unit of each input makes, [3, 3]."""
    out = np.zeros((3, 3))
    for side in (0, 1):
        beside = steady[:, 1 if ends[layout.HELD, side] else 0, side]
        wall = np.eye(3)[side] if ends[layout.FLUX, side] else np.zeros(3)
        balance = ends[layout.FLUX, side] * (beside - wall)
        balance[2] += ends[layout.CELL, side]
        out[side] = balance * ends[layout.RADIUS, side]
    out[2] = (steady * table[layout.WEIGHT]).sum(axis=(1, 2))
    return out


def _largest(final: np.ndarray, steady: np.ndarray, table: np.ndarray) -> np.ndarray:
    """Largest |w| (n,) over the gap of the steady ends, by the parabola around the largest node."""
    half = steady.shape[1] - 1
    basis = np.concatenate([steady[:, :, 0], steady[:, half - 1 :: -1, 1]], axis=1)
    lever = np.concatenate([table[layout.LEVER, :, 0], table[layout.LEVER, half - 1 :: -1, 1]])
    step = np.concatenate([table[layout.BEFORE, 1:, 0], table[layout.BEFORE, :0:-1, 1]])
    profile = np.abs(final @ (basis * lever))
    top = profile.argmax(axis=1)
    row = np.arange(len(top))
    inner = np.clip(top, 1, profile.shape[1] - 2)
    here = profile[row, inner]
    low, high = step[inner - 1], step[inner]
    rise, fall = (here - profile[row, inner - 1]) / low, (here - profile[row, inner + 1]) / high
    slope = (rise * high - fall * low) / (low + high)
    bend = rise + fall
    inside = (top == inner) & (rise >= 0.0) & (fall >= 0.0) & (bend > 0.0)
    more = np.where(inside, slope**2 * (low + high) / (4.0 * np.where(bend > 0.0, bend, 1.0)), 0.0)
    return profile[row, top] + more

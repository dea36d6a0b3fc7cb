"""Grids of many annuli of one kind at once: the formulas of ``gap.grid`` on arrays over the gaps.

All have the same cells and layers as shares of the gap; only the inner radius differs.
"""

from __future__ import annotations

import numpy as np

from transient.gap.grid import spacing
from transient.gap.problem import Problem
from transient.march import lanes_layout as layout

# Points of the mean's integrals in each cell: cells of a march are at most half as long as their radius.
_X, _W = np.polynomial.legendre.leggauss(5)


def round_tables(
    unit: Problem, inner: np.ndarray, cells: int, layers: tuple[float, float]
) -> tuple[np.ndarray, np.ndarray]:
    """(nodes [G, NODE_FIELDS, cells / 2 + 1, 2], ends [G, END_FIELDS, 2]) of unit gaps with inner radii (G,).

    ``unit`` tells the metric (1 or 3) and the walls.
    """
    metric = unit.metric
    low, high = spacing(cells, *layers)
    step = np.where(low[1:] < 0.5, np.diff(low), -np.diff(high))
    radius = inner[:, None] + low
    conductance, beyond = _intervals(metric, radius[:, :-1], step)
    volume = _volumes(metric, radius, step, beyond)
    weight = _weights(metric, radius[:, :-1], step, conductance, volume)
    held, between, storage, cell = _ends(unit, radius, conductance, volume)
    fields = np.zeros((len(inner), layout.NODE_FIELDS, cells + 1))
    fields[:, layout.STORAGE] = storage
    fields[:, layout.WEIGHT] = weight
    fields[:, layout.LEVER] = radius if unit.rotating else 1.0
    fields[:, layout.STEADY :] = _steady(unit, held, between, conductance, volume * (not unit.rotating))
    return _halved(fields, conductance, step), _end_fields(unit, held, between, cell, radius)


def _intervals(metric: int, low: np.ndarray, step: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """Conductances and distances to the faces, as in ``gap.grid``."""
    x = step / low
    if metric == 3:
        high = low + step
        return 2.0 * low**2 * high**2 / (step * (low + high)), low * x / (np.sqrt(1.0 + x) + 1.0)
    log = np.log1p(x)
    direct = (1.0 + 0.5 * x) * x / log - 1.0
    excess = np.where(x < 1e-3, x + x * x / 6.0 - x**4 / 180.0 + x**5 / 180.0, direct)
    return 1.0 / log, low * excess / (np.sqrt(1.0 + excess) + 1.0)


def _volumes(metric: int, radius: np.ndarray, step: np.ndarray, beyond: np.ndarray) -> np.ndarray:
    nothing = np.zeros((len(radius), 1))
    before = np.concatenate([nothing, step - beyond], axis=1)
    after = np.concatenate([beyond, nothing], axis=1)
    width, centre = before + after, radius + 0.5 * (after - before)
    return width * centre if metric == 1 else width * centre * (centre**2 + 0.25 * width**2)


def _weights(
    metric: int, low: np.ndarray, step: np.ndarray, conductance: np.ndarray, volume: np.ndarray
) -> np.ndarray:
    """Weights of the mean velocity, as in ``gap.grid``."""
    x = 0.5 * step[:, None] * (1.0 + _X)
    low, whole = low[:, :, None], step[:, None]
    r = low + x
    measure = r * (0.5 * step[:, None] * _W)
    if metric == 1:
        share = np.log1p(x / low) / np.log1p(whole / low)
        bubble = 0.25 * (whole * (2.0 * low + whole) * share - x * (2.0 * low + x))
    else:
        high = low + whole
        share = (x * (2.0 * low + x) / (low * r) ** 2) / (whole * (low + high) / (low * high) ** 2)
        bubble = 0.125 * (whole * (2.0 * low + whole) * share - x * (2.0 * low + x))
    upper, both = (measure * share).sum(axis=2), measure.sum(axis=2)
    curve = (measure * bubble).sum(axis=2)
    out = np.zeros_like(volume)
    out[:, :-1] += both - upper
    out[:, 1:] += upper
    share = np.zeros_like(volume)
    share[:, :-1] += 0.5 * curve
    share[:, 1:] += 0.5 * curve
    share[:, 1] += share[:, 0]
    share[:, -2] += share[:, -1]
    share[:, 0] = share[:, -1] = 0.0
    flux = conductance * np.diff(share / volume, axis=1)
    out[:, :-1] -= flux
    out[:, 1:] += flux
    return out / (1.0 if metric == 3 else both.sum(axis=1, keepdims=True))


def _ends(
    unit: Problem, radius: np.ndarray, conductance: np.ndarray, volume: np.ndarray
) -> tuple[list[bool], np.ndarray, np.ndarray, np.ndarray]:
    """(whether each end's node has its wall's speed, conductance between each wall and the first unknown [G, 2],
    storage of the nodes [G, N], volume of each wall's own half cell [G, 2])."""
    storage, held = volume.copy(), []
    between, cell = np.zeros((len(radius), 2)), np.zeros((len(radius), 2))
    for side, wall in enumerate(unit.walls):
        end = -side
        held.append(wall.kind == "moving" and wall.slip_length == 0.0)
        if held[-1]:
            between[:, side] = conductance[:, end]
            cell[:, side] = volume[:, end]
            storage[:, end] = 0.0
        elif wall.kind == "moving":
            between[:, side] = radius[:, end] ** unit.metric / wall.slip_length
    return held, between, storage, cell


def _steady(
    unit: Problem, held: list[bool], between: np.ndarray, conductance: np.ndarray, volume: np.ndarray
) -> np.ndarray:
    """Steady values at all nodes [G, 3, N] for a unit of each input: fluxes from the balance, differences from fluxes,
    as in ``gap.system``."""
    first, last = int(held[0]), volume.shape[1] - int(held[1])
    inside = conductance[:, first : last - 1]
    pushed = np.concatenate([np.zeros((len(volume), 1)), np.cumsum(volume[:, first:last], axis=1)], axis=1)
    with np.errstate(divide="ignore"):
        resistance = 1.0 / np.concatenate([between[:, :1], inside, between[:, 1:]], axis=1)
    out = np.zeros((len(volume), 3, volume.shape[1]))
    for row in range(3):
        low, high, push = np.eye(3)[row]
        force = push * pushed
        if not np.isfinite(resistance[0, 0]):
            start = np.zeros(len(volume))
        elif not np.isfinite(resistance[0, -1]):
            start = force[:, -1]
        else:
            start = (high - low + (force * resistance).sum(axis=1)) / resistance.sum(axis=1)
        drop = (start[:, None] - force) * np.where(np.isfinite(resistance), resistance, 0.0)
        upward = low + np.cumsum(drop[:, :-1], axis=1)
        downward = high - np.cumsum(drop[:, :0:-1], axis=1)[:, ::-1]
        if not np.isfinite(resistance[0, 0]):
            upward = downward
        elif np.isfinite(resistance[0, -1]):
            half = upward.shape[1] // 2
            upward = np.concatenate([upward[:, :half], downward[:, half:]], axis=1)
        out[:, row, first:last] = upward
        if held[0]:
            out[:, row, 0] = low
        if held[1]:
            out[:, row, -1] = high
    return out


def _halved(fields: np.ndarray, conductance: np.ndarray, step: np.ndarray) -> np.ndarray:
    """Both halves numbered from their walls inwards."""
    half = len(step) // 2
    table = np.zeros((len(fields), layout.NODE_FIELDS, half + 1, 2))
    table[..., 0] = fields[:, :, : half + 1]
    table[..., 1] = fields[:, :, : half - 1 : -1]
    table[:, [layout.STORAGE, layout.WEIGHT], half] *= 0.5
    for side, order in ((0, 1), (1, -1)):
        table[:, layout.CONDUCTANCE, :half, side] = conductance[:, ::order][:, :half]
        table[:, layout.BEFORE, 1:, side] = step[::order][:half]
        table[:, layout.AFTER, :, side] = step[::order][: half + 1]
    return table


def _end_fields(
    unit: Problem, held: list[bool], between: np.ndarray, cell: np.ndarray, radius: np.ndarray
) -> np.ndarray:
    ends = np.zeros((len(radius), layout.END_FIELDS, 2))
    power = min(unit.metric, 2)
    for side in (0, 1):
        ends[:, layout.HELD, side] = held[side]
        ends[:, layout.END, side] = 0.0 if held[side] else between[:, side]
        ends[:, layout.FLUX, side] = between[:, side]
        ends[:, layout.CELL, side] = cell[:, side]
        ends[:, layout.RADIUS, side] = 1.0 / radius[:, -side] ** power
        ends[:, layout.DRIVE, side] = ends[:, layout.END, side]
        ends[:, layout.FLUID, side] = 1.0
    return ends

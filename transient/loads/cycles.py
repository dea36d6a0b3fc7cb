"""Load cycles by the rainflow count of ASTM E1049-85, section 5.4.4, also of a duty cycle that repeats."""

from __future__ import annotations

from collections import Counter

import numpy as np

from transient.loads.extrema import reversals

Cycle = tuple[float, float]


def cycles(values: np.ndarray, repeat: int = 1) -> list[tuple[float, float, float]]:
    """(range, mean, count) of the history ``values`` (n,) run ``repeat`` times end to end, largest range first.

    Half cycles count 0.5; equal ranges with equal means are one entry.  The count of any number of repeats follows
    exactly from those of one and of two: once both extremes of the history have passed, the points not yet paired
    are the same at the same place of every repeat, so every repeat after the first adds the same cycles.
    """
    turns = values[reversals(values)]
    once = _count(turns)
    if repeat > 1:
        twice = _count(np.concatenate([turns, turns]))
        for cycle in {*once, *twice}:
            once[cycle] += (repeat - 1) * (twice[cycle] - once[cycle])
    ordered = sorted(once, key=lambda cycle: (-cycle[0], cycle[1]))
    return [(*cycle, once[cycle]) for cycle in ordered if once[cycle]]


def _count(turns: np.ndarray) -> Counter[Cycle]:
    from rainflow import extract_cycles

    out: Counter[Cycle] = Counter()
    # The package takes the last value for a reversal only if something follows the first two.
    series = [*turns.tolist(), float(turns[-1])]
    for extent, mean, count, *_ in extract_cycles(series):
        if extent > 0.0:
            out[extent, mean] += count
    return out

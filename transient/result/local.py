"""What a value after an infinite one is measured by."""

from __future__ import annotations

import itertools

import numpy as np

FLOOR = 0.01  # of the usual magnitude: no local size is taken as less


def local_size(value: np.ndarray) -> np.ndarray:
    """Local magnitude (n,) of a history that is infinite at some rows (NaN there; so is the size).

    The largest magnitude from each row on to the next infinite one: a decay is measured by itself at every row, and an
    oscillation that passes through zero by what it still comes to.
    """
    size = np.abs(value)
    out = np.full(len(size), np.nan)
    edges = [-1, *np.flatnonzero(np.isnan(size)), len(size)]
    for before, after in itertools.pairwise(edges):
        part = slice(before + 1, after)
        out[part] = np.maximum.accumulate(size[part][::-1])[::-1]
    finite = size[np.isfinite(size)]
    return np.maximum(out, FLOOR * np.median(finite)) if len(finite) else out

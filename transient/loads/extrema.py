"""The reversals of a load history: what fatigue counts, and what a table at constant steps would lose."""

from __future__ import annotations

import numpy as np

from transient.loads.history import LoadHistory

# Ups and downs below this share of the largest magnitude are the round-off of the history.
ROUND_OFF = 1e-10


def reversals(values: np.ndarray, least: float | None = None) -> np.ndarray:
    """Rows (k,) of ``values`` (n,) at which they turn, the first and the last among them.

    Of a plateau the first row.  Ups and downs of no more than ``least`` (default: round-off of the largest) are none.
    """
    values = np.asarray(values, float)
    if least is None:
        least = ROUND_OFF * float(np.abs(values[np.isfinite(values)]).max(initial=0.0))
    rows = _turns(values)
    kept = [int(rows[0])]
    way = 0  # direction in which the history came to the last kept turn; 0 at the first
    for row in rows[1:].tolist():
        change = float(values[row] - values[kept[-1]])
        direction = (change > 0.0) - (change < 0.0)
        if direction and way == direction:
            kept[-1] = row
        elif abs(change) > least:
            kept.append(row)
            way = direction
    last = len(values) - 1
    if kept[-1] != last and (len(kept) == 1 or values[kept[-1]] != values[last]):
        kept.append(last)
    return np.array(kept)


def _turns(values: np.ndarray) -> np.ndarray:
    """Rows where the slope changes sign, flat stretches aside, with both ends."""
    moves = np.flatnonzero(np.diff(values) != 0.0)
    if len(moves) == 0:
        return np.array([0])
    rises = values[moves + 1] > values[moves]
    turns = np.flatnonzero(rises[1:] != rises[:-1])
    return np.concatenate([[0], moves[turns] + 1, [moves[-1] + 1]])


def extrema(history: LoadHistory) -> list[tuple[float, float | None, str]]:
    """(time s, load or None where infinite, kind) in the order of time; kinds are
    "start", "maximum", "minimum", "end" and "infinite".
    """
    values = history.value.copy()
    for instant in history.infinite:
        values[instant.row] = np.copysign(np.inf, instant.coefficient)
    rows = reversals(values)
    values = values[rows]
    out: list[tuple[float, float | None, str]] = []
    for i, row in enumerate(rows):
        kind = "start" if i == 0 else "end"
        if 0 < i < len(rows) - 1:
            kind = "maximum" if values[i] > values[i - 1] else "minimum"
        if np.isinf(values[i]):
            out.append((float(history.time[row]), None, "infinite"))
        else:
            out.append((float(history.time[row]), float(values[i]), kind))
    return out

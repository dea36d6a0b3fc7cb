"""Stops and breakings-away of bodies as break points of the run, and levels whose break points differ."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from transient.gap.problem import LOWER, PRESSURE, UPPER, Inputs, Problem
from transient.march import kernel
from transient.march.march import Trace
from transient.result.history import History

SAMPLED = (("stress", "stress_rate"), ("speed", "acceleration"), ("mean", "mean_rate"), ("gradient", "gradient_rate"))


def eventful(problem: Problem) -> bool:
    """Whether bodies may stop or break away at instants that no input tells."""
    return any(wall.body is not None and wall.body.breakaway > 0.0 for wall in problem.walls)


def divided(inputs: Inputs, trace: Trace) -> tuple[Inputs, Trace]:
    """Inputs and rows with a new piece at every event of the trace (offsets of its rows count from there already)."""
    events = np.flatnonzero(trace.mark == kernel.EVENT)
    if len(events) == 0:
        return inputs, trace
    base = 0.0
    starts = []
    for row in events:
        again = len(starts) and trace.piece[events[len(starts) - 1]] == trace.piece[row]
        base = (base if again else 0.0) + trace.offset[row]
        starts.append(inputs.starts[trace.piece[row]] + base)
    earlier = np.cumsum(np.append(0, trace.mark[:-1] == kernel.EVENT))
    every = np.sort(np.concatenate([inputs.starts, starts]))
    rows = [inputs.row(index).restart(every) for index in (LOWER, UPPER, PRESSURE)]
    again = Inputs(
        every,
        np.stack([row.poly for row in rows], axis=1),
        np.stack([row.coeff for row in rows], axis=1),
        np.stack([row.rate for row in rows], axis=1),
        inputs.before,
    )
    return again, replace(trace, piece=trace.piece + earlier)


def resampled(other: History, best: History) -> History:
    """``other`` at the rows of ``best``; both are on the same nodes."""
    rows = best.time
    out = {}
    for name, rate in SAMPLED:
        value = getattr(other, name)
        columns = value[:, None] if value.ndim == 1 else value
        rates = getattr(other, rate)
        rates = rates[:, None] if rates.ndim == 1 else rates
        curves = [replace(other.mean_curve(), value=c, rate=r) for c, r in zip(columns.T, rates.T, strict=True)]
        found = np.stack([curve.sample(rows) for curve in curves], axis=1)
        # the limit from the left at a break of ``best``
        left = np.append(np.diff(best.time) == 0.0, False)
        before = np.nextafter(rows[left], -np.inf)
        found[left] = np.stack([curve.sample(before) for curve in curves], axis=1)
        out[name] = found[:, 0] if value.ndim == 1 else found
    place = [np.interp(rows, other.time, column) for column in other.place.T]
    profile, travel = other.profiles_at(rows[best.profile_row])
    return replace(best, **out, place=np.stack(place, axis=1), profile=profile, travel=travel)

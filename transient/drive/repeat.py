"""One history over and over."""

from __future__ import annotations

import numpy as np

from transient.drive.assemble import held, require_positive
from transient.drive.kind import Field, Kind
from transient.drive.pieces import Drive, DriveError, Pieces, Track, constant, periodic
from transient.drive.times import SAME_TIME


def build(part: Drive, every: float, times: int | None = None) -> Drive:
    """``part(t modulo every)``; after ``times`` repeats, the value that ``part`` reaches at ``every`` (s).

    At the seams the part's end is its limit from the left; a jump of the part just there belongs to no cycle.
    """
    require_positive(every=every)
    if times is not None and (times != int(times) or times < 1):
        raise DriveError("times must be a whole number, 1 or more", "times")
    cycle = one_cycle(part, every)
    end = float(cycle.at(np.array([-1]), np.array([every - cycle.starts[-1]]))[0])
    if times is not None:
        since = int(times) * every
        return Drive((Track(cycle, every, int(times), end),), part.before, held(end, since))
    if _steady(cycle):
        return constant(end, before=part.before)
    length = np.inf if _whole_waves(cycle, every) else every
    return periodic((Track(cycle, length),), every, part.before)


def one_cycle(part: Drive, every: float) -> Pieces:
    """``part`` over [0, every) as plain pieces."""
    starts = part.breaks(every)
    # A break that meets the cycle's end to round-off would leave a piece of no length.
    return part.pieces(every, starts[(starts < every * (1.0 - 2.0 * SAME_TIME)) | (starts == 0.0)])


def _steady(cycle: Pieces) -> bool:
    return len(cycle.starts) == 1 and not cycle.poly[:, 1:].any() and cycle.coeff.shape[1] == 0


def _whole_waves(cycle: Pieces, every: float) -> bool:
    """Whether the cycle holds nothing but a constant and whole sine waves, which need no seams."""
    if len(cycle.starts) > 1 or cycle.poly[:, 1:].any() or cycle.rate.real.any():
        return False
    turns = cycle.rate.imag * every / (2.0 * np.pi)
    return bool(np.all(np.abs(turns - np.round(turns)) <= 1e-14 * np.abs(turns)))


KIND = Kind(
    "repeat",
    "one history over and over",
    (
        Field("part", "history", "the history to repeat", required=True),
        Field("every", "time", "length of one cycle", required=True, positive=True),
        Field("times", "count", "number of cycles; left out: for the whole run", positive=True),
    ),
    build,
)

"""Settling times against the exact passage of the band: where it lies beside each stated time."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from transient.march.levels import Ladder
from transient.result.history import History
from transient.result.run import Run
from transient.trust.exact import Exact, orbit_errors
from transient.trust.peaks import speed_error

RESOLVED = 3e-9  # of a settling time: how closely the exact passage is found
PASSAGE_MARGIN = 1.1  # for the exact deviation's own largest place, which lies between the places looked at
LOOKS = 13  # instants looked at in each narrowing


def sharpened(settling: dict[str, Any], exact: Exact, ladder: Ladder, run: Run) -> dict[str, Any]:
    """The settling part of a summary with errors that include the exact crossing beside each stated time.

    The exact deviation is looked for its last passage of the band near the time.
    """
    away, errors = ladder.best.deviation, run.errors
    names = {wall.name: wall.end for wall in run.walls}
    if exact.deviation is None or away is None:
        return settling
    said, size, spread = settling, settling["relative_to"], settling["errors"]
    # the size of a periodic regime, or a peak that stands in for a size, is a computed one too; a steady one is exact
    if said["regime"] == "periodic":
        known, unsure = {}, orbit_errors(ladder, exact)
    else:
        known = {1: abs(exact.mean), 2: abs(exact.stress[0]), 3: abs(exact.stress[1])}
        unsure = [0.0, errors.mean_peak, *errors.peak]
        if run.regime.velocity != size["velocity"]:  # nothing moves in the end: the size is the run's largest speed
            unsure[0] = speed_error(away, exact.deviation, errors.level_profile)
    rows = [("velocity", said["velocity"], spread["velocity"], size["velocity"], 0)]
    rows.append(("flow", said["flow"], spread["flow"], size["flow"], 1))
    rows += [(n, said["stress"][n], spread["stress"][n], size["stress"][n], 2 + end) for n, end in names.items()]
    found, searches = {}, []
    for name, time, error, scale, column in rows:
        found[name] = error
        if time is None or error is None or not time or not scale:
            continue
        share = 0.0 if column in known and abs(known[column] - scale) <= 1e-9 * scale else unsure[column] / scale
        bands = {said["within"] * scale * (1.0 + side * share) for side in (-1.0, 1.0)}
        searches += [_Search(name, column, time, error, band, away) for band in sorted(bands)]
    for search in _passages(exact, away, searches):
        found[search.name] = max(found[search.name], float(PASSAGE_MARGIN * search.off))
    told = {"velocity": found["velocity"], "flow": found["flow"], "stress": {n: found[n] for n in names}}
    return {**settling, "error": found["velocity"], "errors": told}


@dataclass
class _Search:
    """The search for where the exact deviation last falls below ``band`` beside the stated ``time``; ``off``: how far
    from it, 0 where it is not found within a step."""

    name: str
    column: int
    time: float
    error: float
    band: float
    away: History
    off: float = 0.0

    def __post_init__(self) -> None:
        rows = self.away.time[self.away.profile_row] if self.column == 0 else self.away.time  # few profiles are kept
        i = int(np.clip(np.searchsorted(rows, self.time), 1, max(len(rows) - 1, 1)))
        step = float(rows[min(i, len(rows) - 1)] - rows[i - 1])
        # where the stated error is right the passage lies within a few of it; else anywhere in the step
        self.widths = [max(3.0 * self.error, step), 3.0 * self.error]
        self.begin()

    def begin(self) -> None:
        """The next wider stretch to look at."""
        wide = self.widths.pop()
        self.low, self.high = max(self.time - wide, 0.0), min(self.time + wide, float(self.away.time[-1]))

    @property
    def open(self) -> bool:
        """Whether there is anything left to look at."""
        return self.high - self.low > max(RESOLVED * self.time, 0.02 * self.error)

    def instants(self) -> np.ndarray:
        return np.linspace(self.low, self.high, LOOKS)

    def narrow(self, value: np.ndarray) -> None:
        """Take in the deviation at ``instants``."""
        above = value > self.band
        crossing = np.flatnonzero(above[:-1] & ~above[1:])
        if len(crossing) == 0:
            if self.off == 0.0 and self.widths:
                self.begin()
            else:
                self.low = self.high
            return
        t = self.instants()
        self.low, self.high = float(t[crossing[-1]]), float(t[crossing[-1] + 1])
        self.off = max(abs(self.low - self.time), abs(self.high - self.time))


def _passages(exact: Exact, away: History, searches: list[_Search]) -> list[_Search]:
    """The searches, done: those of the velocity in common, those of mean and stresses in common."""
    dense = away.around_largest
    lever = 1.0 if away.lever is None else dense
    for group in ([s for s in searches if s.column == 0], [s for s in searches if s.column > 0]):
        while live := [s for s in group if s.open]:
            time = np.concatenate([s.instants() for s in live])
            if live[0].column == 0:
                values = exact.away_velocity(time, dense, lever).reshape(len(live), LOOKS)
            else:
                numbers = exact.away_walls(time).reshape(len(live), LOOKS, 3)
                values = np.stack([numbers[i, :, s.column - 1] for i, s in enumerate(live)])
            for search, value in zip(live, values, strict=True):
                search.narrow(value)
    return searches

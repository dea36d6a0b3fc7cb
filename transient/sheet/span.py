"""The time axis of a figure: its unit, and whether it is straight or logarithmic."""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from transient.result.result import Result
from transient.result.scale import Scale, scale
from transient.sheet.style import FAINT, SOFT, told

if TYPE_CHECKING:
    from matplotlib.axes import Axes

# Most of what changes (this share of its whole variation) within this part of the run: a straight axis hides it.
MOST, EARLY = 0.8, 0.05
# What comes before this share of the variation is not worth a decade; nor are more decades than these.
STARTED, DECADES = 0.04, 7
# More breaks than this would be a grey wall, and become ticks along the top; more than that, nothing.
MOST_LINES, MOST_TICKS = 12, 400


@dataclass(frozen=True)
class Span:
    """Times from ``start`` to ``end`` (s) on a straight or a logarithmic axis in the unit of ``scale``."""

    start: float
    end: float
    log: bool
    scale: Scale

    def shown(self, time: np.ndarray) -> np.ndarray:
        """Times (s) as axis values (n,); what lies before the start of the axis is NaN and draws nothing."""
        return np.where(time >= self.start, time, np.nan) * self.scale.factor

    def place(self, time: float) -> float:
        """Axis value of a mark; one before the start of the axis is set at its start."""
        return max(float(time), self.start) * self.scale.factor

    def dress(self, axes: Axes, last: bool) -> None:
        """Sets scale, limits and (on the ``last`` of stacked axes) the label."""
        if self.log:
            axes.set_xscale("log")
        axes.set_xlim(self.start * self.scale.factor, self.end * self.scale.factor)
        axes.tick_params(labelbottom=last)
        if not last:
            return
        if self.log:
            factor = self.scale.factor
            axes.xaxis.set_major_formatter(lambda value, _: told(value / factor, "s", 3))
            axes.set_xlabel("time, logarithmic (units at the ticks)")
        else:
            axes.set_xlabel(f"time [{self.scale.unit}]")

    def mark_breaks(self, axes: Axes, breaks: np.ndarray) -> bool:
        """Marks the drive's break points inside the span; whether any was marked."""
        inside = breaks[(breaks > self.start) & (breaks <= self.end)]
        if len(inside) == 0 or len(inside) > MOST_TICKS:
            return False
        x = inside * self.scale.factor
        if len(inside) <= MOST_LINES:
            for place in x:
                axes.axvline(place, color=FAINT, lw=0.8, ls=(0, (2, 2)), zorder=0)
        axes.plot(
            x, np.ones(len(x)), ls="none", marker=7, ms=4.5, color=SOFT, clip_on=False,
            transform=axes.get_xaxis_transform(), gid="break",
        )  # fmt: skip
        return True


def span(result: Result, signals: list[np.ndarray]) -> Span:
    """The axis for a result's histories: logarithmic where most of any signal's change is over early in the run."""
    time = result.time
    end = float(time[-1])
    start = end
    log = False
    for signal in signals:
        finite = np.isfinite(signal)
        t, y = time[finite], signal[finite]
        grown = np.concatenate([[0.0], np.cumsum(np.abs(np.diff(y)))])
        if grown[-1] <= 0.0:
            continue
        log = log or t[np.searchsorted(grown, MOST * grown[-1])] < EARLY * end
        begun = t[min(np.searchsorted(grown, STARTED * grown[-1]), len(t) - 1)]
        start = min(start, float(begun))
    if not log:
        return Span(0.0, end, False, scale(end, "s"))
    return Span(max(start, end * 10.0**-DECADES, float(time[time > 0][0])), end, True, scale(end, "s"))

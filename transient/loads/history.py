"""A load over time as stored: straight lines between rows, and the law of an infinite stress where there is one."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np


@dataclass(frozen=True)
class Infinite:
    """An instant at which the load is infinite: from row ``row`` to the next, ``coefficient`` / s^exponent + ``rest``.

    s is the time since that row; ``coefficient`` carries the sign of the load.
    """

    row: int
    time: float
    coefficient: float
    exponent: float
    rest: float

    def value(self, since: np.ndarray) -> np.ndarray:
        """The load (m,) at times ``since`` > 0 after the instant."""
        return self.coefficient / since**self.exponent + self.rest

    def integral(self, since: np.ndarray) -> np.ndarray:
        """Its integral (m,) from the instant on."""
        rest = 1.0 - self.exponent
        return self.coefficient * since**rest / rest + self.rest * since


@dataclass(frozen=True, eq=False)
class LoadHistory:
    """``time`` (n,) s rising, ``value`` (n,) in the load's unit; at an infinite row the value just before it."""

    time: np.ndarray
    value: np.ndarray
    infinite: tuple[Infinite, ...] = ()

    def at(self, time: np.ndarray) -> np.ndarray:
        """The load (m,) at ``time`` (m,); its first value before the first row, its last after the last."""
        out = np.interp(time, self.time, self.value)
        for instant in self.infinite:
            inside = self._within(instant, time)
            out[inside] = instant.value(time[inside] - instant.time)
        return out

    def integral(self, time: np.ndarray) -> np.ndarray:
        """Integral (m,) of the load from the first row to ``time`` (m,) between the first row and the last."""
        row = np.clip(np.searchsorted(self.time, time, side="right") - 1, 0, len(self.time) - 2)
        since = time - self.time[row]
        share = since / (self.time[row + 1] - self.time[row])
        rise = self.value[row + 1] - self.value[row]
        part = since * (self.value[row] + 0.5 * share * rise)
        for instant in self.infinite:
            inside = self._within(instant, time)
            part[inside] = instant.integral(time[inside] - instant.time)
        return self._running[row] + part

    @cached_property
    def impulse(self) -> float:
        """Integral over the whole history: exact for straight lines and for the law of an infinite stress."""
        return float(self._running[-1])

    @cached_property
    def _running(self) -> np.ndarray:
        step = np.diff(self.time)
        part = 0.5 * step * (self.value[1:] + self.value[:-1])
        for instant in self.infinite:
            if instant.row < len(step):
                part[instant.row] = instant.integral(step[instant.row])
        return np.concatenate([[0.0], np.cumsum(part)])

    def _within(self, instant: Infinite, time: np.ndarray) -> np.ndarray:
        if instant.row + 1 >= len(self.time):
            return np.zeros(len(time), bool)
        return (time > instant.time) & (time < self.time[instant.row + 1])

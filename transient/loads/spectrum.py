"""Dynamic load factor of a load history against natural frequency (Biggs 1964; Chopra: shock spectrum)."""

from __future__ import annotations

import math
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass

import numpy as np

from transient.loads.load import Load

POINTS_PER_DECADE = 32
# Oscillator steps below which a second thread costs more than it saves.
_WORTH_A_THREAD = 1_000_000
_THREADS = 2


@dataclass(frozen=True, eq=False)
class Spectrum:
    """``factor`` (k,) at ``frequency`` (k,) Hz for a ``damping`` ratio; None where the load is infinite or nil."""

    frequency: np.ndarray
    factor: np.ndarray | None
    damping: float


def frequencies(low: float, high: float) -> np.ndarray:
    """Natural frequencies (k,) Hz from ``low`` to ``high`` at even ratios, both ends exact."""
    if low == high:
        return np.array([low])
    count = 2 + math.ceil(POINTS_PER_DECADE * math.log10(high / low))
    out = np.geomspace(low, high, count)
    out[[0, -1]] = low, high
    return out


def spectrum_of(load: Load, frequency: np.ndarray, damping: float = 0.0) -> Spectrum:
    """Largest |response| of an oscillator over the static response to the load's largest magnitude.

    Absolute maximum over the history and the free vibration after it (load held at its last value); the oscillator
    starts in static equilibrium with the load just before t = 0.  ``damping`` ratio in [0, 1).
    """
    from transient.loads.oscillator import largest_deflections

    history = load.history
    static = float(np.abs(history.value).max())
    if load.peak is None or static == 0.0:
        return Spectrum(frequency, None, damping)
    value, before = history.value / static, load.before / static
    omega, largest = 2.0 * np.pi * frequency, np.empty(len(frequency))

    def fill(part: slice) -> None:
        own = np.empty(len(omega[part]))
        largest_deflections(history.time, value, before, np.ascontiguousarray(omega[part]), damping, own)
        largest[part] = own

    threads = 1 if len(frequency) * len(value) < _WORTH_A_THREAD else _THREADS
    with ThreadPoolExecutor(threads) as pool:
        list(pool.map(fill, [slice(i, None, threads) for i in range(threads)]))
    return Spectrum(frequency, largest, damping)

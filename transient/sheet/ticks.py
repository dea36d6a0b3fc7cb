"""Round numbers along an axis, where no plotting library draws it."""

from __future__ import annotations

import math


def ticks(low: float, high: float, most: int = 6) -> list[float]:
    """Multiples of 1, 2 or 5 times a power of ten in [low, high], ``most`` + 1 at most."""
    if not high > low:
        return [low]
    rough = (high - low) / most
    power = 10.0 ** math.floor(math.log10(rough))
    step = next(power * part for part in (1.0, 2.0, 5.0, 10.0) if power * part >= rough * (1.0 - 1e-9))
    first, last = math.ceil(low / step - 1e-9), math.floor(high / step + 1e-9)
    # through text: 3 x 0.1 is to be 0.3
    return [float(f"{number * step:.12g}") + 0.0 for number in range(first, last + 1)]


def decades(low: float, high: float) -> list[float]:
    """Powers of ten in [low, high] > 0."""
    first, last = math.ceil(math.log10(low) - 1e-9), math.floor(math.log10(high) + 1e-9)
    return [float(f"1e{number}") for number in range(first, last + 1)]


def steps(low: float, high: float) -> list[float]:
    """1, 2 and 5 times powers of ten in [low, high] > 0; powers alone over many decades."""
    parts = (1.0,) if high > 1e4 * low else (1.0, 2.0, 5.0)
    powers = range(math.floor(math.log10(low)) - 1, math.ceil(math.log10(high)) + 1)
    found = [float(f"{part:g}e{power}") for power in powers for part in parts]
    return [value for value in found if low * (1.0 - 1e-9) <= value <= high * (1.0 + 1e-9)]

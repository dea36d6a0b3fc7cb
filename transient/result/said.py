"""Numbers as sentences print them: a value with the digits that its error allows, in a unit that suits its size."""

from __future__ import annotations

import math

from transient.result.scale import quantity, scale

# More digits than this help nobody at the bench, however small the error is.
MOST_DIGITS = 5
_RPM = 60.0 / (2.0 * math.pi)


def stated(value: float, error: float | None, unit: str) -> str:
    """``value ± error`` (SI) with a common unit; the error is rounded up, so that the printed bound holds too."""
    if error is None or not math.isfinite(error):
        return plain(value, unit)
    chosen = scale(value if value else error, unit)
    shown, bound = value * chosen.factor, abs(error) * chosen.factor
    decimals = _decimals(shown, bound)
    step = 10.0**-decimals
    # What rounding the value may add belongs to the bound as well.
    bound += abs(shown - round(shown, decimals))
    bound = math.ceil(bound / step * (1.0 - 1e-12)) * step
    places = max(decimals, 0)
    return f"{round(shown, decimals):.{places}f} ± {bound:.{places}f} {chosen.unit}".rstrip()


def _decimals(value: float, bound: float) -> int:
    """Places after the point: two digits of the bound, but no more than MOST_DIGITS of the value."""
    by_bound = 1 - math.floor(math.log10(bound)) if bound > 0 else 99
    by_value = MOST_DIGITS - 1 - math.floor(math.log10(abs(value))) if value else by_bound
    return min(by_bound, by_value, 9) if min(by_bound, by_value) < 99 else 0


def plain(value: float, unit: str) -> str:
    """``value`` (SI) to four digits with its unit; an angular speed in turns per minute, as drives are set."""
    if unit == "rad/s":
        return f"{value * _RPM:.4g} rpm"
    return quantity(value, unit)


def percent(fraction: float) -> str:
    """A fraction as per cent to three digits."""
    return f"{100.0 * fraction:.3g} %"


def listed(items: list[str]) -> str:
    """Items in a sentence: ``a``, ``a and b``, ``a, b and c``."""
    return items[0] if len(items) == 1 else f"{', '.join(items[:-1])} and {items[-1]}"

"""SI numbers with the prefix that suits their size, for people to read."""

from __future__ import annotations

import math
from dataclasses import dataclass

# Exponents of ten per prefix; what is only ever counted upwards in whole units (hours, kilometres) is left out.
_PREFIX = {-12: "p", -9: "n", -6: "µ", -3: "m", 0: "", 3: "k", 6: "M", 9: "G"}
# Smaller numbers are, in every unit that occurs here, the round-off of a zero.
ROUND_OFF = 1e-15
# Units whose first symbol takes a prefix: (symbol, rest, home exponent, largest exponent in use).  The home prefix is
# kept down to a tenth, as people say 0.8 mm and 0.3 m/s.
_PREFIXED = {
    "m": ("m", "", -3, 0),
    "m/s": ("m", "/s", 0, 0),
    "Pa": ("Pa", "", 0, 9),
    "Pa/m": ("Pa", "/m", 0, 9),
    "N": ("N", "", 0, 9),
    "N m": ("N·m", "", 0, 9),
    "N*m": ("N·m", "", 0, 9),
    "W": ("W", "", 0, 9),
    "J": ("J", "", 0, 9),
    "s": ("s", "", None, 0),
}
# Volumes: a prefix counts three times, so their steps have names of their own.
_VOLUME = {-18: "µm³", -9: "mm³", -6: "cm³", -3: "L", 0: "m³"}
_PRETTY = {"1": "", "m^3": "m³", "m^2": "m²", "m^2/s": "m²/s", "kg/m^3": "kg/m³"}


@dataclass(frozen=True)
class Scale:
    """``value in SI * factor`` is the number to print before ``unit``."""

    factor: float
    unit: str


def scale(largest: float, unit: str) -> Scale:
    """The scale that brings ``largest`` (SI, in ``unit``) between 1 and 1000, where a prefix can do that."""
    size = abs(largest)
    # The margin keeps 1000 ms, computed a rounding error short, from being told from 1 s.
    exponent = math.floor(math.log10(size) + 1e-12) if size >= ROUND_OFF and math.isfinite(size) else 0
    if unit in _PREFIXED:
        symbol, rest, home, most = _PREFIXED[unit]
        step = min(max(3 * (exponent // 3), min(_PREFIX)), most)
        if home is not None and home - 1 <= exponent < home:
            step = home
        if size < ROUND_OFF:
            step = home or 0
        return Scale(10.0**-step, f"{_PREFIX[step]}{symbol}{rest}")
    if unit in ("m^3", "m^3/s"):
        step = max((s for s in _VOLUME if s <= exponent), default=min(_VOLUME))
        return Scale(10.0**-step, _VOLUME[step] + unit.removeprefix("m^3"))
    return Scale(1.0, _PRETTY.get(unit, unit))


def quantity(value: float, unit: str, digits: int = 4) -> str:
    """``value`` (SI) with prefix and unit, such as ``3.2 mPa``."""
    value = 0.0 if abs(value) < ROUND_OFF else value
    # Rounded first, so that 999.96 Pa becomes 1 kPa and not 1000 Pa.
    value = float(f"{value:.{digits - 1}e}")
    chosen = scale(value, unit)
    number = value * chosen.factor
    whole = 10.0 ** (digits - 1) <= abs(number) < 1e6
    text = f"{number:.0f}" if whole else f"{number:.{digits}g}"
    return f"{text} {chosen.unit}".rstrip()

"""SI numbers with the prefix that suits their size, for people to read."""

from __future__ import annotations

import math
from dataclasses import dataclass

# Exponents of ten per prefix; what is only ever counted upwards in whole units (hours, kilometres) is left out.
_PREFIX = {-12: "p", -9: "n", -6: "µ", -3: "m", 0: "", 3: "k", 6: "M", 9: "G"}
# Units whose first symbol takes a prefix: (symbol, rest, largest exponent in use).
_PREFIXED = {
    "s": ("s", "", 0),
    "m": ("m", "", 0),
    "m/s": ("m", "/s", 0),
    "Pa": ("Pa", "", 9),
    "Pa/m": ("Pa", "/m", 9),
    "N": ("N", "", 9),
    "N m": ("N·m", "", 9),
    "W": ("W", "", 9),
    "J": ("J", "", 9),
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
    """The scale that brings ``largest`` (SI, in ``unit``) between 0.1 and 100, where a prefix can do that."""
    size = abs(largest)
    exponent = math.floor(math.log10(size)) + 1 if size > 0 and math.isfinite(size) else 0
    if unit in _PREFIXED:
        symbol, rest, most = _PREFIXED[unit]
        step = min(max(3 * (exponent // 3), min(_PREFIX)), most)
        return Scale(10.0**-step, f"{_PREFIX[step]}{symbol}{rest}")
    if unit in ("m^3", "m^3/s"):
        step = max((s for s in _VOLUME if s <= exponent), default=min(_VOLUME))
        return Scale(10.0**-step, _VOLUME[step] + unit.removeprefix("m^3"))
    return Scale(1.0, _PRETTY.get(unit, unit))


def quantity(value: float, unit: str, digits: int = 4) -> str:
    """``value`` (SI) with prefix and unit, such as ``3.2 mPa``."""
    chosen = scale(value, unit)
    return f"{value * chosen.factor:.{digits}g} {chosen.unit}".rstrip()

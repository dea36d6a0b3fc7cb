"""SI values in, words with a sensible unit out."""

from __future__ import annotations

import math

from transient.units.dimensions import DIMENSIONS
from transient.units.read import _OFFSET


def si_unit(dimension: str) -> str:
    """The unit of the SI value, "1" for a pure number."""
    return DIMENSIONS[dimension].si


def show(value: float | None, dimension: str, digits: int = 4) -> str:
    """An SI value in the unit of its size, with four significant digits: 0.00043 s is "0.43 ms"."""
    one = DIMENSIONS[dimension]
    if value is None or math.isnan(value):
        return "none"
    if math.isinf(value):
        return "infinite" if value > 0 else "minus infinite"
    if dimension == "temperature":
        return f"{value - float(_OFFSET['degC']):.{digits}g} degC"
    rungs = [(unit, float(one.plain[unit])) for unit in one.ladder]
    if value == 0.0:
        return f"0 {one.si if one.si in one.ladder else one.ladder[0]}"
    rounded = float(f"{value:.{digits}g}")
    # From a tenth of a unit on, as people write it: 0.43 ms, 0.3 m/s; with slack for factors inexact in binary.
    unit, size = next(((u, size) for u, size in reversed(rungs) if abs(rounded) >= 0.1 * size * (1 - 1e-12)), rungs[0])
    return f"{value / size:.{digits}g} {unit}"

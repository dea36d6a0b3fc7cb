"""Unit texts that are not in the plain tables, read by pint with exact fractions.

Own definitions, not pint's large default file: the units that the trade writes and no others, with the plane angle as
a dimension of its own, so that rpm and Hz stay apart, and ``mil`` as a length.
"""

from __future__ import annotations

import functools
import re
from fractions import Fraction
from typing import Any

from transient.units.dimensions import Exponents

# Factors are exact by definition (NIST SP 811, 2008, appendix B) but for pi.
_DEFINITIONS = """
nano- = 1e-9 = n-
micro- = 1e-6 = u-
milli- = 1e-3 = m-
centi- = 1e-2 = c-
deci- = 1e-1 = d-
hecto- = 1e2 = h-
kilo- = 1e3 = k-
mega- = 1e6 = M-
giga- = 1e9 = G-
meter = [length] = m = metre
kilogram = [mass] = kg
second = [time] = s = sec
kelvin = [temperature] = K
radian = [angle] = rad
gram = 1e-3 * kilogram = g
tonne = 1000 * kilogram = t
minute = 60 * second = min
hour = 3600 * second = h = hr
day = 86400 * second = d
degC = kelvin
degF = 5 / 9 * kelvin
hertz = 1 / second = Hz
turn = 2 * 3.14159265358979323846264338327950288 * radian = rev = revolution
degree = turn / 360 = deg
arcminute = degree / 60 = arcmin
rpm = turn / minute = RPM
newton = kilogram * meter / second ** 2 = N
dyne = 1e-5 * newton = dyn
pascal = newton / meter ** 2 = Pa
bar = 1e5 * pascal
atmosphere = 101325 * pascal = atm
torr = 101325 / 760 * pascal
joule = newton * meter = J
watt = joule / second = W
poise = 0.1 * pascal * second = P
stokes = 1e-4 * meter ** 2 / second = St
litre = 1e-3 * meter ** 3 = L = l = liter
inch = 0.0254 * meter = in
mil = 0.001 * inch = thou
foot = 12 * inch = ft
yard = 36 * inch = yd
mile = 63360 * inch = mi
mph = mile / hour
pound = 0.45359237 * kilogram = lb = lbm
ounce = pound / 16 = oz
kilogram_force = 9.80665 * newton = kgf = kp
pound_force = 9.80665 * 0.45359237 * newton = lbf
ounce_force = pound_force / 16 = ozf
slug = pound_force * second ** 2 / foot
psi = pound_force / inch ** 2
ksi = 1000 * psi
reyn = psi * second
gallon = 231 * inch ** 3 = gal
gpm = gallon / minute
"""

# Names, products, quotients, brackets and one-digit powers of names: nothing in a unit text is ever computed.
_UNIT_TEXT = re.compile(r"(?:[A-Za-z_]+(?:\^-?\d(?!\d))?|1(?=/)|\*|/|\(|\)(?!\^))+")
LONGEST_UNIT = 60


class UnknownUnit(ValueError):
    """A unit text that is not understood."""


@functools.cache
def _registry() -> Any:
    """The unit registry, built on first use only: importing pint takes longer than a whole solve."""
    import pint

    registry = pint.UnitRegistry(None, non_int_type=Fraction)
    registry.load_definitions(_DEFINITIONS.strip().splitlines())
    return registry


@functools.lru_cache(maxsize=1024)
def parse_unit(text: str) -> tuple[Fraction, Exponents]:
    """(factor to SI, exponents) of a normalised unit text; raises ``UnknownUnit``."""
    if len(text) > LONGEST_UNIT or not _UNIT_TEXT.fullmatch(text):
        raise UnknownUnit(text)
    try:
        registry = _registry()
        base = registry.Quantity(Fraction(1), registry.parse_units(text)).to_root_units()
    except Exception as error:  # pint raises many kinds, from its tokenizer's to its own
        raise UnknownUnit(text) from error
    powers = {name: power for name, power in base.dimensionality.items() if power}
    names = ("[length]", "[mass]", "[time]", "[temperature]", "[angle]")
    if any(power.denominator != 1 for power in map(Fraction, powers.values())):
        raise UnknownUnit(text)
    return Fraction(base.magnitude), tuple(int(powers.get(name, 0)) for name in names)  # type: ignore[return-value]

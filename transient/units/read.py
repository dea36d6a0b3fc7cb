"""A typed quantity in, its SI value out, or a refusal in the user's words."""

from __future__ import annotations

import functools
import math
import re
from fractions import Fraction
from typing import Any

import numpy as np

from transient.units.dimensions import DIMENSIONS, Dimension, Exponents, named
from transient.units.registry import UnknownUnit, parse_unit

_NUMBER = re.compile(r"[+-]?(?:\d+\.?\d*|\.\d+)(?:[eE][+-]?\d{1,3}(?!\d))?")
_COMMA = re.compile(r"[+-]?\d+,\d+")
_NOT_FINITE = re.compile(r"[+-]?(?:nan|inf|infinity)\b", re.IGNORECASE)
_LONGEST = 120
_LARGEST = 1.7976931348623157e308
# ITS-90 zero of the Celsius scale, and 0 degF, in kelvin: exact by definition.
_OFFSET = {"K": Fraction(0), "degC": Fraction("273.15"), "degF": Fraction("459.67") * 5 / 9}
_SPELLINGS = str.maketrans({"µ": "u", "μ": "u", "·": "*", "⋅": "*", "×": "*", "²": "^2", "³": "^3", "−": "-", "º": "°"})


class QuantityError(ValueError):
    """A quantity that is refused: what was ``given``, its ``fault``, what is ``need``ed, and an ``example``."""

    def __init__(self, given: str, fault: str, need: str, example: str):
        super().__init__(f"{given} {fault}; {need} is needed, such as {example}")
        self.given, self.fault, self.need, self.example = given, fault, need, example


def typed(value: Any) -> str:
    """A value as its user would recognise it, short enough for one line."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, dict):
        return "a table"
    if isinstance(value, list | tuple):
        return "a list" if value else "an empty list"
    if isinstance(value, int | float):
        return repr(value) if isinstance(value, float) or abs(value) < 10**30 else "a number without end"
    text = " ".join(str(value).split())
    return f'"{text}"' if len(text) <= 60 else f'"{text[:57]}..."'


def normal_unit(text: str) -> str:
    """One spelling for each unit: "N m", "N·m" and "N*m" are the same, as are "°C" and "degC"."""
    text = text.strip().translate(_SPELLINGS).replace("**", "^")
    text = text.replace("°C", "degC").replace("°F", "degF").replace("°", "deg")
    text = re.sub(r"\s*([*/()^])\s*", r"\1", text)
    return re.sub(r"\s+", "*", text)


@functools.cache
def _plain_units() -> dict[str, str]:
    """The first dimension that has each plain unit."""
    out: dict[str, str] = {}
    for dimension in DIMENSIONS.values():
        for unit in dimension.plain:
            out.setdefault(unit, dimension.name)
    return out


def _unit_in(unit: str, dimension: Dimension) -> Fraction | None:
    """Factor to SI of a unit of this dimension; None if the unit is of another; raises ``UnknownUnit``."""
    if unit in dimension.plain:
        return dimension.plain[unit]
    if unit in _plain_units() and not dimension.loose and dimension.name != "fraction":
        other = DIMENSIONS[_plain_units()[unit]]
        if other.exponents != dimension.exponents:
            return None
    factor, exponents = parse_unit(unit)
    same = _match(exponents, dimension)
    return factor if same else None


def _match(exponents: Exponents, dimension: Dimension) -> bool:
    if dimension.name == "fraction":
        return False
    if dimension.loose:
        return exponents[:4] == dimension.exponents[:4]
    return exponents == dimension.exponents


def _kind_of(unit: str) -> str:
    """What a value in this unit is, in words."""
    if unit in _plain_units():
        return f"is {DIMENSIONS[_plain_units()[unit]].words}"
    dimension = named(parse_unit(unit)[1])
    return f"is {dimension.words}" if dimension else f"has the unit {unit}"


def _need(dimension: Dimension) -> str:
    return dimension.words + (" in rpm or rad/s" if dimension.name == "angular_speed" else "")


def _example(dimension: Dimension, number: str | None, unit: str = "") -> str:
    """The user's own number with a right unit, or a stock example where there is no usable number."""
    if dimension.name == "angular_speed" and unit == "Hz" and number:
        return f'"{60 * float(number):.4g} rpm"'
    if number and float(number) > 0 and 1e-4 <= float(number) < 1e6 and dimension.name != "fraction":
        return f'"{number.lstrip("+")} {dimension.example_unit}"'
    return f'"{dimension.example}"'


def _split(value: Any, dimension: Dimension) -> tuple[str, str]:
    """(number, normalised unit) of a typed quantity; raises ``QuantityError``."""
    given, need = typed(value), _need(dimension)

    def refuse(fault: str, number: str | None = None) -> QuantityError:
        return QuantityError(given, fault, need, _example(dimension, number))

    if isinstance(value, bool) or not isinstance(value, str | int | float):
        raise refuse("is no quantity")
    if isinstance(value, int | float):
        if not abs(value) <= _LARGEST:
            raise refuse("is not a finite number")
        text = repr(value)
        if dimension.name == "fraction":
            return text, ""
        raise refuse("has no unit", text)
    text = value.strip().translate(_SPELLINGS)
    if not text:
        raise refuse("is empty")
    if _NOT_FINITE.match(text):
        raise refuse("is not a finite number")
    if _COMMA.match(text):
        raise refuse("has a decimal comma", _COMMA.match(text)[0].replace(",", "."))  # type: ignore[index]
    match = _NUMBER.match(text)
    if match is None or len(text) > _LONGEST:
        raise refuse("does not begin with a number" if match is None else "is too long")
    number, unit = match[0], normal_unit(text[match.end() :])
    if not math.isfinite(float(number)):
        raise refuse("is not a finite number")
    if not unit and dimension.name != "fraction":
        raise refuse("has no unit", number)
    return number, unit


@functools.lru_cache(maxsize=4096)
def _quantity(value: str | int | float, dimension_name: str) -> float:
    dimension = DIMENSIONS[dimension_name]
    number, unit = _split(value, dimension)
    given, need, example = typed(value), _need(dimension), _example(dimension, number, unit)
    try:
        factor = Fraction(1) if not unit else _unit_in(unit, dimension)
        fault = "" if factor is not None else _kind_of(unit)
    except UnknownUnit:
        factor, fault = None, f'has an unknown unit, "{unit}"'
    if factor is None:
        raise QuantityError(given, fault, need, example)
    offset = _OFFSET.get(unit, Fraction(0)) if dimension.name == "temperature" else Fraction(0)
    out = float(Fraction(number) * factor + offset)
    if dimension.name == "temperature" and out < 0.0:
        raise QuantityError(given, "is below absolute zero", need, f'"{dimension.example}"')
    if abs(out) > dimension.largest or 0.0 < abs(out) < dimension.smallest:
        si = "" if dimension.si == "1" else f" {dimension.si}"
        reach = f"{dimension.smallest:g}{si} to {dimension.largest:g}{si}"
        raise QuantityError(given, f"is outside the range taken, {reach}", need, f'"{dimension.example}"')
    return out


def quantity(value: Any, dimension: str) -> float:
    """SI value of a typed quantity such as "0.80 mm", correctly rounded; raises ``QuantityError``.

    ``dimension`` is a name in ``DIMENSIONS``.  A fraction may be "1 %" or a bare number; everything else needs a unit.
    Temperatures are absolute (degC and degF are offset); temperature differences are not.
    """
    if isinstance(value, np.number):
        value = float(value)
    if isinstance(value, bool) or not isinstance(value, str | int | float):
        _split(value, DIMENSIONS[dimension])
    return _quantity(value, dimension)


def convert(values: np.ndarray, unit: Any, dimension: str) -> np.ndarray:
    """SI values of plain numbers (n,) that are all in ``unit``, correctly rounded for decimal units.

    Raises ``QuantityError`` about the unit.
    """
    one = DIMENSIONS[dimension]
    given, example = typed(unit), f'"{one.example_unit}"'
    need = f"the unit of {one.words}"
    text = normal_unit(unit) if isinstance(unit, str) else ""
    if not text:
        raise QuantityError(given, "is no unit", need, example)
    try:
        factor = _unit_in(text, one)
        fault = "" if factor is not None else _kind_of(text).replace("is ", "is the unit of ", 1)
    except UnknownUnit:
        factor, fault = None, "is not a known unit"
    if factor is None:
        raise QuantityError(given, fault, need, example)
    values = np.asarray(values, dtype=float)
    small = max(factor.numerator, factor.denominator) < 2**53
    return values * factor.numerator / factor.denominator if small else values * float(factor)

"""What the sections of a sheet are written from: a result, its case read again, and what the reader asked for."""

from __future__ import annotations

import math
import re
from dataclasses import dataclass
from functools import cached_property
from typing import Any

from transient.case.model import Case
from transient.result.result import Result
from transient.result.said import plain, stated
from transient.sheet.stated import case_of

_RPM = 30.0 / math.pi
_MICRO = re.compile(r"(?<= )u(?=[a-zA-Z])")
_POWER = re.compile(r"(?<=\d)e([+-]\d+)")


@dataclass(frozen=True, eq=False)
class Facts:
    """``name`` of the result's file; ``factor`` on loads or None; ``note`` a user's own words or ""; ``sweep`` of the
    same case over its tolerances, or None, with the ``sweep_name`` of its file."""

    result: Result
    name: str
    factor: float | None = None
    note: str = ""
    sweep: Result | None = None
    sweep_name: str = ""

    @property
    def summary(self) -> dict[str, Any]:
        """The result's summary."""
        return self.result.summary

    @cached_property
    def case(self) -> Case | None:
        """The case as stated, None where this version does not read it."""
        return case_of(self.result)

    @property
    def stem(self) -> str:
        """The file's name without its ending."""
        return self.name.rsplit(".", 1)[0] or "case"

    @property
    def speed_unit(self) -> str:
        """Unit of the wall speeds."""
        speeds = self.result.variables.get("wall_speed")
        return speeds.units if speeds is not None else "m/s"

    @property
    def rotating(self) -> bool:
        """Whether the walls turn."""
        return self.speed_unit == "rad/s"

    @property
    def walls(self) -> dict[str, Any]:
        """Headline numbers by wall."""
        return self.summary.get("walls") or {}

    @property
    def load_word(self) -> str:
        """What a wall's stress adds up to."""
        return "torque" if self.rotating else "force"

    @property
    def load_unit(self) -> str:
        """Its unit."""
        return "N*m" if self.rotating else "N"

    @property
    def periodic(self) -> bool:
        """Whether the run ends in a periodic state."""
        return (self.summary.get("settling") or {}).get("regime") == "periodic"


def said(value: float | None, error: float | None, unit: str) -> str:
    """``value ± error`` in words, a dash for a number that does not exist; angular speeds as drives are set."""
    if value is None:
        return "–"
    if unit == "rad/s":
        value, error, unit = value * _RPM, None if error is None else error * _RPM, "rpm"
    return printed(stated(value, error, unit))


def brief(value: float | None, unit: str) -> str:
    """``value`` to four digits, a dash for a number that does not exist."""
    return "–" if value is None else printed(plain(value, unit))


def printed(text: str) -> str:
    """As print sets it: a minus sign before digits, raised powers of units."""
    text = _MICRO.sub("µ", text.replace("^2", "²").replace("^3", "³").replace("*", "·"))
    text = _POWER.sub(lambda found: f"·10{_raised(int(found[1]))}", text)
    return text.replace("-", "−") if text[:1] == "-" else text


def share(part: float) -> str:
    """A fraction as per cent, small ones as a power of ten."""
    if part != 0.0 and abs(part) < 1e-4:
        mantissa, exponent = f"{100.0 * part:.1e}".split("e")
        return f"{mantissa}·10{_raised(int(exponent))} %"
    return printed(f"{100.0 * part:.3g} %")


def number(value: float | None) -> str:
    """A pure number to three digits, very small and large ones as powers of ten."""
    if value is None:
        return "–"
    if value != 0.0 and not 1e-3 <= abs(value) < 1e5:
        mantissa, exponent = f"{value:.2e}".split("e")
        return printed(f"{mantissa}·10{_raised(int(exponent))}")
    return printed(f"{value:.3g}" if abs(value) < 1e3 else f"{value:.0f}")


def _raised(exponent: int) -> str:
    return str(exponent).translate(str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹"))

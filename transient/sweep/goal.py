"""What a machine has to meet: a headline number of one case and its limit, read from a text."""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Mapping
from dataclasses import dataclass
from typing import Any

from transient.case.model import Case, CaseError
from transient.case.source import nearest
from transient.units import QuantityError, quantity, si_unit, typed

EXAMPLE = '"upper.peak_stress <= 2 Pa"'
_GOAL = re.compile(r"\s*([A-Za-z_]+\.[A-Za-z_]+)\s*(<=|>=|=<|=>|≤|≥|<|>)\s*(\S.*?)\s*")

Summary = Mapping[str, Any]
# (magnitude, bound of its error) of a quantity in a summary; infinity where the number is unbounded or not reached.
Reading = Callable[[Summary], tuple[float, float]]


@dataclass(frozen=True)
class Quantity:
    """One quantity that can be asked for: its dimension, in a straight and in a rotating gap."""

    dimension: str
    turning: str
    read: Callable[[Summary, str], tuple[float, float]]


@dataclass(frozen=True)
class Goal:
    """``name`` at most (``below``) or at least ``limit``, in SI of ``unit``."""

    name: str
    below: bool
    limit: float
    dimension: str
    read: Reading

    @property
    def unit(self) -> str:
        """SI unit of the quantity."""
        return si_unit(self.dimension)

    def met(self, magnitude: float) -> bool:
        """Whether a magnitude meets the limit."""
        return magnitude <= self.limit if self.below else magnitude >= self.limit


def _settling(summary: Summary, _: str) -> tuple[float, float]:
    part = summary["settling"]
    return (math.inf, 0.0) if part["time"] is None else (part["time"], part["error"] or 0.0)


def _peak_stress(summary: Summary, wall: str) -> tuple[float, float]:
    part = summary["walls"][wall]
    if part["unbounded"]:
        return math.inf, 0.0
    return abs(part["peak_stress"]), part["peak_stress_error"]


def _load(name: str) -> Callable[[Summary, str], tuple[float, float]]:
    """The force or torque, with the stress's error times the area (and lever) between them."""

    def read(summary: Summary, wall: str) -> tuple[float, float]:
        stress, error = _peak_stress(summary, wall)
        load = summary["walls"][wall][name]
        if math.isinf(stress) or load is None:
            return math.inf, 0.0
        return abs(load), error * abs(load) / stress if stress else 0.0

    return read


def _final_stress(summary: Summary, wall: str) -> tuple[float, float]:
    part = summary["walls"][wall]
    return abs(part["final_stress"]), part["final_stress_error"]


def _final_speed(summary: Summary, wall: str) -> tuple[float, float]:
    body = (summary.get("bodies") or {}).get(wall) or {}
    return abs(summary["walls"][wall]["final_speed"]), body.get("final_speed_error") or 0.0


def _mean_velocity(summary: Summary, _: str) -> tuple[float, float]:
    part = summary["flow"]
    return abs(part["final_mean_velocity"]), part["final_mean_velocity_error"]


WHOLE = {
    "settling.time": Quantity("time", "time", _settling),
    "flow.final_mean_velocity": Quantity("speed", "speed", _mean_velocity),
}
WALLS = {
    "peak_stress": Quantity("pressure", "pressure", _peak_stress),
    "peak_force": Quantity("force", "", _load("peak_force")),
    "peak_torque": Quantity("", "torque", _load("peak_torque")),
    "final_stress": Quantity("pressure", "pressure", _final_stress),
    "final_speed": Quantity("speed", "angular_speed", _final_speed),
}


def read_goal(text: str, case: Case) -> Goal:
    """The goal in a text such as "upper.peak_stress <= 2 Pa"; raises ``CaseError``."""
    match = _GOAL.fullmatch(text)
    if match is None:
        need = f"a quantity, <= or >=, and a value are needed, such as {EXAMPLE}"
        raise CaseError(f"--meet {typed(text)} is no condition; {need}")
    name, sign, value = match.groups()
    found, wall = _quantity(name, case)
    try:
        limit = quantity(value, found)
    except QuantityError as error:
        raise CaseError(f"--meet {name}: {error}") from None
    if limit < 0.0:
        raise CaseError(f"--meet {name}: {typed(value)} is below zero; magnitudes are compared")
    read = (WHOLE.get(name) or WALLS[name.partition(".")[2]]).read
    return Goal(name, sign in ("<=", "=<", "≤", "<"), limit, found, lambda summary: read(summary, wall))


def _quantity(name: str, case: Case) -> tuple[str, str]:
    """(dimension, wall) of a quantity's name."""
    rotating = case.gap.shape.rotating
    walls = [wall.name for wall in case.walls if wall is not None]
    known = [key for key, one in WALLS.items() if (one.turning if rotating else one.dimension)]
    names = [*WHOLE, *(f"{wall}.{key}" for wall in walls for key in known)]
    if name not in names:
        raise CaseError(f"--meet {typed(name)} is no quantity of this case; {nearest(name, names)}")
    one = WHOLE.get(name) or WALLS[name.partition(".")[2]]
    wall = name.partition(".")[0]
    if name.endswith(("peak_force", "peak_torque")) and case.problem().walls[_end(case, wall)].area is None:
        raise CaseError(f"--meet {name}: needs the wall's area; the gap's sizes are needed, such as gap.length")
    return (one.turning if rotating else one.dimension), wall


def _end(case: Case, wall: str) -> int:
    return [one.name if one is not None else "" for one in case.walls].index(wall)

"""What a row of a sweep holds: the columns, their units, and the codes of status and verdict.

A chunk's answer is ``Columns``: a dict of arrays (n,), one entry a row.  ``status`` and ``verdict`` are int8 codes (the
places in ``STATUS`` and ``VERDICTS``), ``message`` an object array of texts, every other column float64 in SI with NaN
where there is no value.
"""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from typing import Any

import numpy as np

from transient.gap.problem import Problem

Columns = dict[str, np.ndarray]

STATUS = ("solved", "refused", "failed", "open")
# "open": a runner that solves many at once does not vouch for the row; the next runner solves it.
SOLVED, REFUSED, FAILED, OPEN = range(4)
VERDICTS = ("", "good", "caution", "outside", "failed")
CODES = ("status", "verdict")


@dataclass(frozen=True)
class Column:
    """One number of every row: its ``unit``, title, and the ``path`` to it in a summary."""

    name: str
    unit: str
    long_name: str
    path: tuple[str, ...]


def layout(problem: Problem) -> tuple[Column, ...]:
    """The number columns of a sweep over cases of this form: walls, motion and known areas decide which exist."""
    out = [
        Column("settling_time", "s", "settling time of the velocity profile", ("settling", "time")),
        Column("settling_error", "s", "bound of the settling time's error", ("settling", "error")),
        Column("settling_time_flow", "s", "settling time of the mean velocity", ("settling", "flow")),
    ]
    for wall in problem.walls:
        if wall.kind != "axis":
            out += _wall(wall.name, problem.rotating, wall.area is not None)
    out += [
        _flow("peak_mean_velocity", "m/s", "largest mean velocity (signed)"),
        _flow("final_mean_velocity", "m/s", "mean velocity in the end"),
        _flow("final_mean_velocity_error", "m/s", "bound of the final mean velocity's error"),
    ]
    if problem.section is not None:
        out += [
            _flow("peak_flow_rate", "m^3/s", "largest flow rate of all gaps (signed)"),
            _flow("final_flow_rate", "m^3/s", "flow rate of all gaps in the end"),
        ]
    return (
        *out,
        _pressure("peak_drop_per_length", "largest pressure drop per length (signed)"),
        _pressure("final_drop_per_length", "pressure drop per length in the end"),
    )


def _wall(wall: str, rotating: bool, loaded: bool) -> list[Column]:
    columns = [
        ("peak_stress", "Pa", "largest stress of the fluid on the {} wall (signed)"),
        ("peak_stress_error", "Pa", "bound of the largest stress's error, {} wall"),
        ("peak_time", "s", "time of the largest stress, {} wall"),
        ("final_stress", "Pa", "stress on the {} wall in the end"),
        ("final_stress_error", "Pa", "bound of the final stress's error, {} wall"),
        ("final_speed", "rad/s" if rotating else "m/s", "speed of the {} wall in the end"),
        ("unbounded_coefficient", "Pa*s^0.5", "K of |stress| ~ K / sqrt(t) where the {} wall's stress is infinite"),
    ]
    if loaded and rotating:
        columns.append(("peak_torque", "N*m", "largest torque on the {} wall (signed)"))
    elif loaded:
        columns.append(("peak_force", "N", "largest force on the {} wall (signed)"))
    out = [Column(f"{name}_{wall}", unit, text.format(wall), ("walls", wall, name)) for name, unit, text in columns]
    settled = Column(
        f"settling_time_stress_{wall}", "s", f"settling time of the stress on the {wall} wall",
        ("settling", "stress", wall),
    )  # fmt: skip
    return [*out, settled]


def _flow(name: str, unit: str, long_name: str) -> Column:
    return Column(name, unit, long_name, ("flow", name))


def _pressure(name: str, long_name: str) -> Column:
    return Column(name, "Pa/m", long_name, ("pressure", name))


def together(layouts: Iterable[Iterable[Column]]) -> tuple[Column, ...]:
    """The columns of sweeps over several forms of case: each once, in the order of first appearance."""
    return tuple({column.name: column for one in layouts for column in one}.values())


def blank(columns: Iterable[Column], rows: int) -> Columns:
    """Columns of ``rows`` open rows without a value."""
    out: Columns = {
        "status": np.full(rows, OPEN, np.int8),
        "verdict": np.zeros(rows, np.int8),
        "message": np.full(rows, "", object),
    }
    return out | {column.name: np.full(rows, np.nan) for column in columns}


def put_summary(out: Columns, row: int, columns: Iterable[Column], summary: Mapping[str, Any]) -> None:
    """Fills one row of ``out`` from a solved case's summary."""
    out["status"][row] = SOLVED
    out["verdict"][row] = VERDICTS.index(summary["verdict"])
    out["message"][row] = _worst_note(summary["checks"])
    for column in columns:
        value: Any = summary
        for part in column.path:
            value = value.get(part) if isinstance(value, Mapping) else None
        out[column.name][row] = np.nan if value is None else value


def _worst_note(checks: Iterable[Mapping[str, Any]]) -> str:
    """What the first of the gravest checks says; nothing where all passed."""
    found = list(checks)
    for status in ("fail", "caution"):
        for check in found:
            if check["status"] == status:
                return f"{check['name']}: {check['note']}"
    return ""

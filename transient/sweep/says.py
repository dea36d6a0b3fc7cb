"""What the map says: for each headline number its spread, its worst case with the inputs, and which inputs matter."""

from __future__ import annotations

from collections import Counter
from collections.abc import Callable, Mapping
from typing import Any

import numpy as np

from transient.sweep.cases import Plan
from transient.sweep.columns import SOLVED, STATUS, VERDICTS
from transient.sweep.influence import Inputs, influence
from transient.sweep.keys import Varied

# Headline numbers in the order in which they are said; "_*" stands for each wall.
NAMES = (
    "settling_time", "peak_stress_*", "unbounded_coefficient_*", "peak_force_*", "peak_torque_*", "final_stress_*",
    "final_mean_velocity",
)  # fmt: skip
ERRORS = {"settling_time": "settling_error"}
PERCENTILES = (1, 5, 25, 50, 75, 95, 99)
MOST_MESSAGES = 3


class Data:
    """A finished sweep's columns: ``status`` and ``verdict`` as codes (n,), others one at a time by ``get(name)``."""

    def __init__(self, plan: Plan, codes: Mapping[str, np.ndarray], get: Callable[[str], np.ndarray]):
        self.plan, self.get = plan, get
        self.status, self.verdict = codes["status"], codes["verdict"]

    def names(self) -> list[str]:
        """The headline numbers that this sweep has."""
        have = [column.name for column in self.plan.frame.columns]
        walls = self.plan.frame.walls
        wanted = [name.replace("*", wall) for name in NAMES for wall in (walls if "*" in name else ("",))]
        return [name for name in wanted if name in have]

    def unit(self, name: str) -> str:
        """Unit of a column."""
        return next(column.unit for column in self.plan.frame.columns if column.name == name)


def summary(data: Data) -> dict[str, Any]:
    """The closing summary, all in SI: plain values that JSON keeps."""
    plan = data.plan
    solved = data.status == SOLVED
    counts = np.bincount(data.status, minlength=len(STATUS))
    verdicts = np.bincount(data.verdict[solved], minlength=len(VERDICTS))
    inputs = Inputs(plan)
    scatter = plan.scatter
    return {
        "title": plan.title,
        "cases": plan.rows,
        "status": {name: int(count) for name, count in zip(STATUS[:3], counts, strict=False)},
        "verdicts": {name: int(count) for name, count in zip(VERDICTS[1:], verdicts[1:], strict=True)},
        "messages": _messages(data, ~solved),
        "cautions": _messages(data, solved & (data.verdict != VERDICTS.index("good"))),
        "varied": {key.name: _varied(key, plan) for key in plan.frame.keys},
        "samples": None if scatter is None else scatter.samples,
        "seed": None if scatter is None else scatter.seed,
        "headlines": {name: one for name in data.names() if (one := _headline(data, name, inputs))},
    }


def _messages(data: Data, among: np.ndarray) -> list[dict[str, Any]]:
    """The most frequent messages of some rows (n,), told apart by what they are about, as the first case has them."""
    rows = np.flatnonzero(among)
    if not len(rows):
        return []
    texts = np.asarray(data.get("message"))[rows].tolist()
    about = [text.partition(": ")[0] for text in texts]
    first = {name: place for place, name in reversed(list(enumerate(about)))}
    common = Counter(about).most_common(MOST_MESSAGES)
    return [{"message": texts[first[n]], "cases": count, "first": int(rows[first[n]])} for n, count in common]


def _varied(key: Varied, plan: Plan) -> dict[str, Any]:
    scatter = plan.scatter
    if scatter is not None and key in scatter.keys:
        kind, parameters = scatter.drawn[scatter.keys.index(key)]
        return {"unit": key.unit, "dimension": key.dimension, kind: list(parameters)}
    values = next(v for one in plan.axes for k, v in zip(one.keys, one.values, strict=True) if k == key)
    if key.kind == "choice":
        return {"choices": len(key.choices), "count": len(values)}
    ends = {"least": float(np.nanmin(values)), "greatest": float(np.nanmax(values))}
    return {"unit": key.unit, "dimension": key.dimension, "count": len(values), **ends}


def _headline(data: Data, name: str, inputs: Inputs) -> dict[str, Any] | None:
    """One headline number over all cases that have it; None where none has."""
    values = np.asarray(data.get(name), dtype=float)
    have = np.isfinite(values)
    if not have.any():
        return None
    some = values[have]
    out: dict[str, Any] = {
        "unit": data.unit(name),
        "cases": int(np.count_nonzero(have)),
        "error": _largest_error(data, name),
        "mean": float(some.mean()),
        "deviation": float(some.std()),
        "least": float(some.min()),
        "median": float(np.median(some)),
        "greatest": float(some.max()),
    }
    if data.plan.scatter is not None:
        out["percentiles"] = _percentiles(some)
        out["combination"] = _combination(data.plan, values, inputs)
    worst = int(np.argmax(np.where(have, np.abs(values), -1.0)))
    out["worst"] = {
        "case": worst, "value": float(values[worst]), "verdict": VERDICTS[data.verdict[worst]],
        "inputs": inputs.of(worst),
    }  # fmt: skip
    return out | influence(inputs, np.abs(values))


def _largest_error(data: Data, name: str) -> float | None:
    """The largest stated error of a column; None where none is stated."""
    error = ERRORS.get(name)
    for quantity in ("peak_stress", "final_stress", "final_mean_velocity"):
        if name.startswith(quantity):
            error = name.replace(quantity, f"{quantity}_error")
    if error is None or error not in {column.name for column in data.plan.frame.columns}:
        return None
    values = np.asarray(data.get(error), dtype=float)
    values = values[np.isfinite(values)]
    return float(values.max()) if len(values) else None


def _percentiles(values: np.ndarray) -> dict[str, float]:
    """Percentiles by their number, linear between the values (Hyndman & Fan 1996, definition 7)."""
    return {str(q): float(v) for q, v in zip(PERCENTILES, np.percentile(values, PERCENTILES), strict=True)}


def _reach(grid: np.ndarray, share: float) -> np.ndarray:
    """What that share of each row's numbers stays below, (rows,), as ``np.percentile``; -1 where a row has none."""
    ordered = np.sort(np.where(np.isfinite(grid), grid, np.inf), axis=1)
    last = np.count_nonzero(np.isfinite(grid), axis=1) - 1
    place = share * np.maximum(last, 0)
    low = place.astype(int)
    high = np.minimum(low + 1, np.maximum(last, 0))
    ordered[last < 0] = 0.0
    rows = np.arange(len(grid))
    found = ordered[rows, low] + (place - low) * (ordered[rows, high] - ordered[rows, low])
    return np.where(last >= 0, found, -1.0)


def _combination(plan: Plan, values: np.ndarray, inputs: Inputs) -> dict[str, Any] | None:
    """Of all combinations of [vary], the one whose scatter reaches farthest (95 of 100 stay below in magnitude)."""
    if plan.combinations == 1:
        return None
    grid = values.reshape(plan.combinations, plan.samples)
    worst = int(np.argmax(_reach(np.abs(grid), 0.95)))
    row = grid[worst][np.isfinite(grid[worst])]
    drawn = {key.name for key in plan.scatter.keys} if plan.scatter is not None else set()
    stated = {key: value for key, value in inputs.of(worst * plan.samples).items() if key not in drawn}
    return {"inputs": stated, "percentiles": _percentiles(row)}

"""Which inputs matter: shares of the variance and standardised slopes, from the rows at hand."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from transient.sweep.cases import Plan
from transient.sweep.keys import Values, Varied

MOST_ROWS = 1_000_000  # more rows than these tell no more; they are taken evenly
MOST_LEVELS = 200  # values of an axis of the grid; more of them, and what is no axis, are put into classes
MOST_CLASSES = 64


@dataclass(frozen=True, eq=False)
class Factor:
    """One input over the rows taken: ``values`` (n,) standardised, None for texts; ``classes`` (n,) from 0.

    ``crossed``: each class meets every value of the other inputs, so that nothing in its mean is chance.
    """

    key: Varied
    values: np.ndarray | None
    classes: np.ndarray
    crossed: bool


class Inputs:
    """The varied inputs of a plan."""

    def __init__(self, plan: Plan):
        self.plan = plan
        step = -(-plan.rows // MOST_ROWS)
        self.rows = slice(None, None, step)
        values = plan.values(0, plan.rows) if step == 1 else _every(plan, step)
        self.factors = [one for key in plan.frame.keys if (one := _factor(plan, key, values)) is not None]

    def sample(self, have: np.ndarray) -> Sample:
        """The inputs in the rows (n,) that have an answer; mostly all have, and then it is made once."""
        return self._whole if have.all() else Sample(self.factors, have)

    @cached_property
    def _whole(self) -> Sample:
        return Sample(self.factors, np.ones(len(self.factors[0].classes), bool))

    def of(self, row: int) -> dict[str, Any]:
        """The inputs of one row, in SI, texts and tables as the case file has them."""
        values = self.plan.values(row, row + 1)
        return {key.name: _plain(key, values[key.name][0]) for key in self.plan.frame.keys}


def _plain(key: Varied, value: Any) -> Any:
    if key.kind == "choice":
        return key.choices[int(value)]
    return int(value) if key.kind == "whole" else float(value)


def _every(plan: Plan, step: int) -> dict[str, np.ndarray]:
    """Values of every ``step``-th row, without those between."""
    parts = []
    for first in range(0, plan.rows, step * 65536):
        behind = min(first + step * 65536, plan.rows)
        parts.append({name: column[::step] for name, column in plan.values(first, behind).items()})
    return {name: np.concatenate([part[name] for part in parts]) for name in parts[0]}


def _factor(plan: Plan, key: Varied, columns: Values) -> Factor | None:
    """The input as a factor; None where it has one value only."""
    values = columns[key.name]
    crossed = any(one.keys == (key,) for one in plan.axes)
    if key.kind == "choice":
        return Factor(key, None, values, crossed) if np.ptp(values) else None
    numbers = values.astype(float)
    if not np.isfinite(numbers).any() or np.nanmax(numbers) == np.nanmin(numbers):
        return None
    spread = np.nanstd(numbers)
    # Rows that are no case have no answer either: any number will do.
    numbers = np.where(np.isfinite(numbers), numbers, np.nanmean(numbers))
    classes = _classes(numbers, MOST_LEVELS if crossed else 0)
    return Factor(key, (numbers - numbers.mean()) / spread, classes, crossed)


def _classes(values: np.ndarray, most: int) -> np.ndarray:
    """Levels of an input with at most ``most`` values, else classes of equal numbers of rows."""
    levels, places = np.unique(values, return_inverse=True)
    if len(levels) <= most:
        return places
    number = int(np.clip(round(len(values) ** 0.5), 2, MOST_CLASSES))
    # By the place among the levels, so that equal values never part.
    order = np.searchsorted(np.sort(places), places)
    return order * number // len(values)


class Sample:
    """The inputs over some rows, made ready for the answers there: ``have`` (n,) which rows."""

    def __init__(self, factors: list[Factor], have: np.ndarray):
        whole = bool(have.all())
        rows = slice(None) if whole else have
        self.factors = factors
        self.rows = int(np.count_nonzero(have))
        self.classes = [one.classes[rows] for one in factors]
        self.counts = [np.bincount(classes) for classes in self.classes]
        self.chance = [not (one.crossed and whole) for one in factors]
        x = np.array([one.values[rows] for one in factors if one.values is not None])
        if len(x):
            x -= x.mean(axis=1, keepdims=True)
            spread = x.std(axis=1, keepdims=True)
            x /= np.where(spread > 0.0, spread, 1.0)
        self.x = x
        self.gram = x @ x.T if len(x) else np.empty((0, 0))

    def shares(self, y: np.ndarray) -> list[float]:
        """Share of the variance of standardised ``y`` (rows,) that each input's levels or classes explain."""
        out = []
        for classes, counts, chance in zip(self.classes, self.counts, self.chance, strict=True):
            used = counts > 0
            explained = float((np.bincount(classes, y)[used] ** 2 / counts[used]).sum()) / self.rows
            groups = int(used.sum())
            if chance and groups < self.rows:
                explained -= (groups - 1) * (1.0 - explained) / (self.rows - groups)
            out.append(float(np.clip(explained, 0.0, 1.0)))
        return out

    def lines(self, y: np.ndarray) -> tuple[list[float], float | None]:
        """(standardised coefficients of the inputs that are numbers, R^2) of ``y`` (rows,), standardised."""
        if not len(self.x) or self.rows <= len(self.x) + 1:
            return [0.0] * len(self.x), None
        # Through the small normal equations: rows may be a million, inputs are few.
        along = self.x @ y
        slopes = np.linalg.lstsq(self.gram, along, rcond=1e-10)[0]
        return slopes.tolist(), float(slopes @ along / (y @ y))


def influence(inputs: Inputs, values: np.ndarray) -> dict[str, Any]:
    """``sensitivities`` of values (n,) ranked by share; ``linear``, the share of the variance that lines explain (R^2).

    ``share`` is the first-order index Var(E[y|x]) / Var(y) (Sobol 1993), from means over the input's levels or classes
    less what chance alone would give them (the epsilon squared of Kelley 1935, from memory); ``slope`` the
    standardised regression coefficient, whose sign says in which direction the number goes.
    """
    taken = values[inputs.rows]
    have = np.isfinite(taken)
    y = taken[have]
    if len(y) < 2 or not inputs.factors or np.ptp(y) <= 1e-12 * np.abs(y).max():
        return {"linear": None, "sensitivities": []}
    y = (y - y.mean()) / y.std()
    sample = inputs.sample(have)
    slopes, linear = sample.lines(y)
    steep = iter(slopes)
    found = [
        {"key": one.key.name, "share": share, "slope": None if one.values is None else next(steep)}
        for one, share in zip(inputs.factors, sample.shares(y), strict=True)
    ]
    return {"linear": linear, "sensitivities": sorted(found, key=lambda one: -one["share"])}

"""The columns of a sweep as its figures need them: varied keys with their scales, numbers, and rows in groups."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import TYPE_CHECKING

import numpy as np

from transient.result.result import Result, ResultError
from transient.result.scale import Scale, scale
from transient.result.view import nearest
from transient.sheet.ticks import steps

if TYPE_CHECKING:
    from matplotlib.axis import Axis

# Units in which people set what SI writes awkwardly.
USUAL = {
    "Pa*s": Scale(1e3, "mPa·s"), "m^2/s": Scale(1e6, "mm²/s"), "rad/s": Scale(30.0 / math.pi, "rpm"),
    "rad": Scale(180.0 / math.pi, "°"), "K": Scale(1.0, "K"),
}  # fmt: skip
# More values than these are no steps of a grid.
MOST_STEPS = 200
# Up to so many values have ticks of their own.
FEW = 9


@dataclass(frozen=True, eq=False)
class Key:
    """A varied key: ``place`` (n,) of each row's value among ``values`` (k,), rising, in SI; of texts, their order.

    ``labels`` (k,) of texts, else empty; ``log``: equal ratios rather than equal steps.
    """

    name: str
    unit: Scale
    values: np.ndarray
    place: np.ndarray
    labels: tuple[str, ...]
    log: bool

    @property
    def shown(self) -> np.ndarray:
        """Values (k,) on the axis."""
        return self.values * self.unit.factor

    @property
    def title(self) -> str:
        """The axis' label."""
        return self.name if self.labels else f"{self.name} [{self.unit.unit or '1'}]"


def stepped(result: Result) -> list[str]:
    """Varied keys with steps: those of [vary], in the order in which they were stated."""
    varied = result.summary.get("varied") or {}
    names = [name for name, part in varied.items() if "count" in part and part["count"] > 1]
    return [name for name in names if name in result.variables]


def drawn(result: Result) -> list[str]:
    """Keys that were drawn at random."""
    return [name for name, part in (result.summary.get("varied") or {}).items() if "count" not in part]


def key_of(result: Result, name: str) -> Key:
    """A varied key with its steps.  Raises ResultError where nothing varies under that name, or without steps."""
    if name not in (result.summary.get("varied") or {}) or name not in result.variables:
        raise ResultError(f"nothing varies under the name {name!r}{nearest(name, result.summary.get('varied') or {})}")
    variable = result.variables[name]
    values, place = np.unique(variable.data, return_inverse=True)
    if len(values) > MOST_STEPS:
        raise ResultError(f"{name} has {len(values)} values; a map needs one with steps, from [vary]")
    if variable.data.dtype.kind not in "fiu":
        labels = tuple(_short(str(value)) for value in values)
        return Key(name, Scale(1.0, ""), np.arange(len(values), dtype=float), place, labels, False)
    return Key(name, unit_of(values, variable.units), values.astype(float), place, (), _geometric(values))


def unit_of(values: np.ndarray, unit: str) -> Scale:
    """The scale of an axis over ``values`` (SI)."""
    if unit in USUAL:
        return USUAL[unit]
    finite = np.abs(values[np.isfinite(values)])
    return scale(float(finite.max(initial=0.0)), unit)


def _geometric(values: np.ndarray) -> bool:
    if len(values) < 3 or values[0] <= 0.0:
        return False
    ratios, steps = np.diff(np.log(values.astype(float))), np.diff(values.astype(float))
    return bool(np.ptp(ratios) / ratios.mean() < np.ptp(steps) / steps.mean() and values[-1] > 1.5 * values[0])


def _short(text: str) -> str:
    return text if len(text) <= 18 else f"{text[:17]}…"


def dress(key: Key, axis: Axis) -> None:
    """Ticks of an axis over a key: at its values where they are few, round ones else; names of texts."""
    from matplotlib.ticker import FixedLocator, FuncFormatter, NullLocator

    few = len(key.values) <= FEW
    if not key.labels and not few and not key.log:
        return
    every = -(-len(key.values) // FEW)
    places = key.shown[::every].tolist()
    if key.log and not few:
        places = steps(float(key.shown[0]), float(key.shown[-1]))
    axis.set_major_locator(FixedLocator(places))
    axis.set_minor_locator(NullLocator())
    if key.labels:
        axis.set_major_formatter(FuncFormatter(lambda value, _: key.labels[round(value)]))
    else:
        axis.set_major_formatter(FuncFormatter(lambda value, _: f"{value:.4g}"))


def number(result: Result, name: str | None) -> tuple[str, np.ndarray]:
    """(name, values (n,)) of a headline number; the first one by default.  Raises ResultError for what is none."""
    known = list(result.summary.get("headlines") or {})
    if name is None:
        if not known:
            raise ResultError("no case of this sweep was solved; there is nothing to show")
        name = known[0]
    variable = result.variables.get(name)
    if variable is None or variable.dims != ("case",) or variable.data.dtype.kind != "f":
        raise ResultError(f"a sweep has no number {name!r}{nearest(name, known)}")
    return name, variable.data


def title(result: Result, name: str) -> str:
    """A number in words."""
    return result.variables[name].long_name.replace(" (signed)", "")


def worst(values: np.ndarray, groups: np.ndarray, count: int) -> np.ndarray:
    """The value of largest magnitude (count,) in each group; NaN where a group has none."""
    out = np.full(count, np.nan)
    have = np.flatnonzero(np.isfinite(values))
    order = have[np.argsort(np.abs(values[have]), kind="stable")]
    out[groups[order]] = values[order]  # the last written is the largest
    return out


def by_group(values: np.ndarray, groups: np.ndarray, count: int, of: Callable[[np.ndarray], np.ndarray]) -> np.ndarray:
    """``of`` the finite values of each group, (count, m); NaN where a group has none."""
    order = np.argsort(groups, kind="stable")
    order = order[np.isfinite(values[order])]
    ends = np.searchsorted(groups[order], np.arange(count + 1))
    width = len(of(np.zeros(1)))
    out = np.full((count, width), np.nan)
    for i in range(count):
        if ends[i + 1] > ends[i]:
            out[i] = of(values[order[ends[i] : ends[i + 1]]])
    return out

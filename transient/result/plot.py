"""Quick pictures of a result in a notebook: one variable on matplotlib axes, to be gone on with there."""

from __future__ import annotations

from typing import TYPE_CHECKING

import numpy as np

from transient.result.result import Result, ResultError, Variable
from transient.result.scale import scale
from transient.result.view import nearest

if TYPE_CHECKING:
    from matplotlib.axes import Axes

STROKES = ("-", "--", "-.", ":")
PROFILES = 7  # of a variable across the gap
LEADS = ("time", "profile_time", "case")
USUAL = ("wall_stress", "mean_velocity", "settling_time")


def plot(result: Result, quantity: str | None = None, over: str | None = None, axes: Axes | None = None) -> Axes:
    """``quantity`` on ``axes`` (default: those of a new figure), which are returned.

    A history is drawn over time, one line a wall; a variable across the gap as profiles; a column of a sweep as a
    point a case, over the varied key ``over`` (default: the first that varies).  ``quantity`` may end in a wall's name,
    as in ``wall_stress upper``; the default is the wall stress, or the settling time of a sweep.
    Raises ResultError for an unknown name, or what is no number.
    """
    name, _, wall = (quantity or _usual(result)).partition(" ")
    variable = result.variables.get(name)
    if variable is None:
        raise ResultError(f"there is no variable {name!r}{nearest(name, result.variables)}")
    if not variable.dims or variable.dims[0] not in LEADS or variable.data.dtype.kind not in "fiu":
        raise ResultError(f"{name} is no history, profile or column of numbers; it cannot be plotted")
    if axes is None:
        from matplotlib import pyplot

        axes = pyplot.subplots()[1]
    if variable.dims[0] == "case":
        _cases(axes, result, variable, over)
    elif variable.dims == ("profile_time", "position"):
        _profiles(axes, result, variable)
    else:
        _history(axes, result, name, variable, wall)
    axes.set_title(result.title, parse_math=False)
    return axes


def _usual(result: Result) -> str:
    return next((name for name in USUAL if name in result.variables), USUAL[0])


def _history(axes: Axes, result: Result, name: str, variable: Variable, wall: str) -> None:
    """Lines over time, named where there are several."""
    lead = variable.dims[0]
    time = result.variables[lead].data
    clock, unit = scale(float(time[-1]), "s"), _unit(variable.data, variable.units)
    columns = variable.data.reshape(len(time), -1)
    labels = [name]
    if variable.dims[1:] == ("wall",):
        labels = [str(label) for label in result.variables["wall"].data]
    if wall and wall not in labels:
        raise ResultError(f"there is no wall {wall!r}{nearest(wall, labels)}")
    for i, label in enumerate(labels[: columns.shape[1]]):
        if not wall or label == wall:
            stroke = STROKES[i % len(STROKES)]
            axes.plot(time * clock.factor, columns[:, i] * unit.factor, stroke, label=label)
    if len(labels) > 1 or axes.get_legend() is not None:
        axes.legend()
    axes.set_xlabel(f"time [{clock.unit}]")
    axes.set_ylabel(f"{variable.long_name} [{unit.unit or '1'}]")


def _profiles(axes: Axes, result: Result, variable: Variable) -> None:
    """Some profiles, each named by its time, from the first to the last."""
    time, position = result.profile_time, result.position
    across, unit = scale(float(position[-1]), "m"), _unit(variable.data, variable.units)
    clock = scale(float(time[-1]), "s")
    rows = np.unique(np.linspace(0, len(time) - 1, PROFILES).astype(int))
    for shade, row in zip(np.linspace(0.75, 0.0, len(rows)), rows, strict=True):
        label = f"{time[row] * clock.factor:.4g} {clock.unit}"
        axes.plot(variable.data[row] * unit.factor, position * across.factor, color=str(shade), label=label)
    axes.legend(title="time")
    axes.set_xlabel(f"{variable.long_name} [{unit.unit or '1'}]")
    axes.set_ylabel(f"{result.variables['position'].long_name} [{across.unit}]")


def _cases(axes: Axes, result: Result, variable: Variable, over: str | None) -> None:
    """A point for every case that has the number."""
    varied = [name for name in result.summary.get("varied") or {} if name in result.variables]
    key = over or next((name for name in varied if result.variables[name].data.dtype.kind in "fiu"), "case")
    if key not in result.variables or result.variables[key].dims != ("case",):
        raise ResultError(f"nothing varies under the name {key!r}{nearest(key, varied)}")
    along = result.variables[key]
    x, unit = _unit(along.data, along.units), _unit(variable.data, variable.units)
    axes.plot(along.data * x.factor, variable.data * unit.factor, "o", ms=3, mfc="none")
    axes.set_xlabel(f"{key} [{x.unit or '1'}]")
    axes.set_ylabel(f"{variable.long_name} [{unit.unit or '1'}]")


def _unit(values: np.ndarray, unit: str):
    if values.dtype.kind not in "fiu":
        return scale(1.0, "1")
    finite = np.abs(values[np.isfinite(values)])
    return scale(float(finite.max(initial=0.0)), unit)

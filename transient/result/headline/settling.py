"""Settling times: the first time after which a quantity stays within a fraction of what it ends in."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

import numpy as np

from transient.result.curve import Curve
from transient.result.run import ZERO, Run

GRAZE = 30.0  # beyond this sensitivity a settling error is the band's, not the solver's
NOTHING = 1e-11  # of the run's largest velocity
LEVELS = (0.10, 0.05, 0.01, 0.001)


def settling(run: Run) -> dict[str, Any]:
    """Times (s) by velocity profile, mean velocity and each wall's stress; null where not reached.

    Relative to the steady value, over one period to the largest magnitude; where that is zero to the quantity's own
    peak.  The error is the spread of the time when the deviation's own error is added and taken away.
    """
    from transient.result.headline import plain

    within = run.settle_within
    names = [wall.name for wall in run.walls]
    if run.regime.deviation is None:
        nothing = {"velocity": None, "flow": None, "stress": dict.fromkeys(names)}
        levels = {label(level): dict(nothing) for level in LEVELS}
        return {"reached": False, "time": None, "error": None, "within": within, **nothing,
                "errors": dict(nothing), "grazing": [], "regime": "none", "period": None, "levels": levels}  # fmt: skip
    judges = _judges(run)
    main = _times(judges, within, names)
    spread = _spreads(judges, within, main, names)
    return {
        "reached": main["velocity"] is not None,
        "time": main["velocity"],
        "error": spread["velocity"],
        "within": within,
        **main,
        "errors": spread,
        "grazing": _grazing(judges, within, main, spread, names),
        "relative_to": {
            "velocity": plain(judges["velocity"].size),
            "flow": plain(judges["flow"].size),
            "stress": {name: plain(judges["stress"][name].size) for name in names},
        },
        "error_kind": run.errors.kind,
        "regime": run.regime.kind,
        "period": run.regime.period,
        "levels": {label(level): _times(judges, level, names) for level in LEVELS},
    }


def label(level: float) -> str:
    """"1 %" for 0.01."""
    return f"{100 * level:g} %"


class Judge:
    """One quantity's deviation as a curve, its error at the rows, and the size it is measured against, which may be
    ``unsure`` itself."""

    def __init__(self, curve: Curve, error: np.ndarray, size: float, unsure: float = 0.0):
        self.size = size
        self.unsure = min(unsure, size)
        self.curve = curve
        # the deviation off by its error, to either side
        self.higher = replace(curve, value=curve.value + error, offset=curve.measure)
        self.lower = replace(curve, value=curve.value - error, offset=curve.measure)

    def time(self, level: float) -> float | None:
        """Settling time within ``level``, None if not by the end or if there is nothing to measure against."""
        if not 0.0 < self.size < np.inf:
            return 0.0 if self.size == 0.0 else None
        found = self.curve.last_above(level * self.size)
        return None if np.isnan(found) else found

    def spread(self, level: float, time: float | None) -> float | None:
        """Bound of the time's error; to the end of the run where the error alone could decide."""
        if time is None:
            return None
        if self.size == 0.0:
            return 0.0
        end = float(self.curve.time[-1])
        low, high = level * (self.size - self.unsure), level * (self.size + self.unsure)
        late = _later(self.higher.last_over(low, 1.0), self.lower.last_over(low, -1.0), end)
        early = _later(self.lower.last_over(high, 1.0), self.higher.last_over(high, -1.0), end)
        return max(late - time, time - early, 4e-16 * time, 0.0)

    def grazes(self, level: float, time: float | None, spread: float | None) -> bool:
        """Whether the deviation runs along the band: a share of it moves the time by ``GRAZE`` times that share.

        (A plain decay to 1 % moves it by a fifth of that share.)
        """
        if not time or not spread:
            return False
        curve = self.curve
        i = int(np.clip(np.searchsorted(curve.time, time), 1, len(curve.time) - 1))
        near = slice(max(i - 2, 0), i + 2)
        error = 0.5 * float(np.nanmax(np.abs(self.higher.value - self.lower.value)[near], initial=0.0))
        return spread * level * self.size > GRAZE * error * time


def _grazing(
    judges: dict[str, Any], level: float, times: dict[str, Any], spread: dict[str, Any], names: list[str]
) -> list[str]:
    """Names of the settling times that the band itself, not the solver, makes uncertain."""
    found = [name for name in ("velocity", "flow") if judges[name].grazes(level, times[name], spread[name])]
    walls = spread["stress"]
    return found + [n for n in names if judges["stress"][n].grazes(level, times["stress"][n], walls[n])]


def _later(one: float, other: float, end: float) -> float:
    """The later of two times; one that is not reached counts as the end of the run."""
    return max(end if np.isnan(one) else one, end if np.isnan(other) else other)


def _judges(run: Run) -> dict[str, Any]:
    history, regime, errors = run.history, run.regime, run.errors
    away = regime.deviation
    assert away is not None
    run_largest = history.largest_curve().magnitude()[0]
    velocity = regime.velocity if regime.velocity > ZERO * run_largest else run_largest
    mean_peak = abs(history.mean_curve().magnitude()[0])
    mean = regime.mean if regime.mean > ZERO * mean_peak else mean_peak
    if mean_peak <= NOTHING * run_largest:  # no net flow at all: what is left is round-off
        mean = 0.0
    stress = {wall.name: _stress_judge(run, wall.end, wall.shear_free) for wall in run.walls}
    return {
        "velocity": Judge(away.largest_curve(), errors.level_profile, velocity, errors.sizes[0]),
        "flow": Judge(away.mean_curve(), errors.level_mean, mean, errors.sizes[1]),
        "stress": stress,
    }


def _stress_judge(run: Run, end: int, shear_free: bool) -> Judge:
    away = run.regime.deviation
    assert away is not None
    size = float(run.regime.stress[end])
    peak = abs(run.history.stress_curve(end).magnitude()[0])
    infinite = run.unbounded[end] > 0.0
    others = np.abs(run.regime.stress[np.isfinite(run.regime.stress)]).max(initial=0.0)
    compared = max(others, 0.0) if infinite else peak
    if not size > ZERO * compared:
        size = np.inf if infinite else peak
    if shear_free:
        size = np.inf
    return Judge(away.stress_curve(end), run.errors.level_stress[:, end], size, run.errors.sizes[2 + end])


def _times(judges: dict[str, Any], level: float, names: list[str]) -> dict[str, Any]:
    return {
        "velocity": judges["velocity"].time(level),
        "flow": judges["flow"].time(level),
        "stress": {name: judges["stress"][name].time(level) for name in names},
    }


def _spreads(judges: dict[str, Any], level: float, times: dict[str, Any], names: list[str]) -> dict[str, Any]:
    return {
        "velocity": judges["velocity"].spread(level, times["velocity"]),
        "flow": judges["flow"].spread(level, times["flow"]),
        "stress": {name: judges["stress"][name].spread(level, times["stress"][name]) for name in names},
    }

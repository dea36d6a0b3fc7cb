"""Everything that headline numbers are made from: the history, what it ends in, and how far off it may be."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.result.history import History

ZERO = 1e-6  # below this share of the run's largest value a steady value counts as zero


@dataclass(frozen=True)
class WallFacts:
    """A wall as the headline numbers need it: ``end`` 0 lower/inner, 1 upper/outer; ``area`` of one gap or None."""

    name: str
    end: int
    area: float | None
    radius: float
    shear_free: bool


@dataclass(frozen=True, eq=False)
class Errors:
    """Absolute bounds of a history's errors, row by row.

    ``kind`` "exact" (against a series) or "estimate" (from refinement).  ``stress`` (n, 2), ``mean`` (n,);
    of the deviation's rows ``level_stress`` (m, 2), ``level_mean`` (m,), ``level_profile`` (j,).
    ``peak`` (2,) of each wall's largest |stress|, ``mean_peak``.
    """

    kind: str
    stress: np.ndarray
    mean: np.ndarray
    level_stress: np.ndarray
    level_mean: np.ndarray
    level_profile: np.ndarray
    peak: np.ndarray
    mean_peak: float


@dataclass(frozen=True, eq=False)
class Regime:
    """What the flow ends in.

    ``kind`` "steady", "periodic" or "none"; ``period`` s or None; ``deviation`` the flow minus that regime (None
    with "none"); sizes over the gap (and over one period): ``velocity``, ``mean``, ``stress`` (2,), infinite where
    the regime's own stress is.  ``steady_stress`` (2,), ``steady_mean`` where steady.
    """

    kind: str
    period: float | None
    deviation: History | None
    velocity: float
    mean: float
    stress: np.ndarray


@dataclass(frozen=True, eq=False)
class Run:
    """A solved case in plain numbers.

    ``unbounded`` (2,) coefficient K of |stress| ~ K / sqrt(t - t_jump) per wall, 0 where bounded, with
    ``unbounded_time`` (2,); ``viscosity`` Pa s, ``density`` kg/m^3; ``section`` flow area of one gap or None;
    ``fluid_impulse`` (k,) what the pressure alone would have added to the velocity at the kept profiles, m/s.
    """

    history: History
    regime: Regime
    errors: Errors
    walls: tuple[WallFacts, ...]
    rotating: bool
    count: int
    section: float | None
    settle_within: float
    viscosity: float
    unbounded: np.ndarray
    unbounded_time: np.ndarray
    fluid_impulse: np.ndarray

"""Everything that headline numbers are made from: the history, what it ends in, and how far off it may be."""

from __future__ import annotations

from dataclasses import dataclass, field

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
class BodyFacts:
    """A body that carries the wall ``end``; N, m, kg, or (rotating) N m, rad, kg m^2; (n,) are the history's rows.

    ``load``, ``load_rate`` (n,) outside load, weight included; ``curve`` (speeds, values) of a speed-dependent drive,
    empty without; ``grip`` turns a wall stress into the film's load; ``face`` the pressure drop per length into the
    load on the face that displaces fluid; ``acceleration``, ``jerk`` (n,), NaN where infinite; ``terminal`` the
    steady speed, None without; ``size`` of speed that settling is relative to, None where the run ends in no regime;
    ``released`` s: from then on no drive acts, None if one does; ``sticks``: dry friction can hold it.
    """

    end: int
    load: np.ndarray
    load_rate: np.ndarray
    curve: tuple[np.ndarray, np.ndarray]
    grip: float
    face: float
    acceleration: np.ndarray
    jerk: np.ndarray
    terminal: float | None
    size: float | None
    released: float | None
    sticks: bool

    def curve_load(self, speed: np.ndarray) -> np.ndarray:
        """Load (n,) of the speed-dependent drive, its end values held."""
        return np.interp(speed, *self.curve) if len(self.curve[0]) else np.zeros_like(speed)

    def curve_slope(self, speed: np.ndarray) -> np.ndarray:
        """Slope (n,) of the curve; 0 beyond its ends."""
        at, value = self.curve
        if len(at) < 2:
            return np.zeros_like(speed)
        slopes = np.concatenate([[0.0], np.diff(value) / np.diff(at), [0.0]])
        return slopes[np.searchsorted(at, speed, side="right")]


@dataclass(frozen=True, eq=False)
class Errors:
    """Absolute bounds of a history's errors, row by row.

    ``kind`` "exact" (against a series) or "estimate" (from refinement).  ``stress`` (n, 2), ``mean`` (n,);
    of the deviation's rows ``level_stress`` (m, 2), ``level_mean`` (m,), ``level_profile`` (j,).
    ``peak`` (2,) of each wall's largest |stress|, ``mean_peak``.  ``more`` by name, where bodies or a prescribed flow
    make them results: on the history's rows "gradient" (n,), "speed", "acceleration", "place" (n, 2); on the
    deviation's rows "level_speed" (m, 2).  ``sizes`` (4,): of the largest speed, mean and stresses of a periodic
    regime, or of the run where nothing is left in the end; 0 where they are judged otherwise.
    """

    kind: str
    stress: np.ndarray
    mean: np.ndarray
    level_stress: np.ndarray
    level_mean: np.ndarray
    level_profile: np.ndarray
    peak: np.ndarray
    mean_peak: float
    more: dict[str, np.ndarray] = field(default_factory=dict)
    sizes: np.ndarray = field(default_factory=lambda: np.zeros(4))


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
    ``bodies`` that carry walls; ``flow_given``: the flow is prescribed and the pressure a result, ``pressure_jump`` s
    the time at which that is infinite, None without.
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
    bodies: tuple[BodyFacts, ...] = ()
    flow_given: bool = False
    pressure_jump: float | None = None

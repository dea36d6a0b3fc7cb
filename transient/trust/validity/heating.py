"""Viscous heating, estimated: does the film warm itself enough to change its viscosity?"""

from __future__ import annotations

import numpy as np

from transient.gap.problem import LOWER, UPPER, Problem
from transient.result.history import History
from transient.trust.check import Check, judge
from transient.trust.quasi_steady import (
    lever,
    quasi_steady_mean,
    quasi_steady_stress,
    section_measure,
    steady_drop,
)

# Mineral oil, the liquid that warms most: common practice, no source.
CONDUCTIVITY, SPECIFIC_HEAT = 0.13, 1900.0
# A kelvin changes an oil's viscosity by about 5 %: common practice, no source.
NOTICEABLE = 1.0
SOURCE = (
    "oil's conductivity 0.13 W/(m K) and specific heat 1900 J/(kg K), viscosity changing 5 % per kelvin: "
    "common practice, no source"
)


def power_density(
    problem: Problem, stress: np.ndarray, speed: np.ndarray, gradient: np.ndarray, mean: np.ndarray
) -> np.ndarray:
    """Work done on the liquid per volume and time (n,) W/m^3 by walls (``stress``, ``speed`` (n, 2)) and pressure."""
    reach = np.array(lever(problem))
    volume = section_measure(problem)
    if problem.rotating:
        volume = 0.5 * problem.gap * (problem.inner + problem.outer)
    work = stress * speed * reach
    return -(work[:, LOWER] + work[:, UPPER]) / volume + (0.0 if problem.rotating else gradient * mean)


def temperature_rise(problem: Problem, history: History) -> tuple[float, float]:
    """(rise without any cooling, rise with both walls kept cool), K, for oil.

    Cooled film of uniform dissipation q between walls kept cool: mean rise q h^2/(12 k), largest q h^2/(8 k).
    """
    actual = power_density(problem, history.stress, history.speed, history.gradient, history.mean)
    actual = np.where(np.isfinite(actual), actual, 0.0)
    elapsed = np.diff(history.time)
    spent = float(np.sum(0.5 * elapsed * (np.abs(actual[1:]) + np.abs(actual[:-1]))))
    drop = steady_drop(problem, history)
    hand = power_density(
        problem,
        quasi_steady_stress(problem, history.speed, drop),
        history.speed,
        drop,
        quasi_steady_mean(problem, history.speed, drop),
    )
    total = float(history.time[-1] - history.time[0])
    # The hand formula's power peaks are finite after a sudden start; the mean of the true one covers fast oscillations.
    strongest = max(float(np.abs(hand).max()), spent / total if total > 0.0 else 0.0)
    return spent / (problem.density * SPECIFIC_HEAT), strongest * problem.gap**2 / (8.0 * CONDUCTIVITY)


def viscous_heating(problem: Problem, history: History) -> Check | None:
    """The smaller of both estimates; only ever a caution, since the liquid's thermal properties are not known."""
    if not any(wall.kind == "moving" for wall in problem.walls):
        return None
    adiabatic, cooled = temperature_rise(problem, history)
    value = min(adiabatic, cooled)
    status = judge(value, NOTICEABLE)
    words = {
        "pass": "the liquid hardly warms itself",
        "caution": f"the liquid may warm itself by {value:.2g} K, enough to change its viscosity",
        "fail": "the heating could not be estimated",
    }
    return Check("viscous heating", "validity", status, value, NOTICEABLE, SOURCE, words[status])

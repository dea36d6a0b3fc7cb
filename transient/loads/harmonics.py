"""Harmonics of a load over the last period of a run that ends in a periodic state."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.loads.load import Load
from transient.result.result import ResultError

COUNT = 20


@dataclass(frozen=True, eq=False)
class Harmonics:
    """load = ``mean`` + sum of ``amplitude`` sin(2 pi ``frequency`` t + ``phase``), t from the start of the run.

    ``frequency`` (k,) Hz, ``amplitude`` (k,) >= 0, ``phase`` (k,) rad in (-pi, pi]; ``period`` s.
    """

    period: float
    mean: float
    frequency: np.ndarray
    amplitude: np.ndarray
    phase: np.ndarray


def harmonics_of(load: Load, count: int = COUNT) -> Harmonics:
    """The first ``count`` harmonics: exact Fourier integrals of the straight lines between the rows.

    Raises ResultError where the run ends in no periodic state, or within its first period, or where the load is
    infinite within the last one.
    """
    period, history = load.period, load.history
    if not period:
        raise ResultError("--harmonics: this run ends in no periodic state; they are those of a periodic drive")
    end = float(history.time[-1])
    start = end - period
    if start < history.time[0] - 1e-9 * period:
        raise ResultError(f"--harmonics: the run is shorter than one period, {period:.4g} s; give it a longer duration")
    if any(instant.time > start for instant in history.infinite):
        raise ResultError("--harmonics: the load is infinite within the last period, so its harmonics do not fade")
    inside = history.time[(history.time > start) & (history.time < end)]
    time = np.concatenate([[start], inside, [end]])
    value = history.at(time)
    number = np.arange(1, count + 1)
    omega = 2.0 * np.pi * number / period
    coefficient = 2.0 / period * _fourier(time, value, omega)
    mean = float(np.trapezoid(value, time) / period)
    # a sin(wt + p) = Re(-i a exp(ip) exp(iwt))
    turned = 1j * coefficient
    return Harmonics(period, mean, number / period, np.abs(turned), np.angle(turned))


def _fourier(time: np.ndarray, value: np.ndarray, omega: np.ndarray) -> np.ndarray:
    """Integral (k,) of value exp(-i omega t), straight lines between rows.

    Over an interval of half length d about m, with y = omega d: 2 d exp(-i omega m) (mean j0(y) - i half rise j1(y)),
    j0 and j1 spherical Bessel functions (from memory: the Fourier transforms of 1 and x on [-1, 1]); no cancellation.
    """
    from scipy.special import spherical_jn

    half = 0.5 * np.diff(time)
    middle = time[:-1] + half
    mean, rise = 0.5 * (value[1:] + value[:-1]), 0.5 * np.diff(value)
    y = np.outer(omega, half)
    inside = mean * spherical_jn(0, y) - 1j * rise * spherical_jn(1, y)
    return (2.0 * half * np.exp(-1j * np.outer(omega, middle)) * inside).sum(axis=1)

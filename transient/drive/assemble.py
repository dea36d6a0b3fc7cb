"""Shared by the history kinds: checks of their numbers, and pieces laid end to end."""

from __future__ import annotations

import math

import numpy as np

from transient.drive.pieces import Drive, DriveError, Eventual, Pieces, Track, constant
from transient.drive.times import SAME_TIME


def require_finite(**numbers: float) -> None:
    """Raise ``DriveError`` for the first number that is not finite."""
    for key, number in numbers.items():
        if not math.isfinite(number):
            raise DriveError(f"{key.rstrip('_')} must be a finite number", key.rstrip("_"))


def require_positive(**numbers: float) -> None:
    """Raise ``DriveError`` for the first number that is not finite and above zero."""
    require_finite(**numbers)
    for key, number in numbers.items():
        if number <= 0.0:
            raise DriveError(f"{key} must be above zero", key)


def require_not_negative(**numbers: float) -> None:
    """Raise ``DriveError`` for the first number that is not finite and at least zero."""
    require_finite(**numbers)
    for key, number in numbers.items():
        if number < 0.0:
            hint = "; a run starts at t = 0" if key == "at" else ""
            raise DriveError(f"{key} must not be negative{hint}", key)


def held(value: float, since: float) -> Eventual:
    """The end of a drive that stays at ``value`` from ``since`` (s) on."""
    return Eventual(constant(value), None, since)


def once(
    at: float,
    before: float,
    starts: list[float] | np.ndarray,
    poly: list[list[float]] | np.ndarray,
    eventual: Eventual,
    waves: dict[int, tuple[complex, complex]] | None = None,
    key: str = "at",
) -> Drive:
    """A drive that holds ``before`` up to ``at`` (s) and then runs through pieces once.

    ``starts`` (P,) s after ``at``, the first 0; ``poly`` (P, <= 4), lowest power first; ``waves`` gives the
    (coefficient, rate) of the one exponential term of a piece, by its index.  Raises ``DriveError`` (``key``)
    where pieces are too short against the time at which they come.
    """
    begins = at + np.asarray(starts, dtype=float)
    cubic = np.zeros((len(begins), 4))
    for i, row in enumerate(poly):
        cubic[i, : len(row)] = row
    coeff = np.zeros((len(begins), 1 if waves else 0), complex)
    rate = np.zeros_like(coeff)
    for i, (c, r) in (waves or {}).items():
        coeff[i, 0], rate[i, 0] = c, r
    if at > 0.0:
        begins = np.concatenate([[0.0], begins])
        cubic = np.concatenate([[[before, 0.0, 0.0, 0.0]], cubic])
        blank = np.zeros((1, coeff.shape[1]), complex)
        coeff, rate = np.concatenate([blank, coeff]), np.concatenate([blank, rate])
    if np.any(np.diff(begins) <= 2.0 * SAME_TIME * begins[1:]):
        raise DriveError(
            f"this change at t = {at:g} s is too short to be told from a jump; make it a step or start it earlier", key
        )
    return Drive((Track(Pieces(begins, cubic, coeff, rate, before)),), before, eventual)

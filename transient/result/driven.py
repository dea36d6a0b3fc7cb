"""Curves of what a body does over time.  Its film answers every break like the root of time, and so does its motion."""

from __future__ import annotations

import numpy as np

from transient.result.curve import Curve
from transient.result.history import History


def body_speed(history: History, end: int) -> Curve:
    """Speed of the body on a wall."""
    return _curve(history, history.speed[:, end], history.acceleration[:, end])


def body_place(history: History, end: int) -> Curve:
    """Place of the body on a wall."""
    return _curve(history, history.place[:, end], history.speed[:, end])


def body_acceleration(history: History, value: np.ndarray, rate: np.ndarray) -> Curve:
    """Acceleration of a body from its rows ``value`` and their ``rate`` (n,), NaN where it is infinite."""
    return _curve(history, value, rate)


def _curve(history: History, value: np.ndarray, rate: np.ndarray) -> Curve:
    return Curve(history.time, value, rate, history.step, history.offset[:-1])

"""Histories of a march: rows at the times it stepped to, with rates, so that values between rows are known."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np


@dataclass(frozen=True, eq=False)
class History:
    """n rows in time, two ends (lower/inner first), N nodes.

    A break of the drive after t = 0 is two rows of equal time: the limit from the left (last row of its piece)
    and from the right (first row of the next).  Between neighbouring rows of one piece every quantity is the
    cubic through values and rates.

    ``time`` (n,) s; ``piece`` (n,) number of the smooth piece; ``offset`` (n,) s, the exact time is
    ``starts[piece] + offset``; ``stress``, ``stress_rate`` (n, 2) Pa, Pa/s, traction of the fluid on the wall,
    NaN where infinite; ``speed``, ``acceleration`` (n, 2) m/s or rad/s, and per s; ``mean``, ``mean_rate`` (n,)
    mean velocity m/s, m/s^2; ``gradient`` (n,) pressure drop per length, Pa/m.
    ``position`` (N,) m, coordinate r; ``profile_row`` (k,) the rows at which profiles were kept;
    ``profile``, ``profile_rate``, ``travel`` (k, N) velocity w, its rate, and its integral since t = 0
    (in a rotating gap: angular).
    """

    time: np.ndarray
    piece: np.ndarray
    offset: np.ndarray
    stress: np.ndarray
    stress_rate: np.ndarray
    speed: np.ndarray
    acceleration: np.ndarray
    mean: np.ndarray
    mean_rate: np.ndarray
    gradient: np.ndarray
    position: np.ndarray
    profile_row: np.ndarray
    profile: np.ndarray
    profile_rate: np.ndarray
    travel: np.ndarray

"""Small linear systems under the drives' own pieces, in closed form."""

from __future__ import annotations

from dataclasses import dataclass
from math import factorial

import numpy as np

from transient.gap.problem import Inputs

TERMS = 16  # of the series for small arguments: round-off at |z| = 1

ALIKE, HAIR = 1e7, 1e-8  # modes more alike than that are told apart by such a change of the damping


@dataclass(frozen=True, eq=False)
class Linear:
    """dz/dt = ``matrix`` (N, N) z + ``source`` (N, 3) u, with u the inputs' rows."""

    matrix: np.ndarray
    source: np.ndarray


def forced(
    system: Linear, inputs: Inputs, piece: np.ndarray, offset: np.ndarray, state: np.ndarray
) -> tuple[np.ndarray, np.ndarray]:
    """State and rates (n, N) at ``offset`` s into ``piece`` (n,), from ``state`` (N,) at t = 0.

    By the matrix's own modes; modes that coincide (critical damping) are moved apart by a hair and cost half of the
    digits.
    """
    rate, modes = np.linalg.eig(system.matrix)
    if np.linalg.cond(modes) > ALIKE:
        rate, modes = np.linalg.eig(system.matrix + np.diag(np.diag(system.matrix)) * HAIR)
    back = np.linalg.inv(modes)
    source = back @ system.source
    lengths = np.diff(inputs.starts)
    gained = _answer(rate, source, inputs, np.arange(len(lengths)), lengths)
    begins = [back @ state]
    for number, length in enumerate(lengths):
        begins.append(np.exp(rate * length) * begins[-1] + gained[number])
    amplitude = np.exp(rate * offset[:, None]) * np.array(begins)[piece] + _answer(rate, source, inputs, piece, offset)
    value = (amplitude @ modes.T).real
    given = np.stack([inputs.row(row).at(piece, offset) for row in range(3)], axis=1)
    return value, value @ system.matrix.T + given @ system.source.T


def _answer(rate: np.ndarray, source: np.ndarray, inputs: Inputs, piece: np.ndarray, x: np.ndarray) -> np.ndarray:
    """Amplitudes (n, N) at ``x`` (n,) s into the pieces that began with none: integral of e^(rate (x - t)) source u."""
    z = rate * x[:, None]
    out = np.zeros(z.shape, complex if inputs.coeff.shape[2] else z.dtype)
    for order, weight in enumerate(_weights(z)):
        drive = inputs.poly[piece, :, order] @ source.T
        out += drive * factorial(order) * x[:, None] ** (order + 1) * weight
    for k in range(inputs.coeff.shape[2]):
        for row in range(3):
            c, s = inputs.coeff[piece, row, k], inputs.rate[piece, row, k]
            if not c.any():
                continue
            for half, own in ((c / 2, s), (np.conj(c) / 2, np.conj(s))):
                out += half[:, None] * source[:, row] * _resonant(rate, own, x)
    return out


def _weights(z: np.ndarray) -> list[np.ndarray]:
    """phi_1 to phi_4 of ``z``, phi_k = sum z^j / (j + k)!, so that z phi_(k+1) = phi_k - 1/k!."""
    small = np.abs(z) < 1.0
    near = np.where(small, z, 0.0)
    far = np.where(small, 1.0, z)
    out, last = [], np.exp(far)
    for k in range(1, 5):
        last = (last - 1.0 / factorial(k - 1)) / far
        series = np.zeros_like(near)
        for j in range(TERMS, -1, -1):
            series = series * near + 1.0 / factorial(j + k)
        out.append(np.where(small, series, last))
    return out


def _resonant(rate: np.ndarray, own: np.ndarray, x: np.ndarray) -> np.ndarray:
    """Integral of e^(rate (x - t)) e^(own t) dt over [0, x], (n, N), also where both rates meet."""
    apart = own[:, None] - rate
    z = apart * x[:, None]
    small = np.abs(z) < 1.0
    first = _weights(np.where(small, z, 0.0))[0]
    grown, free = np.exp(own * x)[:, None], np.exp(rate * x[:, None])
    return np.where(small, free * x[:, None] * first, (grown - free) / np.where(small, 1.0, apart))

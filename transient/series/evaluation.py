"""Compiled: outputs at many instants, old breaks through the modes, young ones on Laplace contours.

At each instant the drive is split into a *base* that has gone on for at least the window of the answer (a piece
continued, or a constant), answered by the modes, and what the younger breaks add to it.  A young piece that is
short against its age enters as one pulse, so that no large continuations cancel.
"""

from __future__ import annotations

import numpy as np

from transient.compiled import compiled
from transient.series.recursion import decay_and_loss, fill_turns, forced, input_value, moving

GONE = 1e-25  # of the largest mode: what is left of a mode below this does not count
SHORT = 0.125  # a piece shorter than this share of the age of its end enters as a pulse


@compiled
def base_piece(starts, piece, offset, window):  # type: ignore[no-untyped-def]
    """(n,) index of the last break at least ``window`` old, -1 where there is none."""
    out = np.empty(len(piece), np.int64)
    for e in range(len(piece)):
        k = piece[e]
        age = offset[e]
        while k >= 0 and age < window:
            k -= 1
            if k >= 0:
                age = (starts[piece[e]] - starts[k]) + offset[e]
        out[e] = k
    return out


@compiled
def young_levels(starts, piece, offset, base, window):  # type: ignore[no-untyped-def]
    """Contour level of each young piece of each instant, in order: (total,) int, -1 at age 0."""
    total = 0
    for e in range(len(piece)):
        total += piece[e] - base[e] + 1
    out = np.empty(total, np.int64)
    at = 0
    for e in range(len(piece)):
        for j in range(max(base[e], 0), piece[e] + 1):
            age = (starts[piece[e]] - starts[j]) + offset[e]
            if j < piece[e]:
                end = (starts[piece[e]] - starts[j + 1]) + offset[e]
                if starts[j + 1] - starts[j] < SHORT * end:
                    age = end
            if age <= window * 1e-36:
                out[at] = -1
            else:
                level = int(np.floor(np.log2(window / age)))
                if age < np.ldexp(window, -1 - level):
                    level += 1
                out[at] = max(level, 0)
            at += 1
    return out[:at]


@compiled
def fill_old(
    starts, lengths, poly, coeff, exponent, left, jump, ahead, reach, piece, offset, base, rate, share,
    weight, slow, rest, rest_index, out, size,
):  # type: ignore[no-untyped-def]
    """Fill ``out`` and ``size`` (n, Q) with the answer to the base of each instant and the size of its terms."""
    count, outputs = weight.shape
    scratch, which = np.zeros(3), np.zeros(3, np.int64)
    turns = np.zeros((3, coeff.shape[2]), np.complex128)
    for e in range(len(piece)):
        for q in range(outputs):
            out[e, q] = 0.0
            size[e, q] = 0.0
        k = base[e]
        held = k < 0
        if held:
            k = 0
        age = (starts[piece[e]] - starts[k]) + offset[e] if k < piece[e] else offset[e]
        if not held and k < piece[e]:
            held = lengths[k] < SHORT * ((starts[piece[e]] - starts[k + 1]) + offset[e])
        active = 0
        for i in range(3):
            if not held and moving(poly[k, i], coeff[k, i]):
                which[active] = i
                active += 1
                fill_turns(coeff[k, i], exponent[k, i], age, turns[i])
        top = 0.0
        for n in range(count):
            decay, loss = decay_and_loss(rate[n] * age)
            amplitude, most = ahead[k, n], reach[k, n] * 1.0
            if not held:
                for i in range(3):
                    amplitude -= share[n, i] * jump[k, i]
                    most += abs(share[n, i] * jump[k, i])
            amplitude *= decay
            most *= decay
            for c in range(active):
                i = which[c]
                push = share[n, i] * forced(
                    rate[n], decay, loss, poly[k, i], coeff[k, i], exponent[k, i], turns[i], age, scratch
                )
                amplitude -= push
                most += abs(push)
            top = max(top, most)
            if most > GONE * top:
                for q in range(outputs):
                    out[e, q] += weight[n, q] * amplitude
                    size[e, q] += abs(weight[n, q]) * most
        for i in range(3):
            if held:
                for q in range(outputs):
                    out[e, q] += slow[0, i, q] * left[k, i]
                    size[e, q] += abs(slow[0, i, q] * left[k, i])
                continue
            for d in range(4):
                value = input_value(poly[k, i], coeff[k, i, :0], exponent[k, i, :0], age, d)
                if value != 0.0:
                    for q in range(outputs):
                        out[e, q] += slow[d, i, q] * value
                        size[e, q] += abs(slow[d, i, q] * value)
            for m in range(coeff.shape[2]):
                if coeff[k, i, m] != 0.0:
                    now = coeff[k, i, m] * np.exp(exponent[k, i, m] * age)
                    for q in range(outputs):
                        add = rest[rest_index[k, i, m], i, q] * now
                        out[e, q] += add.real
                        size[e, q] += abs(add.real) + abs(add.imag)

"""Compiled: what breaks younger than the window add to the base of each instant."""

from __future__ import annotations

import numpy as np

from transient.compiled import compiled, part
from transient.series.early import HALF, MIDDLE
from transient.series.evaluation import SHORT

SLOW = 0.4  # exponentials slower than this on an octave's smallest age are developed in powers of time
ROUNDING = 8.0 * 2.0**-52
NOISE = 1e-11  # a jump of value, slope ... below this share of the terms it is the difference of is round-off

# Gauss-Legendre on 0 .. 1 for pulses: n points leave about (length / 4 age)^2n, so 3 or 4 do for brief ones.
BRIEFEST, BRIEF = 0.008, 0.04
_X = np.zeros((6, 5))
_W = np.zeros((6, 5))
for _count in (3, 4, 5):
    _X[_count, :_count], _W[_count, :_count] = np.polynomial.legendre.leggauss(_count)
    _X[_count] = 0.5 * (_X[_count] + 1.0)
    _W[_count] *= 0.5


@part
def difference(poly, coeff, exponent, left, j, base, offset, cubic, terms, rates, owners):  # type: ignore[no-untyped-def]
    """Piece j less the base continued to it: ``cubic`` (3, 4), ``terms``, ``rates`` (3, 2K), ``owners`` (3, 2K).

    ``base`` >= 0: that piece, begun ``offset`` earlier; below 0: the constant ``left``.
    """
    width = coeff.shape[2]
    for i in range(3):
        for d in range(4):
            cubic[i, d] = poly[j, i, d]
        for k in range(width):
            terms[i, k] = coeff[j, i, k]
            rates[i, k] = exponent[j, i, k]
            owners[i, k] = j
            terms[i, width + k] = 0.0
            owners[i, width + k] = j
        if base < 0:
            cubic[i, 0] -= left[i]
            continue
        c = poly[base, i]
        x = offset
        cubic[i, 0] -= c[0] + x * (c[1] + x * (c[2] + x * c[3]))
        cubic[i, 1] -= c[1] + x * (2.0 * c[2] + x * 3.0 * c[3])
        cubic[i, 2] -= c[2] + 3.0 * x * c[3]
        cubic[i, 3] -= c[3]
        for k in range(width):
            if coeff[base, i, k] != 0.0:
                s = exponent[base, i, k]
                was = coeff[base, i, k] * np.exp(s * x)
                if terms[i, k] != 0.0 and abs(s - rates[i, k]) <= 1e-13 * abs(s):
                    gone = terms[i, k] - was
                    terms[i, k] = gone if abs(gone) > NOISE * abs(was) else 0.0
                else:
                    terms[i, width + k] = -was
                    rates[i, width + k] = s
                    owners[i, width + k] = base


@part
def _terms(poly, coeff, exponent, left, j, base, offset, scale, i, order):  # type: ignore[no-untyped-def]
    """Sum of the magnitudes that the ``order``-th derivative's jump at piece j is the difference of.

    Exponentials too fast for ``scale`` are no part of it.
    """
    size = abs(left[i]) if (base < 0 and order == 0) else 0.0
    factor = 1.0
    for d in range(2, order + 1):
        factor *= d
    if order < 4:
        size += factor * abs(poly[j, i, order])
    for k in range(coeff.shape[2]):
        if coeff[j, i, k] != 0.0 and abs(exponent[j, i, k]) * scale < SLOW:
            size += abs(coeff[j, i, k]) * abs(exponent[j, i, k]) ** order
    if base >= 0:
        power = factor
        for d in range(order, 4):
            size += power * abs(poly[base, i, d])
            power *= offset * (d + 1) / (d + 1 - order)
        for k in range(coeff.shape[2]):
            if coeff[base, i, k] != 0.0 and abs(exponent[base, i, k]) * scale < SLOW:
                s = exponent[base, i, k]
                size += abs(coeff[base, i, k]) * abs(s) ** order * np.exp(s.real * offset)
    return size


@part
def clean(poly, coeff, exponent, left, j, base, offset, scale, late, i, order, jump):  # type: ignore[no-untyped-def]
    """The jump of the ``order``-th derivative of input i, exactly 0 where it is the round-off of its terms, or of the
    time ``late`` at which piece j begins."""
    noise = NOISE * _terms(poly, coeff, exponent, left, j, base, offset, scale, i, order)
    noise += ROUNDING * abs(late) * _terms(poly, coeff, exponent, left, j, base, offset, scale, i, order + 1)
    return jump if abs(jump) > noise else 0.0


@part
def _held(rate):  # type: ignore[no-untyped-def]
    """Whether the contour holds this pole inside, whatever its size."""
    return rate.real < 0.0 and abs(rate.imag) <= 1e-3 * abs(rate.real)


@part
def chebyshev(x, out):  # type: ignore[no-untyped-def]
    """out[n] = T_n(x)."""
    out[0] = 1.0
    out[1] = x
    for n in range(2, len(out)):
        out[n] = 2.0 * x * out[n - 1] - out[n - 2]


@part
def add_table(amount, series, reach, turn, out, size):  # type: ignore[no-untyped-def]
    """Add ``amount`` times the tabulated answers ``series`` (Q, TERMS) at the place ``turn`` (TERMS)."""
    for q in range(len(out)):
        total = 0.0
        for n in range(len(turn)):
            total += series[q, n] * turn[n]
        out[q] += amount * total
        size[q] += abs(amount) * reach[q]


@part
def _add_instant(poly, coeff, exponent, left, j, base, offset, late, cubic, terms, sudden, out):  # type: ignore[no-untyped-def]
    """Add the answer at the very instant of break ``j``: only a jump of value is felt at once."""
    for i in range(3):
        jump = cubic[i, 0]
        for m in range(terms.shape[1]):
            jump += terms[i, m].real
        jump = clean(poly, coeff, exponent, left, j, base, offset, 0.0, late, i, 0, jump)
        for q in range(len(out)):
            if jump != 0.0 and sudden[i, q] != 0.0:
                out[q] += sudden[i, q] * jump


@part
def _jump(cubic, terms, rates, scale, order):  # type: ignore[no-untyped-def]
    """Jump of the ``order``-th derivative of an input, fast exponentials left out."""
    jump = 0.0
    if order < 4:
        factor = 1.0
        for c in range(2, order + 1):
            factor *= c
        jump = factor * cubic[order]
    for m in range(len(terms)):
        if terms[m] != 0.0 and abs(rates[m]) * scale < SLOW:
            jump += (terms[m] * rates[m] ** order).real
    return jump


@part
def _add_jumps(jumps, terms, rates, scale, series, reach, turn, out, size):  # type: ignore[no-untyped-def]
    """Add the answers to the ``jumps`` (4,) of value, slope ... and to the higher ones of slow exponentials."""
    for d in range(series.shape[0] - 1):
        jump = jumps[d] if d < 4 else _jump(jumps, terms, rates, scale, d)
        if jump != 0.0:
            add_table(jump, series[d + 1], reach[d + 1], turn, out, size)


@compiled
def add_young(
    starts, lengths, poly, coeff, exponent, left, piece, offset, base, levels, row_of_level, series, reach, contours,
    smallest, node, node_weight, whole, whole_index, sudden, out, size,
):  # type: ignore[no-untyped-def]
    """Add to ``out`` and ``size`` (n, Q) what the breaks younger than the window add to the base.

    ``series`` (L, orders, 3, Q, TERMS), ``reach`` (L, orders, 3, Q), ``contours`` (L, NODES, 3, Q) by row of level.
    """
    width = coeff.shape[2]
    cubic = np.zeros((3, 4))
    terms = np.zeros((3, 2 * width), np.complex128)
    rates = np.zeros((3, 2 * width), np.complex128)
    owners = np.zeros((3, 2 * width), np.int64)
    turn = np.zeros(series.shape[4])
    lost = np.zeros(out.shape[1], np.complex128)
    at = 0
    for e in range(len(piece)):
        last, k = piece[e], base[e]
        reference, anchor = -1, max(k, 0)
        if k >= 0 and (k == last or lengths[k] >= SHORT * ((starts[last] - starts[k + 1]) + offset[e])):
            reference = k
        for j in range(anchor, last + 1):
            level = levels[at]
            at += 1
            if j == reference:
                continue
            age = (starts[last] - starts[j]) + offset[e] if j < last else offset[e]
            pulse = j < last and lengths[j] < SHORT * ((starts[last] - starts[j + 1]) + offset[e])
            since = 0.0
            if reference >= 0:
                since = lengths[reference] if j == reference + 1 else starts[j] - starts[reference]
            difference(poly, coeff, exponent, left[anchor], j, reference, since, cubic, terms, rates, owners)
            if level < 0:
                _add_instant(
                    poly, coeff, exponent, left[anchor], j, reference, since, starts[j], cubic, terms, sudden, out[e]
                )
                reference = j
                continue
            row = row_of_level[level]
            scale = smallest[row]
            if pulse:
                for i in range(3):
                    _add_pulse(
                        lengths[j], age, scale, cubic[i], terms[i], rates[i], series[row, 0, i], reach[row, 0, i],
                        turn, out[e], size[e],
                    )
                continue
            for i in range(3):
                for d in range(4):
                    cubic[i, d] = _jump(cubic[i], terms[i], rates[i], scale, d)
                    if cubic[i, d] != 0.0:
                        cubic[i, d] = clean(
                            poly, coeff, exponent, left[anchor], j, reference, since, scale, starts[j], i, d,
                            cubic[i, d],
                        )
            chebyshev((age / scale - MIDDLE) / HALF, turn)
            for i in range(3):
                answers, sizes = series[row, :, i], reach[row, :, i]
                _add_jumps(cubic[i], terms[i], rates[i], scale, answers, sizes, turn, out[e], size[e])
                for m in range(2 * width):
                    if terms[i, m] != 0.0 and abs(rates[i, m]) * scale >= SLOW:
                        _add_fast(
                            terms[i, m], rates[i, m], age, scale, contours[row, :, i],
                            whole[whole_index[owners[i, m], i, m % width], i], node, node_weight, lost, out[e], size[e],
                        )
            reference = j


@part
def _add_pulse(length, age, scale, cubic, terms, rates, series, reach, turn, out, size):  # type: ignore[no-untyped-def]
    """Add the answer to a piece over and done with: its shape against the answer to a unit pulse."""
    moving = cubic[0] != 0.0 or cubic[1] != 0.0 or cubic[2] != 0.0 or cubic[3] != 0.0
    quickest = 0.0
    for m in range(len(terms)):
        if terms[m] != 0.0:
            moving = True
            quickest = max(quickest, abs(rates[m]))
    if not moving:
        return
    # Waves within a pulse need points of their own.
    points = 5
    if quickest * length < 0.01:
        share = length / (age - length)
        points = 3 if share < BRIEFEST else (4 if share < BRIEF else 5)
    panels = 1 + int(quickest * length)
    step = length / panels
    for p in range(panels):
        for g in range(points):
            x = (p + _X[points, g]) * step
            value = cubic[0] + x * (cubic[1] + x * (cubic[2] + x * cubic[3]))
            for m in range(len(terms)):
                if terms[m] != 0.0:
                    value += (terms[m] * np.exp(rates[m] * x)).real
            chebyshev(((age - x) / scale - MIDDLE) / HALF, turn)
            add_table(value * _W[points, g] * step, series, reach, turn, out, size)


@part
def _add_fast(term, rate, age, scale, contour, whole, node, node_weight, lost, out, size):  # type: ignore[no-untyped-def]
    """Add the answer to Re(term exp(rate t)) begun ``age`` ago, by the contour; poles outside it by their residue."""
    outputs = len(out)
    held = _held(rate)
    for q in range(outputs):
        lost[q] = 0.0
        if not held:
            lost[q] = term * whole[q]
            add = lost[q] * np.exp(rate * age)
            out[q] += add.real
            size[q] += abs(add)
    for c in range(len(node)):
        s = node[c] / scale
        bottom = s * s - 2.0 * rate.real * s + (rate.real * rate.real + rate.imag * rate.imag)
        drive = (term.real * s - (term * np.conj(rate)).real) / bottom
        turn = np.exp(s * age) * node_weight[c] / scale
        for q in range(outputs):
            total = drive * contour[c, q] - (lost[q].real * s - (lost[q] * np.conj(rate)).real) / bottom
            add = turn * total
            out[q] += add.imag
            size[q] += abs(add)

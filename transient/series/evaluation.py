"""Compiled: outputs at many instants, old breaks through the modes, young ones on Laplace contours.

At each instant the drive is split into a *base* that has gone on for at least the window of the answer (a piece
continued, or a constant), answered by the modes, and what the younger breaks add to it.  A young piece that is
short against its age enters as one pulse, so that no large continuations cancel.
"""

from __future__ import annotations

import numpy as np

from transient.compiled import compiled, inlined
from transient.series.recursion import divided_exponential, forced, input_value

SHORT = 0.125  # a piece shorter than this share of the age of its end enters as a pulse
SLOW = 0.4  # exponentials slower than this on a contour's smallest age are developed in powers of time
NOISE = 1e-11  # a jump of value, slope ... below this share of the terms it is the difference of is round-off
BREAK, PULSE, INSTANT = 0, 1, 2


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


@inlined
def moments(y, out):  # type: ignore[no-untyped-def]
    """out[p] = integral of u^p exp(-y u) over 0 < u < 1, p = 0 .. 3, complex y."""
    if abs(y) < 1.5:
        for p in range(4):
            term, total = 1.0 + 0.0j, 0.0 + 0.0j
            for k in range(24):
                total += term / (k + p + 1)
                term *= -y / (k + 1)
            out[p] = total
    else:
        damping = np.exp(-y)
        out[0] = (1.0 - damping) / y
        for p in range(1, 4):
            out[p] = (p * out[p - 1] - damping) / y


@inlined
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


@inlined
def clean(poly, coeff, exponent, left, j, base, offset, i, order, jump):  # type: ignore[no-untyped-def]
    """The jump of the ``order``-th derivative of input i, exactly 0 where it is the round-off of its terms."""
    size = abs(left[i]) if (base < 0 and order == 0) else 0.0
    factor = 1.0
    for d in range(2, order + 1):
        factor *= d
    size += factor * abs(poly[j, i, order])
    for k in range(coeff.shape[2]):
        if coeff[j, i, k] != 0.0:
            size += abs(coeff[j, i, k]) * abs(exponent[j, i, k]) ** order
    if base >= 0:
        power = factor
        for d in range(order, 4):
            size += power * abs(poly[base, i, d])
            power *= offset * (d + 1) / (d + 1 - order)
        for k in range(coeff.shape[2]):
            if coeff[base, i, k] != 0.0:
                s = exponent[base, i, k]
                size += abs(coeff[base, i, k]) * abs(s) ** order * np.exp(s.real * offset)
    return jump if abs(jump) > NOISE * size else 0.0


@compiled
def fill_old(
    starts, lengths, poly, coeff, exponent, left, ahead, after, piece, offset, base, rate, share, weight, slow, rest,
    rest_index, out, size,
):  # type: ignore[no-untyped-def]
    """Fill ``out`` and ``size`` (n, Q) with the answer to the base of each instant and the size of its terms."""
    count, outputs = weight.shape
    scratch = np.zeros(3)
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
        for n in range(count):
            amplitude = (ahead[k, n] if held else after[k, n]) * np.exp(-rate[n] * age)
            reach = abs(amplitude)
            if not held:
                for i in range(3):
                    if share[n, i] != 0.0:
                        push = share[n, i] * forced(rate[n], poly[k, i], coeff[k, i], exponent[k, i], age, scratch)
                        amplitude -= push
                        reach += abs(push)
            if reach != 0.0:
                for q in range(outputs):
                    out[e, q] += weight[n, q] * amplitude
                    size[e, q] += abs(weight[n, q]) * reach
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
                        size[e, q] += abs(add)


@compiled
def add_young(
    starts, lengths, poly, coeff, exponent, left, piece, offset, base, levels, row_of_level, tables, smallest, node,
    node_weight, whole, whole_index, sudden, out, size,
):  # type: ignore[no-untyped-def]
    """Add to ``out`` and ``size`` (n, Q) what the breaks younger than the window add to the base."""
    width = coeff.shape[2]
    outputs = out.shape[1]
    cubic = np.zeros((3, 4))
    terms = np.zeros((3, 2 * width), np.complex128)
    rates = np.zeros((3, 2 * width), np.complex128)
    owners = np.zeros((3, 2 * width), np.int64)
    moment = np.zeros(4, np.complex128)
    drive = np.zeros(3, np.complex128)
    lost = np.zeros(outputs, np.complex128)
    at = 0
    for e in range(len(piece)):
        last = piece[e]
        k = base[e]
        reference, anchor = -1, max(k, 0)
        if k >= 0 and (k == last or lengths[k] >= SHORT * ((starts[last] - starts[k + 1]) + offset[e])):
            reference = k
        for j in range(max(k, 0), last + 1):
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
                for i in range(3):
                    jump = cubic[i, 0]
                    for m in range(2 * width):
                        jump += terms[i, m].real
                    jump = clean(poly, coeff, exponent, left[anchor], j, reference, since, i, 0, jump)
                    if jump != 0.0:
                        for q in range(outputs):
                            if sudden[i, q] != 0.0:
                                out[e, q] += sudden[i, q] * jump
                reference = j
                continue
            row = row_of_level[level]
            scale = smallest[row]
            length = lengths[j] if pulse else 0.0
            if not pulse:
                for i in range(3):
                    factor = 1.0
                    for d in range(4):
                        factor *= max(d, 1)
                        jump = factor * cubic[i, d]
                        for m in range(2 * width):
                            if terms[i, m] != 0.0 and abs(rates[i, m]) * scale < SLOW:
                                jump += (terms[i, m] * rates[i, m] ** d).real
                        cubic[i, d] = clean(poly, coeff, exponent, left[anchor], j, reference, since, i, d, jump)
                    for m in range(2 * width):
                        if terms[i, m] != 0.0 and abs(rates[i, m]) * scale >= SLOW and not _held(rates[i, m]):
                            now = terms[i, m] * np.exp(rates[i, m] * age)
                            source = whole_index[owners[i, m], i, m % width]
                            for q in range(outputs):
                                add = whole[source, i, q] * now
                                out[e, q] += add.real
                                size[e, q] += abs(add)
            quiet = True
            for i in range(3):
                for d in range(4):
                    quiet = quiet and cubic[i, d] == 0.0
                for m in range(2 * width):
                    quiet = quiet and terms[i, m] == 0.0
            if quiet:
                if not pulse:
                    reference = j
                continue
            for c in range(len(node)):
                s = node[c] / scale
                for q in range(outputs):
                    lost[q] = 0.0
                for i in range(3):
                    if pulse:
                        drive[i] = _pulse(s, length, cubic[i], terms[i], rates[i], moment)
                        continue
                    total = (cubic[i, 0] + (cubic[i, 1] + (cubic[i, 2] + cubic[i, 3] / s) / s) / s) / s
                    for m in range(2 * width):
                        if terms[i, m] == 0.0:
                            continue
                        r, t = rates[i, m], terms[i, m]
                        bottom = s * s - 2.0 * r.real * s + (r.real * r.real + r.imag * r.imag)
                        slow = abs(r) * scale < SLOW
                        if slow:
                            t = t * r**4
                        top = t.real * s - (t * np.conj(r)).real
                        total += top / (bottom * s**4) if slow else top / bottom
                        if not slow and not _held(r):
                            source = whole_index[owners[i, m], i, m % width]
                            for q in range(outputs):
                                h = t * whole[source, i, q]
                                lost[q] += (h.real * s - (h * np.conj(r)).real) / bottom
                    drive[i] = total
                turn = np.exp(s * age) * node_weight[c] / scale
                for q in range(outputs):
                    total = -lost[q]
                    for i in range(3):
                        total += drive[i] * tables[row, c, i, q]
                    add = turn * total
                    out[e, q] += add.imag
                    size[e, q] += abs(add)
            if not pulse:
                reference = j


@inlined
def _held(rate):  # type: ignore[no-untyped-def]
    """Whether the contour holds this pole inside, whatever its size."""
    return rate.real < 0.0 and abs(rate.imag) <= 0.1 * abs(rate.real)


@inlined
def _pulse(s, length, cubic, terms, rates, moment):  # type: ignore[no-untyped-def]
    """Laplace transform of a piece that lasts ``length``."""
    moments(s * length, moment)
    total = 0.0 + 0.0j
    power = length
    for d in range(4):
        total += cubic[d] * power * moment[d]
        power *= length
    for m in range(len(terms)):
        if terms[m] != 0.0:
            r = rates[m]
            total += 0.5 * terms[m] * length * divided_exponential((r - s) * length)
            total += 0.5 * np.conj(terms[m]) * length * divided_exponential((np.conj(r) - s) * length)
    return total

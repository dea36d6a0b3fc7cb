"""Compiled: amplitude of every mode at every break, exactly, from piece to piece."""

from __future__ import annotations

import numpy as np

from transient.compiled import compiled, part


@part
def power_integrals(y, decay, loss, out):  # type: ignore[no-untyped-def]
    """out[p] = integral of u^p exp(-y (1 - u)) over 0 < u < 1, p = 0, 1, 2, for y >= 0; ``decay`` = exp(-y)."""
    if y > 1.0:
        out[0] = loss / y
        out[1] = (1.0 - out[0]) / y
        out[2] = (1.0 - 2.0 * out[1]) / y
    else:
        for p in range(3):
            term, total = 1.0, 0.0
            for k in range(20):
                total += term / (k + p + 1)
                term *= y / (k + 1)
            out[p] = decay * total


@compiled
def divided_exponential(d):  # type: ignore[no-untyped-def]
    """(exp(d) - 1) / d for complex d."""
    if abs(d) < 0.75:
        term, total = 1.0 + 0.0j, 1.0 + 0.0j
        for k in range(2, 19):
            term *= d / k
            total += term
        return total
    return (np.exp(d) - 1.0) / d


@part
def fill_turns(coeff, exponent, x, turn):  # type: ignore[no-untyped-def]
    """turn[k] = exp(exponent[k] x) of the exponentials that one input has."""
    for k in range(len(coeff)):
        if coeff[k] != 0.0:
            turn[k] = np.exp(exponent[k] * x)


@part
def forced(rate, decay, loss, poly, coeff, exponent, turn, x, scratch):  # type: ignore[no-untyped-def]
    """Integral of exp(-rate (x - xi)) u'(xi) over 0 < xi < x for one input u = cubic + exponentials.

    ``decay`` = exp(-rate x), ``loss`` = 1 - decay, ``turn`` as ``fill_turns`` leaves it.
    """
    total = 0.0
    if poly[2] != 0.0 or poly[3] != 0.0:
        power_integrals(rate * x, decay, loss, scratch)
        total = x * (poly[1] * scratch[0] + x * (2.0 * poly[2] * scratch[1] + x * 3.0 * poly[3] * scratch[2]))
    elif poly[1] != 0.0:
        total = poly[1] * loss / rate
    for k in range(len(coeff)):
        if coeff[k] != 0.0:
            s = exponent[k]
            d = (s + rate) * x
            if abs(d.real) < 0.5 and abs(d.imag) < 0.5:
                answer = x * decay * divided_exponential(d)
            else:
                answer = (turn[k] - decay) / (s + rate)
            total += (coeff[k] * s * answer).real
    return total


@part
def moving(poly, coeff):  # type: ignore[no-untyped-def]
    """Whether an input changes within its piece."""
    if poly[1] != 0.0 or poly[2] != 0.0 or poly[3] != 0.0:
        return True
    found = False
    for k in range(len(coeff)):
        found = found or coeff[k] != 0.0
    return found


@part
def decay_and_loss(y):  # type: ignore[no-untyped-def]
    """exp(-y) and 1 - exp(-y), both to all digits, y >= 0."""
    decay = np.exp(-y)
    return decay, -np.expm1(-y) if y < 0.7 else 1.0 - decay


@part
def input_value(poly, coeff, exponent, x, order):  # type: ignore[no-untyped-def]
    """Value (order 0) or derivative of one input at local time x."""
    if order == 0:
        total = poly[0] + x * (poly[1] + x * (poly[2] + x * poly[3]))
    elif order == 1:
        total = poly[1] + x * (2.0 * poly[2] + x * 3.0 * poly[3])
    elif order == 2:
        total = 2.0 * poly[2] + x * 6.0 * poly[3]
    else:
        total = 6.0 * poly[3]
    for k in range(len(coeff)):
        if coeff[k] != 0.0:
            total += (coeff[k] * exponent[k] ** order * np.exp(exponent[k] * x)).real
    return total


@compiled
def fill_states(
    lengths, poly, coeff, exponent, before, rate, share, initial, worst, left, jump, ahead, reach
):  # type: ignore[no-untyped-def]
    """Fill inputs just before each break ``left`` (P, 3), their ``jump`` (P, 3), amplitudes before it ``ahead`` (P, M).

    ``reach`` (P, M): ``ahead`` with every term's magnitude, what its round-off is measured by.
    ``lengths`` (P - 1,); inputs ``poly`` (P, 3, 4), ``coeff``, ``exponent`` (P, 3, K); ``before`` (3,);
    ``rate`` (M,), ``share`` (M, 3), ``initial``, ``worst`` (M,) amplitudes just before the first break and their reach.
    """
    pieces, count = len(poly), len(rate)
    scratch, decays, losses = np.zeros(3), np.zeros(count), np.zeros(count)
    now, most = np.zeros(count), np.zeros(count)
    turn = np.zeros(coeff.shape[2], np.complex128)
    known, elapsed = -1.0, 0.0
    for i in range(3):
        left[0, i] = before[i]
    for n in range(count):
        ahead[0, n], reach[0, n] = initial[n], worst[n]
        now[n], most[n] = initial[n], worst[n]
    for p in range(pieces):
        for i in range(3):
            jump[p, i] = input_value(poly[p, i], coeff[p, i], exponent[p, i], 0.0, 0) - left[p, i]
            if jump[p, i] != 0.0:
                for n in range(count):
                    step = share[n, i] * jump[p, i]
                    now[n] -= step
                    most[n] += abs(step)
        if p + 1 == pieces:
            break
        x = lengths[p]
        elapsed += x
        # Equal steps of a table differ by the round-off of their times: one set of exponentials serves them.
        if abs(x - known) > 4e-16 * elapsed:
            known = x
            for n in range(count):
                decays[n], losses[n] = decay_and_loss(rate[n] * x)
        for n in range(count):
            now[n] *= decays[n]
            most[n] *= decays[n]
        for i in range(3):
            left[p + 1, i] = input_value(poly[p, i], coeff[p, i], exponent[p, i], x, 0)
            if moving(poly[p, i], coeff[p, i]):
                fill_turns(coeff[p, i], exponent[p, i], x, turn)
                for n in range(count):
                    push = share[n, i] * forced(
                        rate[n], decays[n], losses[n], poly[p, i], coeff[p, i], exponent[p, i], turn, x, scratch
                    )
                    now[n] -= push
                    most[n] += abs(push)
        for n in range(count):
            ahead[p + 1, n], reach[p + 1, n] = now[n], most[n]

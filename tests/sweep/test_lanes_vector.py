"""Sixteen numbers at once against NumPy, bit for bit."""

from __future__ import annotations

import numpy as np

from transient.compiled import compiled
from transient.march.lanes_vector import (
    HALF,
    WIDTH,
    fma,
    load,
    magnitude,
    splat,
    store,
    swapped,
    where_above,
)


@compiled
def everything(a, out):
    """Each operation on the rows of ``a`` (3, WIDTH), a row of ``out`` each."""
    x, y, z = load(a, 0), load(a, 1), load(a, 2)
    store(out, 0, x + y)
    store(out, 1, x - y)
    store(out, 2, x * y)
    store(out, 3, x / y)
    store(out, 4, fma(x, y, z))
    store(out, 5, magnitude(x))
    store(out, 6, swapped(x))
    store(out, 7, where_above(x, y, z, splat(2.5)))


def test_operations():
    a = np.random.default_rng(1).normal(size=(3, WIDTH))
    a[1, 3] = a[0, 3]  # neither is above the other
    out = np.empty((8, WIDTH))
    everything(a, out)
    x, y, z = a
    plain = [x + y, x - y, x * y, x / y, None, np.abs(x), np.roll(x, HALF), np.where(x > y, z, 2.5)]
    for row, expected in enumerate(plain):
        if expected is not None:
            np.testing.assert_array_equal(out[row], expected)
    exact = [float(np.longdouble(p) * np.longdouble(q) + np.longdouble(r)) for p, q, r in zip(x, y, z, strict=True)]
    np.testing.assert_allclose(out[4], exact, rtol=1e-15, atol=1e-17)

"""Eigenvalues and weights against handbook tables, Rayleigh's sums and 30-digit roots."""

from __future__ import annotations

import mpmath as mp
import numpy as np
import pytest

from transient.series.gapshape import FREE, GapShape
from transient.series.modes import modes, roots

PIPE = GapShape(1, 0.0, 0.0, 0.0, axis=True)


def annulus(metric: int, ratio: float) -> GapShape:
    return GapShape(metric, ratio / (1 - ratio), 0.0, 0.0)


def test_pipe_roots_are_the_zeros_of_j0() -> None:
    # Abramowitz & Stegun (1964), Table 9.5
    table = [2.4048255577, 5.5200781103, 8.6537279129, 11.7915344390, 14.9309177085]
    np.testing.assert_allclose(roots(PIPE, 5), table, rtol=0, atol=5.1e-11)


@pytest.mark.parametrize(
    ("metric", "ratio", "table"),
    [
        # Abramowitz & Stegun (1964), Table 9.7, (lambda - 1) x of the cross products of order 0 and 1; from memory
        (1, 1 / 2, [3.12303, 6.27344, 9.41821]),
        (1, 1 / 5, [3.05277, 6.22843, 9.38568]),
        (3, 1 / 2, [3.19658, 6.31235, 9.44446]),
        (3, 1 / 5, [3.38860, 6.44429, 9.54127]),
    ],
)
def test_annulus_roots_are_those_of_the_cross_products(metric: int, ratio: float, table: list[float]) -> None:
    np.testing.assert_allclose(roots(annulus(metric, ratio), 3), table, rtol=0, atol=5.1e-6)


@pytest.mark.parametrize("metric", [1, 3])
@pytest.mark.parametrize("ratio", [0.01, 0.3, 0.99, 0.9999])
def test_annulus_roots_hold_to_round_off_at_thirty_digits(metric: int, ratio: float) -> None:
    shape = annulus(metric, ratio)
    order = metric // 2
    a, b = mp.mpf(shape.a), mp.mpf(shape.a) + 1

    def cross(x: mp.mpf) -> mp.mpf:
        return mp.besselj(order, x * a) * mp.bessely(order, x * b) - mp.besselj(order, x * b) * mp.bessely(order, x * a)

    for n, found in ((1, roots(shape, 40)[0]), (2, roots(shape, 40)[1]), (40, roots(shape, 40)[39])):
        with mp.workdps(30):
            exact = mp.findroot(cross, (mp.mpf(found) * (1 - mp.mpf("1e-9")), mp.mpf(found) * (1 + mp.mpf("1e-9"))))
        assert abs(float(exact - mp.mpf(found))) < 6e-16 * found, n


@pytest.mark.parametrize(
    ("slip", "table"),
    [
        # x tan x = C, Essentials of Applied Mathematics for Scientists and Engineers, App. A, Table A.1: a shear-free
        # lower end and an upper wall that slips by 1/C gaps have the same characteristic equation
        (1 / 0.01, [0.0998, 3.1448, 6.2848, 9.4258]),
        (1 / 0.1, [0.3111, 3.1731, 6.2991, 9.4354]),
        (1.0, [0.8603, 3.4256, 6.4373, 9.5293]),
        (1 / 10, [1.4289, 4.3058, 7.2281, 10.2003]),
    ],
)
def test_plates_with_slip_have_the_roots_of_x_tan_x(slip: float, table: list[float]) -> None:
    np.testing.assert_allclose(roots(GapShape(0, 0.0, FREE, slip), 4), table, rtol=0, atol=5.1e-5)


def test_rayleigh_sums() -> None:
    # Watson, Theory of Bessel Functions, 15.51: sum 1/j0^2 = 1/4, sum 1/j0^4 = 1/32
    zeros = roots(PIPE, 2000)
    # what is left beyond N terms of zeros near (n - 1/4) pi, by the midpoint rule
    last = (2000 + 0.25) * np.pi
    assert (zeros**-2.0).sum() + 1 / (np.pi * last) == pytest.approx(1 / 4, abs=1e-11)
    assert (zeros**-4.0).sum() + 1 / (3 * np.pi * last**3) == pytest.approx(1 / 32, abs=1e-16)


CONDITIONS = [(0.0, 0.0), (0.0, FREE), (FREE, 0.0), (0.2, 0.0), (0.3, 5.0), (FREE, 40.0), (7.0, FREE), (0.05, 40.0)]


@pytest.mark.parametrize("ends", CONDITIONS)
@pytest.mark.parametrize(("metric", "a"), [(0, 0.0), (1, 0.0101), (1, 0.7), (3, 0.0101), (3, 0.7), (3, 250.0)])
def test_modes_meet_their_conditions_and_are_orthogonal(metric: int, a: float, ends: tuple[float, float]) -> None:
    shape = GapShape(metric, a, *ends)
    kept = modes(shape, 7)
    assert kept.doubt < 2e-13
    # Gauss-Legendre in log(r) where the inner cylinder is thin, in r elsewhere
    x, weight = np.polynomial.legendre.leggauss(150)
    if 0 < a < 0.1:
        y = a * np.expm1(0.5 * (x + 1) * np.log(shape.b / a))
        weight = 0.5 * weight * np.log(shape.b / a) * (a + y)
    else:
        y, weight = 0.5 * (x + 1), 0.5 * weight
    phi = kept.velocity(y)
    gram = phi * (weight * (a + y) ** metric) @ phi.T
    size = np.sqrt(np.diag(gram))
    np.testing.assert_allclose(gram / np.outer(size, size), np.eye(7), atol=2e-13 + 20 * kept.doubt)
    assert (np.diff(kept.root) > 0.9 * np.pi / 2).all()
    # the n-th mode has n - 1 zeros inside: none was missed
    dense = kept.velocity(np.linspace(1e-6, 1 - 1e-6, 4001))
    assert [(row[1:] * row[:-1] < 0).sum() for row in dense] == list(range(7))

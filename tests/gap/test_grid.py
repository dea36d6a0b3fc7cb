"""The grid's geometry against integrals, and what follows for any profile."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad

from transient.gap.grid import build, spacing

GRADINGS = [(1.0, 1.0), (0.02, 0.3), (1e-4, 1e-5)]
ENDS = {0: (0.0, 2.0), 1: (0.3, 0.9), 3: (0.3, 0.9)}


@pytest.mark.parametrize("layers", GRADINGS)
def test_doubling_the_cells_keeps_every_node(layers):
    coarse, fine = spacing(24, *layers), spacing(48, *layers)
    for near, far in zip(coarse, fine, strict=True):
        np.testing.assert_allclose(far[::2], near, rtol=1e-13)


@pytest.mark.parametrize("layers", GRADINGS)
def test_distances_from_both_walls_add_up_and_cells_grow_steadily(layers):
    low, high = spacing(60, *layers)
    np.testing.assert_allclose(low + high, 1.0, rtol=1e-14)
    step = np.where(low[1:] < 0.5, np.diff(low), -np.diff(high))
    assert (step > 0).all()
    growth = step[1:] / step[:-1]
    limit = (np.log1p(1 / layers[0]) + np.log1p(1 / layers[1])) / 60
    assert np.exp(-1.1 * limit) < growth.min() <= growth.max() < np.exp(1.1 * limit)
    # the end cells are the mapping's spacing over the density of nodes there, to first order
    a, b = layers
    assert step[0] == pytest.approx(limit / (1.0 / a + 1.0 / (1.0 + b)), rel=limit)
    assert step[-1] == pytest.approx(limit / (1.0 / b + 1.0 / (1.0 + a)), rel=limit)


@pytest.mark.parametrize("metric", [0, 1, 3])
@pytest.mark.parametrize("layers", GRADINGS)
def test_conductances_and_volumes_are_their_integrals(metric, layers):
    inner, outer = ENDS[metric]
    grid = build(metric, inner, outer, 17, layers)
    for i in range(17):
        low, high = grid.radius[i : i + 2]
        if grid.step[i] < 1e-3:
            continue  # here the nodes' difference has fewer digits than the step that is kept
        resistance = quad(lambda r: r**-metric, low, high, epsabs=0, epsrel=1e-13)[0]
        assert grid.conductance[i] * resistance == pytest.approx(1.0, abs=1e-11)
    whole = (outer ** (metric + 1) - inner ** (metric + 1)) / (metric + 1)
    assert grid.volume.sum() == pytest.approx(whole, rel=1e-13)
    assert (grid.volume > 0).all()
    assert grid.step.sum() == pytest.approx(outer - inner, rel=1e-14)


@pytest.mark.parametrize("clearance", [1e-4, 1e-8])
def test_nearly_closed_annuli_have_the_grid_of_plates(clearance):
    plates = build(0, 0.0, clearance, 20, (0.1, 0.1))
    for metric in (1, 3):
        ring = build(metric, 1.0, 1.0 + clearance, 20, (0.1, 0.1))
        for name in ("conductance", "volume"):
            ratio = getattr(ring, name) / getattr(plates, name)
            np.testing.assert_allclose(ratio, 1.0, atol=4.0 * clearance + 1e-12)


@pytest.mark.parametrize(("metric", "inner"), [(0, 0.0), (1, 0.0), (1, 0.3), (3, 0.3)])
def test_the_mean_of_a_smooth_profile_converges_with_order_four(metric, inner):
    outer = inner + 0.8

    def profile(r):
        return np.cos(3.0 * r * r) + 0.2

    measure = {0: lambda r: 1.0, 1: lambda r: r, 3: lambda r: r}[metric]
    area = outer - inner if metric in (0, 3) else quad(measure, inner, outer)[0]
    exact = quad(lambda r: measure(r) * profile(r), inner, outer, epsabs=1e-14)[0] / area
    error = []
    for cells in (16, 32, 64):
        grid = build(metric, inner, outer, cells, (1.0, 1.0))
        error.append(abs(grid.mean_weight @ profile(grid.radius) - exact))
    order = np.log2(np.array(error[:-1]) / error[1:])
    assert order.min() > 2.9  # the end cells borrow their curvature: third order there, fourth inside
    assert error[-1] < 1e-5


@pytest.mark.parametrize("metric", [0, 1])
def test_the_mean_of_a_constant_is_the_constant(metric):
    for layers in GRADINGS:
        grid = build(metric, *ENDS[metric], 13, layers)
        assert grid.mean_weight.sum() == pytest.approx(1.0, rel=1e-13)


def test_the_mean_of_a_rigid_rotation_is_the_speed_at_the_middle_radius():
    grid = build(3, 0.3, 0.9, 13, (0.1, 0.02))
    # tangential speed r averaged over the radius
    assert grid.mean_weight.sum() == pytest.approx(0.6, rel=1e-13)

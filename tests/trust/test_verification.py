"""The installation check: complete, passing, and able to fail; its own textbook sums against other forms."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from scipy.special import erfc

from transient.answer import solve
from transient.drive import KINDS
from transient.gap.problem import LOWER, PRESSURE, UPPER, Law
from transient.march import march as room
from transient.trust import verification
from transient.trust.verification import gaps, kinds, motion, order, starting, steady
from transient.trust.verification.row import row
from transient.trust.verification.solved import Bench
from transient.trust.verification.textbook import SERIES, Textbook

BENCH = Bench(solve)


@pytest.fixture(scope="module")
def rows():
    return verification.verify(solve)


def test_everything_passes(rows):
    failed = [(r.name, r.worst, r.limit) for r in rows if not r.passed]
    assert not failed


def test_names_are_unique_and_every_row_has_a_source(rows):
    assert len({r.name for r in rows}) == len(rows)
    assert 60 <= len(rows) <= 150
    assert all(r.source and r.limit > 0.0 and r.worst >= 0.0 for r in rows)


def test_all_shapes_inputs_kinds_and_starts_are_there(rows):
    names = [r.name for r in rows]
    for shape in gaps.SHAPES:
        own = [name for name in names if name.startswith(f"{shape}: ")]
        for index in gaps.driven(shape):
            assert any(f"{gaps.input_name(shape, index)} starts suddenly" in name for name in own)
        for twin in kinds.TWINS:
            assert any(twin.name in name and "start " in name for name in own), (shape, twin.name)
        for start in ("start rest", "start steady"):
            assert any(name.endswith(start) for name in own)
    # the list of restated kinds is that of the product: a table counts twice
    assert len(kinds.TWINS) == len(KINDS) + 1


def wrong_viscosity(monkeypatch, share):
    true = room.assemble
    monkeypatch.setattr(
        room, "assemble", lambda case, *more: true(replace(case, law=Law(0, ((1.0 + share) * case.viscosity,))), *more)
    )


def test_a_wrong_viscosity_in_the_march_is_seen_by_each_family(monkeypatch):
    wrong_viscosity(monkeypatch, 0.01)
    for family in (steady.steadies, starting.startups, starting.refined_alone, order.balances):
        assert any(not r.passed for r in family(BENCH)), family.__name__


def test_a_wrong_history_is_seen(monkeypatch):
    """A ramp that the product compiles 2 % too long: a comparison with itself would not notice."""
    kind = KINDS["ramp"]
    slow = replace(kind, build=lambda **keys: kind.build(**{**keys, "over": 1.02 * keys["over"]}))
    monkeypatch.setitem(KINDS, "ramp", slow)
    failed = [r.name for r in starting.startups(BENCH) if not r.passed]
    assert failed
    assert all("ramps up" in name or "stated error" in name for name in failed)


def test_errors_stated_too_small_are_seen():
    def boastful(problem, judge):
        found = solve(problem, judge)
        errors = found.run.errors
        small = replace(errors, stress=errors.stress / 3.0, mean=errors.mean / 3.0, peak=errors.peak / 3.0)
        return replace(found, run=replace(found.run, errors=small))

    failed = [r.name for r in starting.startups(Bench(boastful)) if not r.passed]
    assert len(failed) == len(gaps.SHAPES)
    assert all("stated error" in name for name in failed)


def test_a_march_of_first_order_is_seen(monkeypatch):
    true = order._stress
    monkeypatch.setattr(order, "_stress", lambda problem, cells, steps: true(problem, cells, steps) * (1 + 0.1 / cells))
    assert any(not r.passed for r in order.orders(BENCH) if "space" in r.name)


def test_what_is_no_number_does_not_pass():
    assert not row("planted", float("nan"), 1.0, "none").passed
    assert not row("planted", float("inf"), 1.0, "none").passed
    assert row("at its limit", 1.0, 1.0, "none").passed


# --- the textbook sums themselves ---


def book(shape, index, drive_motion, y, **more):
    return Textbook(gaps.gap(shape, {}, **more), {index: drive_motion}, y)


def test_couette_sums_against_images():
    # error-function form of the same start (Schlichting, from memory); table of both stresses (computed)
    problem = gaps.gap("plates", {})
    h, tau = problem.gap, problem.diffusion_time
    shear = problem.viscosity / h
    table = {0.1: (1.784286114, 0.2928996518), 0.5: (1.014383772, 0.9856162386)}
    for age, (moving, fixed) in table.items():
        found = book("plates", UPPER, motion.held(1.0), np.array([0.5 * h])).at(np.array([age * tau]))[0]
        n = np.arange(20)
        images = (erfc((2 * n + 0.5) / (2 * age**0.5)) - erfc((2 * n + 1.5) / (2 * age**0.5))).sum()
        assert found[3] == pytest.approx(images, abs=1e-12)
        assert found[:2] / shear == pytest.approx([fixed, -moving], abs=6e-10)


def test_pipe_and_plates_pressure_spot_values():
    # Szymanski (1932) at nu t / a^2 = 0.1: centre, flow, stress as shares of the steady values (computed)
    for shape, width, share, centre, expected in (
        ("pipe", 1.0, 0.1, 0.0, (0.385189504, 0.461754458, 0.605824194)),
        ("plates", 1.0, 0.025, 0.5, (0.197746365, 0.228635068, 0.356823400)),
    ):
        problem = gaps.gap(shape, {})
        flow = book(shape, PRESSURE, motion.held(1.0), np.array([centre * problem.gap * width]))
        early, late = flow.at(np.array([share, 20.0]) * problem.diffusion_time)
        pick = [3, 2, 1]
        assert early[pick] / late[pick] == pytest.approx(expected, abs=6e-10)


def test_roots_in_annuli():
    # Abramowitz & Stegun (1964), Table 9.7, (ratio - 1) x root, ratio 2; digits from memory
    from transient.trust.verification.round import _cross_zeros

    for bessel, table in ((0, (3.12303, 6.27344, 9.41821)), (1, (3.19658, 6.31235, 9.44446))):
        assert _cross_zeros(bessel, 1.0, 2.0, 3)[0] == pytest.approx(table, abs=6e-6)


@pytest.mark.parametrize(("shape", "index"), [key for key in SERIES if "," not in key[0]])
def test_sums_start_from_rest_and_end_steady(shape, index):
    # identity: the modes cancel the steady profile at first; away from the walls a pressure alone accelerates the fluid
    problem = gaps.gap(shape, {})
    y = problem.inner + problem.gap * np.array([0.3, 0.5, 0.8])
    start = SERIES[shape, index](problem, y, 400)
    age = 1e-4 * problem.diffusion_time
    early = start.answer(motion.held(1.0), np.array([age]))[0]
    free = age / problem.density if index == PRESSURE else 0.0
    np.testing.assert_allclose(early[3:], free, rtol=1e-10, atol=1e-12 * np.abs(start.steady[3:]).max())
    late = start.answer(motion.held(1.0), np.array([50.0 * problem.diffusion_time]))[0]
    np.testing.assert_allclose(late, start.steady, rtol=1e-14, atol=1e-100)


@pytest.mark.parametrize("twin", kinds.TWINS, ids=lambda twin: twin.name)
def test_restated_histories_against_plain_quadrature(twin):
    """Value, rate and answer of a mode by definition: integrals by Gauss rule on many small pieces."""
    _, restated = twin.build(1.0, 1.0)
    restated = restated.from_rest()
    edges = np.unique(np.concatenate([np.linspace(0.0, 1.3, 400), restated.breaks()[restated.breaks() < 1.3]]))
    x, weight = np.polynomial.legendre.leggauss(5)
    middle, half = 0.5 * (edges[1:] + edges[:-1]), 0.5 * np.diff(edges)
    s, w = (middle[:, None] + half[:, None] * x).ravel(), (half[:, None] * weight).ravel()
    jumps = [(at, height) for at, height in restated.jumps if at < 1.3]
    value = (w * restated.rate(s)).sum() + sum(height for _, height in jumps)
    assert restated.value(np.array([1.3]))[0] == pytest.approx(value, abs=1e-12)
    for decay in (0.7, 40.0):
        answer = (w * restated.rate(s) * np.exp(-decay * (1.3 - s))).sum()
        answer += sum(height * np.exp(-decay * (1.3 - at)) for at, height in jumps)
        assert restated.faded(np.array([1.3]), np.array([decay]))[0, 0] == pytest.approx(answer, abs=1e-12)


def test_lower_and_upper_plate_mirror_each_other():
    problem = gaps.gap("plates", {})
    y = problem.gap * np.array([0.25])
    low = SERIES["plates", LOWER](problem, y, 50)
    up = SERIES["plates", UPPER](problem, problem.gap - y, 50)
    t = np.array([0.2 * problem.diffusion_time])
    np.testing.assert_allclose(low.answer(motion.held(1.0), t)[0], up.answer(motion.held(1.0), t)[0][[1, 0, 2, 3]])

"""Sudden and ramped start-ups of every input of every shape: stored rows, headline numbers, stated errors."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from transient.gap.problem import PRESSURE, UPPER, Problem
from transient.trust.verification import motion
from transient.trust.verification.compared import headline_numbers, histories
from transient.trust.verification.gaps import SHAPES, diffusion_time, driven, gap, input_name, size
from transient.trust.verification.kinds import build, sudden
from transient.trust.verification.motion import Motion
from transient.trust.verification.row import Row, row
from transient.trust.verification.solved import REFINEMENT, Bench, Marched
from transient.trust.verification.textbook import SERIES, Textbook

ACCURACY, FINE = 1e-3, 1e-5
JUMP_LIMIT = 1e-11
HOLDS = "stated errors against the series named above"
STOKES = "infinite stress after a jump: Stokes (1851), sqrt(density viscosity / pi) x speed"


def startups(bench: Bench) -> Iterator[Row]:
    """Rows of all shapes."""
    for shape in SHAPES:
        yield from _shape(bench, shape)


def _shape(bench: Bench, shape: str) -> Iterator[Row]:
    time, stated = diffusion_time(shape), []
    for index in driven(shape):
        drive, restated = sudden(size(shape, index), time)
        name = f"{shape}: {input_name(shape, index)} starts suddenly"
        rows, ratio = _case(bench, name, gap(shape, {index: drive}, accuracy=ACCURACY), {index: restated})
        yield from rows
        stated.append(ratio)
    for share, accuracy in ((0.02, ACCURACY), (0.5, FINE)):
        index = UPPER if accuracy == ACCURACY or PRESSURE not in driven(shape) else PRESSURE
        to, over = size(shape, index), share * time
        problem = gap(shape, {index: build("ramp", to=to, over=over)}, accuracy=accuracy)
        name = f"{shape}: {input_name(shape, index)} ramps up in {share:g} diffusion times"
        rows, ratio = _case(bench, name, problem, {index: motion.ramp(to, over)})
        yield from rows
        stated.append(ratio)
    yield row(f"{shape}: worst difference over its stated error, five numbers a start-up", max(stated), 1.0, HOLDS)
    yield _jump(bench, shape)


def _case(bench: Bench, name: str, problem: Problem, motions: dict[int, Motion]) -> tuple[list[Row], float]:
    marched = bench.solve(problem)
    stored, numbers = histories(marched, motions), headline_numbers(marched, motions)
    source = _source(marched, motions)
    rows = [
        row(f"{name}: stress, mean velocity, profiles over time", stored.stored, problem.accuracy, source),
        row(f"{name}: peak and final stress, settling times", numbers.stored, problem.accuracy, source),
    ]
    return rows, max(stored.stated, numbers.stated)


def _source(marched: Marched, motions: dict[int, Motion]) -> str:
    return Textbook(marched.problem, motions, np.array([marched.problem.outer]), 2).source


def _jump(bench: Bench, shape: str) -> Row:
    """The law of the infinite stress that a suddenly started wall feels."""
    speed = size(shape, UPPER)
    problem = gap(shape, {UPPER: sudden(speed, 1.0)[0]}, accuracy=0.05)
    surface = speed * (problem.outer if problem.rotating else 1.0)
    exact = np.sqrt(problem.density * problem.viscosity / np.pi) * surface
    found = bench.solve(problem).run.unbounded[UPPER]
    off = abs(found / exact - 1.0)
    return row(f"{shape}: coefficient of the infinite stress of a sudden start", off, JUMP_LIMIT, STOKES)


def refined_alone(bench: Bench) -> Iterator[Row]:
    """Errors stated from refinement alone, as for cases without a series, against the textbook."""
    for shape in SHAPES:
        time, worst = diffusion_time(shape), []
        for index in driven(shape):
            to, over = size(shape, index), 0.1 * time
            restated = {index: motion.ramp(to, over)}
            marched = bench.solve(gap(shape, {index: build("ramp", to=to, over=over)}), REFINEMENT)
            worst += [histories(marched, restated).stated, headline_numbers(marched, restated).stated]
        name = f"{shape}: worst difference over the error that refinement alone states"
        sources = "; ".join(dict.fromkeys(_sources(shape)))
        yield row(name, max(worst), 1.0, sources)


def _sources(shape: str) -> list[str]:
    problem = gap(shape, {})
    place = np.array([problem.outer])
    return [SERIES[shape, index](problem, place, 2).source for index in driven(shape)]

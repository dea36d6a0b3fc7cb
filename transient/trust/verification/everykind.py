"""Every history kind on every shape, from rest and from steady flow, against series superposed over the history."""

from __future__ import annotations

from collections.abc import Iterator

import numpy as np

from transient.trust.verification.compared import general_series, histories, series_itself
from transient.trust.verification.gaps import SHAPES, diffusion_time, driven, gap, input_name, size
from transient.trust.verification.kinds import TWINS, UNTIL
from transient.trust.verification.row import Row, row
from transient.trust.verification.solved import Bench
from transient.trust.verification.textbook import Textbook

ACCURACY = 1e-3
SERIES_LIMIT = 2e-7  # what 400 terms of the textbook sums are good for
GENERAL = "the product's own general series (eigenfunctions and Laplace contours)"


def every_kind(bench: Bench) -> Iterator[Row]:
    """Two histories a case, on two inputs at once: each kind once a shape, on walls and pressure in turn."""
    for number, shape in enumerate(SHAPES):
        yield from _shape(bench, shape, number)


def _shape(bench: Bench, shape: str, number: int) -> Iterator[Row]:
    time, until = diffusion_time(shape), UNTIL * diffusion_time(shape)
    half = len(TWINS) // 2
    stated, general, series = [], [], []
    first, second = driven(shape)[-2:]
    if number % 2:
        first, second = second, first
    for turn in range(half):
        pair = {first: TWINS[turn], second: TWINS[turn + half]}
        twins = {index: twin.build(size(shape, index), time) for index, twin in pair.items()}
        start = ("rest", "steady")[(turn + number) % 2]
        drives = {index: drive for index, (drive, _) in twins.items()}
        motions = {index: restated for index, (_, restated) in twins.items()}
        problem = gap(shape, drives, start=start, duration=until, accuracy=ACCURACY)
        marched = bench.solve(problem)
        found = histories(marched, motions)
        words = ", ".join(f"{input_name(shape, index)} {twin.name}" for index, twin in pair.items())
        source = Textbook(problem, motions, np.array([problem.outer]), 2).source + "; superposed"
        yield row(f"{shape}: {words}; start {start}", found.stored, ACCURACY, source)
        stated.append(found.stated)
        general.append(general_series(marched))
        series.append(series_itself(problem, motions, until))
    same = "the same series"
    yield row(f"{shape}: worst difference over its stated error, all histories", max(stated), 1.0, same)
    yield row(f"{shape}: march against the general series, all histories", max(general), ACCURACY, GENERAL)
    yield row(f"{shape}: general series against the textbooks, all histories", max(series), SERIES_LIMIT, same)

"""Walls that slip or hold no shear: series of the textbooks, and the general series where there is none."""

from __future__ import annotations

from collections.abc import Iterator

from transient.gap.problem import PRESSURE, UPPER
from transient.trust.verification import motion, plane
from transient.trust.verification.compared import general_series, headline_numbers, histories
from transient.trust.verification.everykind import GENERAL
from transient.trust.verification.gaps import SHAPES, diffusion_time, gap, size
from transient.trust.verification.kinds import build
from transient.trust.verification.row import Row, row
from transient.trust.verification.solved import Bench

ACCURACY = 1e-3
SLIP = 0.1  # slip length over gap


def other_walls(bench: Bench) -> Iterator[Row]:
    """Rows of all cases."""
    time = diffusion_time("plates")
    for name, series, index, source, keys in (
        ("plates, lower side shear-free: upper wall", "plates, shear-free below", UPPER, plane.FREE,
         {"kinds": ("shear_free", "moving")}),
        ("plates, slip on both walls: pressure", "plates, slip on both", PRESSURE, plane.SLIP,
         {"slips": (SLIP * _gap("plates"), SLIP * _gap("plates"))}),
    ):  # fmt: skip
        to, over = size("plates", index), 0.1 * time
        marched = bench.solve(gap("plates", {index: build("ramp", to=to, over=over)}, accuracy=ACCURACY, **keys))
        motions = {index: motion.ramp(to, over)}
        stored, numbers = histories(marched, motions, series), headline_numbers(marched, motions, series)
        yield row(f"{name} ramps up: stress, mean velocity, profiles over time", stored.stored, ACCURACY, source)
        yield row(f"{name} ramps up: peak and final stress, settling times", numbers.stored, ACCURACY, source)
        stated = max(stored.stated, numbers.stated)
        yield row(f"{name} ramps up: worst difference over its stated error", stated, 1.0, source)
    for shape in SHAPES:
        slip = SLIP * _gap(shape)
        drive = build("ramp", to=size(shape, UPPER), over=0.1 * diffusion_time(shape))
        slips = (0.0 if shape == "pipe" else slip, 0.5 * slip)
        marched = bench.solve(gap(shape, {UPPER: drive}, slips=slips, accuracy=ACCURACY))
        yield row(f"{shape}, walls that slip: outer or upper wall ramps up", general_series(marched), ACCURACY, GENERAL)


def _gap(shape: str) -> float:
    return gap(shape, {}).gap

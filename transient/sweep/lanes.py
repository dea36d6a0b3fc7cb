"""Many linear cases with prescribed walls or pressure, marched side by side in the lanes of the vector unit.

The march, its scheme and its three levels are in ``march.lanes``; the errors are those of refinement
(``lanes_headline``).  A row whose errors do not meet the accuracy is marched again, finer, and left open if that does
not help: then the next runner solves it alone.  Everything between the values and the columns is arithmetic on arrays
over the rows or compiled.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from transient.case.model import Case
from transient.gap.problem import Problem
from transient.march import lanes_layout as layout
from transient.march.lanes import march
from transient.march.lanes_inputs import FOLLOW, GROWTH, PIECE_FIELDS, START, join, rise_times
from transient.march.lanes_vector import HALF
from transient.sweep import lanes_headline as headline
from transient.sweep.columns import Column, Columns, blank
from transient.sweep.keys import Values, Varied
from transient.sweep.lanes_batch import Batch, Grids, batch_of, grids_of
from transient.sweep.lanes_columns import Done, infinite_stress, write
from transient.sweep.lanes_drives import DriveRows
from transient.sweep.lanes_facts import Facts, facts_of
from transient.sweep.lanes_form import Form

CELLS = 0.40  # growth of the base level's cells, at accuracy 1e-3
FEWEST = 8
THINNEST = 14  # layers thinner than 2^-14 of the gap are left to the march of single cases
MOST_ROWS = 8000  # of one case
KEPT = 25_000  # rows kept at a time
TOGETHER = 256  # cases whose rows are kept at a time: about what the second cache holds
PIECES = 100_000  # pieces of drives kept at a time
REFINEMENTS = (1.0, 2.0, 4.0)


def takes(base: Case, keys: Sequence[Varied]) -> bool:
    """Whether rows of this form can be marched here: linear, walls' speeds or pressure prescribed, a steady end."""
    return Form(base, keys).fits


def solve(base: Case, keys: Sequence[Varied], values: Values, columns: Sequence[Column]) -> Columns:
    """Columns of all rows; ``values`` (n,) each in SI.  Rows without a trusted answer are left open."""
    form = Form(base, keys)
    rows = len(next(iter(values.values()))) if values else 1
    out = blank(columns, rows)
    chunk = max(64, PIECES // form.pieces)
    for first in range(0, rows, chunk):
        part = slice(first, min(first + chunk, rows))
        own = {name: np.asarray(array)[part] for name, array in values.items()}
        _solve(form, own, part, out, {column.name for column in columns})
    return out


def _solve(form: Form, values: Values, part: slice, out: Columns, names: set[str]) -> None:
    rows = len(next(iter(values.values()))) if values else 1
    batch, good = batch_of(form, values, rows)
    waiting = np.flatnonzero(good)
    for refine in REFINEMENTS:
        if len(waiting) == 0:
            return
        done = _attempt(form, batch, waiting, refine)
        met = write(form.problem, batch, waiting, done, part.start, out, names)
        waiting = waiting[~met]


def _attempt(form: Form, batch: Batch, rows: np.ndarray, refine: float) -> Done:
    problem = form.problem
    fine = (min(problem.accuracy, 0.02) / 1e-3) ** 0.25 / refine
    most = sum(drive.starts.shape[1] for drive in batch.drives)
    n = len(rows)
    pieces = np.zeros(n, np.int64)
    part_of = np.zeros((n, most, PIECE_FIELDS))
    poly, wave = np.zeros((n, most, 3, 4)), np.zeros((n, most, 3, 4))
    jump, kick, layer = np.zeros((n, most, 3)), np.zeros((n, most, 3)), np.zeros((n, 2))
    flowing = problem.flow is not None
    before = batch.before[rows].copy()
    starts, own_poly, own_wave = _together(batch.drives, rows)
    inertia = np.zeros((n, 2))
    if batch.bodies is not None:
        inertia[:, batch.bodies.side] = batch.bodies.inertia[rows]
    join(
        starts, own_poly, own_wave, before, batch.until[rows], batch.time[rows], batch.scale[rows], inertia,
        np.full(n, fine), flowing, pieces, part_of, poly, wave, jump, kick, layer,
    )  # fmt: skip
    used = int(pieces.max())
    part_of, poly, wave, jump, kick = (array[:, :used] for array in (part_of, poly, wave, jump, kick))
    waving = bool(np.any(wave[:, :, :, :2]))
    numbers = np.zeros((n, layout.CASE_FIELDS))
    slowest = batch.slowest[rows]
    least = 0.1 * np.minimum(batch.within[rows], min(problem.accuracy, 0.01))
    numbers[:, layout.LONGEST] = FOLLOW * fine * slowest
    numbers[:, layout.CALM] = np.log(1.0 / least) * slowest
    numbers[:, layout.GROWTH] = GROWTH * fine
    numbers[:, layout.ROOM] = _room(pieces, fine)
    infinite = infinite_stress(problem, jump)
    out = np.full((n, headline.QUANTITIES, headline.NUMBERS), np.nan)
    seen = np.zeros((n, headline.SEEN))
    order, borders, layers = _groups(problem, batch, rows, layer)
    for first, stop, (low, high) in zip(borders[:-1], borders[1:], layers, strict=True):
        if max(low, high) > THINNEST:
            continue
        group = order[first:stop]
        cells = _cells(2.0**-low, 2.0**-high, fine)
        together = int(np.clip(KEPT // numbers[group, layout.ROOM].max(), HALF, TOGETHER))
        for begin in range(0, len(group), together):
            of = group[begin : begin + together]
            grids = grids_of(batch, rows[of], cells, (2.0**-low, 2.0**-high))
            facts = facts_of(batch, rows[of], grids)
            out[of], seen[of] = _march(
                problem, grids, numbers[of], pieces[of], part_of[of], poly[of], wave[of], jump[of], kick[of],
                before[of], batch.final[rows[of]], waving, infinite[of], facts,
            )  # fmt: skip
    rise = _rises(problem, pieces, part_of, poly, wave, jump)
    if flowing:  # a sudden motion makes the pressure infinite: left to the march of single cases
        out[(jump != 0.0).any(axis=(1, 2))] = np.nan
    return Done(out, seen, jump, part_of[:, :, START], rise)


def _rises(
    problem: Problem, pieces: np.ndarray, part_of: np.ndarray, poly: np.ndarray, wave: np.ndarray, jump: np.ndarray
) -> np.ndarray:
    """Shortest rise (n,) of what changes the pressure, in diffusion times: of the pressure, or of a prescribed flow
    and the walls."""
    rise = np.full(len(pieces), np.inf)
    for which in (2,) if problem.flow is None else (0, 1, 2):
        if problem.length is not None and (poly[:, :, which].any() or wave[:, :, which, :2].any()):
            one = np.empty_like(rise)
            rise_times(which, pieces, part_of, poly, wave, jump, one)
            rise = np.minimum(rise, one)
    return rise


def _room(pieces: np.ndarray, fine: float) -> np.ndarray:
    """Room for the rows (n,) of cases of so many pieces (n,)."""
    return np.minimum(MOST_ROWS, np.ceil((40 + 44 * pieces) / fine))


def _together(
    drives: tuple[DriveRows, DriveRows, DriveRows], rows: np.ndarray
) -> tuple[np.ndarray, np.ndarray, np.ndarray]:
    """The three drives' pieces in common arrays, [n or 1, 3, P(, 4)]; those that one does not have never begin."""
    alike = all(drive.starts.shape[0] == 1 for drive in drives)
    n = 1 if alike else len(rows)
    most = max(drive.starts.shape[1] for drive in drives)
    starts = np.full((n, 3, most), np.inf)
    poly, wave = np.zeros((n, 3, most, 4)), np.zeros((n, 3, most, 4))
    for which, drive in enumerate(drives):
        own = slice(None) if drive.starts.shape[0] == 1 else rows
        count = drive.starts.shape[1]
        starts[:, which, :count] = drive.starts[own]
        poly[:, which, :count] = drive.poly[own]
        wave[:, which, :count] = drive.wave[own]
    return starts, poly, wave


def _groups(
    problem: Problem, batch: Batch, rows: np.ndarray, layer: np.ndarray
) -> tuple[np.ndarray, np.ndarray, list[tuple[int, int]]]:
    """Rows of equal layers together: their order, borders in it, and each group's layers as powers of a half."""
    halvings = np.empty((len(rows), 2), np.int64)
    for end, radius in enumerate((batch.geometry.inner[rows], batch.geometry.outer[rows])):
        limit = np.ones(len(rows))
        if problem.metric and problem.walls[end].kind != "axis":
            limit = 0.5 * radius / batch.geometry.gap[rows]
        moving = problem.walls[end].kind == "moving"
        finest = np.minimum(layer[:, end] if moving else 1.0, np.minimum(limit, 1.0))
        with np.errstate(divide="ignore"):
            halvings[:, end] = np.clip(np.ceil(-np.log2(finest) - 1e-9), 0, THINNEST + 1).astype(int)
    key = halvings[:, 0] * 64 + halvings[:, 1]
    order = np.argsort(key, kind="stable")
    borders = np.flatnonzero(np.diff(key[order], prepend=-1))
    layers = [(int(k) // 64, int(k) % 64) for k in key[order][borders]]
    return order, np.append(borders, len(rows)), layers


def _cells(low: float, high: float, fine: float) -> int:
    """Cells of the base level, an even number."""
    along = np.log1p(1.0 / low) + np.log1p(1.0 / high)
    return max(FEWEST, 2 * int(np.ceil(0.5 * along / (CELLS * fine))))


def _march(
    problem: Problem, grids: Grids, numbers: np.ndarray, pieces: np.ndarray, part_of: np.ndarray,
    poly: np.ndarray, wave: np.ndarray, jump: np.ndarray, kick: np.ndarray, before: np.ndarray, final: np.ndarray,
    waving: bool, infinite: np.ndarray, facts: Facts,
) -> tuple[np.ndarray, np.ndarray]:  # fmt: skip
    """Headline numbers [n, QUANTITIES, NUMBERS] and [n, SEEN] of cases on grids of the same number of nodes."""
    n = len(pieces)
    most = int(numbers[:, layout.ROOM].max())
    levels = []
    row_piece, row_offset = np.zeros((n, most), np.int64), np.zeros((n, most))
    count = np.zeros(n, np.int64)
    for level, (table, ends) in enumerate(grids.levels):
        rows = np.empty((n, most, layout.FIELDS))
        march(
            table, ends, grids.of, numbers, pieces, part_of, poly, wave, jump, before, final, 2**level, waving,
            problem.flow is not None, kick,
            rows, row_piece, row_offset, count,
        )  # fmt: skip
        levels.append(rows)
    out, seen = np.empty((n, headline.QUANTITIES, headline.NUMBERS)), np.zeros((n, headline.SEEN))
    free = np.array([*(wall.kind != "moving" for wall in problem.walls), False, False, False])
    held = np.array([{"moving": 1, "shear_free": 0, "axis": -1}[wall.kind] for wall in problem.walls])
    headline.read(
        *levels, row_piece, row_offset, count, part_of[:, :, START].copy(), infinite, facts.ends, free, held,
        facts.calm, facts.final, facts.reach, facts.middle, out, seen,
    )  # fmt: skip
    return out, seen


__all__ = ["solve", "takes"]

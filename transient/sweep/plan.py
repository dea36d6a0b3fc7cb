"""Which cases a sweep solves: the grid of [vary] and listed rows, times the samples of [scatter]."""

from __future__ import annotations

import itertools
import os
import tomllib
from collections.abc import Mapping
from dataclasses import dataclass
from math import prod
from pathlib import Path as FilePath
from typing import Any

import numpy as np

from transient.case.keys import TABLE_FILE
from transient.case.model import Case, CaseError
from transient.case.read import read_case
from transient.case.source import Source
from transient.sweep import listed
from transient.sweep.axes import Axis, Range, axis, read_range
from transient.sweep.chunk import Frame
from transient.sweep.columns import Column, layout, together
from transient.sweep.facts import Facts, learn
from transient.sweep.keys import Values, Varied
from transient.sweep.runners import runners
from transient.sweep.scatter import Scatter, Tolerance, read_settings, read_tolerance, scatter
from transient.sweep.stated import Stated, read_stated, state

MOST_CASES = 10_000_000
BYTES_SUMMED = 60  # of each case that the closing summary holds at once
TABLE_KEYS = tuple(key.name for key in TABLE_FILE)
MOST_FORMS = 64  # combinations of choices that are looked at for the columns they bring
# Rows of a chunk: what a kill may cost, against the cost of a file each.
ALONE, TOGETHER = (16, 256), (256, 8192)
WANTED_CHUNKS = {ALONE: 2000, TOGETHER: 64}


@dataclass(frozen=True, eq=False)
class Plan:
    """``rows`` cases: every combination of the places of ``axes`` (the last one fastest), ``scatter`` at each.

    ``stated`` tells one sweep from another: plain values of all that decides its numbers.
    """

    title: str
    frame: Frame
    axes: tuple[Axis, ...]
    scatter: Scatter | None
    stated: dict[str, Any]
    chunk: int

    @property
    def samples(self) -> int:
        """Cases at each combination."""
        return 1 if self.scatter is None else self.scatter.samples

    @property
    def combinations(self) -> int:
        """Combinations of the axes' places."""
        return prod(one.size for one in self.axes)

    @property
    def rows(self) -> int:
        """Number of cases."""
        return self.combinations * self.samples

    @property
    def chunks(self) -> int:
        """Number of chunks."""
        return -(-self.rows // self.chunk)

    def span(self, chunk: int) -> tuple[int, int]:
        """First row of a chunk, and the one behind its last."""
        return chunk * self.chunk, min((chunk + 1) * self.chunk, self.rows)

    def values(self, first: int, behind: int) -> Values:
        """The varied keys' values in rows ``first`` to ``behind`` - 1."""
        rows = np.arange(first, behind)
        combination = rows // self.samples
        places = np.unravel_index(combination, [one.size for one in self.axes]) if self.axes else ()
        out = {
            key.name: column[place]
            for one, place in zip(self.axes, places, strict=True)
            for key, column in zip(one.keys, one.values, strict=True)
        }
        if self.scatter is not None:
            drawn = self.scatter.values(rows)
            out |= {key.name: column for key, column in zip(self.scatter.keys, drawn, strict=True)}
        return out

    def faults(self, first: int, behind: int) -> dict[int, str]:
        """What is wrong with rows that are no case at all, by their place among ``first`` to ``behind`` - 1."""
        if not any(one.faults for one in self.axes):
            return {}
        combination = np.arange(first, behind) // self.samples
        places = np.unravel_index(combination, [one.size for one in self.axes])
        return {
            int(row): one.faults[place]
            for one, where in zip(self.axes, places, strict=True)
            for place in one.faults
            for row in np.flatnonzero(where == place)
        }


def read_plan(file: str) -> Plan:
    """The plan of a sweep file; raises ``CaseError``."""
    stated = read_stated(file)
    base = read_case(str((stated.source.folder or FilePath()) / stated.case))
    return _plan(stated, base)


def plan_of(base: Case, tree: Mapping[str, Any]) -> Plan:
    """The plan of a sweep over a case, from plain values like a sweep file's tables; raises ``CaseError``."""
    return _plan(state(tree, Source()), base)


def _plan(stated: Stated, base: Case) -> Plan:
    rows = listed.read_rows(stated)
    ranges = {key: read_range(stated, key, spec) for key, spec in stated.vary.items()}
    tolerances = {key: read_tolerance(stated, key, spec) for key, spec in stated.scatter.items()}
    if rows is None and not ranges and not tolerances:
        example = '"gap.height" = { values = ["0.4 mm", "0.8 mm"] }'
        raise stated.source.refuse((), f"varies nothing; [vary] is needed, such as {example}")
    _each_once(stated, rows, [*ranges, *tolerances])
    _refuse_too_large(stated, [one.size for one in ranges.values()], len(tolerances))
    facts, reads = _learn(stated, base, rows, ranges, tolerances)
    axes = [] if rows is None else [listed.axis(stated, rows, facts, reads.alone)]
    axes += [axis(stated, key, one, facts[key], reads.alone) for key, one in ranges.items()]
    drawn = scatter(stated, tolerances, facts)
    keys = tuple(key for one in axes for key in one.keys) + (() if drawn is None else drawn.keys)
    for key in keys:
        if key.name.rpartition(".")[2] in TABLE_KEYS or any(_from_file(one) for one in key.choices):
            raise stated.refuse(key.name, "a table file cannot vary; list whole histories with their times and values")
    forms = _forms(reads.case, keys)
    walls = tuple(dict.fromkeys(wall.name for case in forms for wall in case.problem().walls if wall.kind != "axis"))
    frame = Frame(base.text(), keys, _columns(forms), walls, stated.histories)
    size = prod(one.size for one in axes) * (1 if drawn is None else drawn.samples)
    chunk = _chunk(base, keys, size, stated.histories)
    title = stated.title or base.title
    return Plan(title, frame, tuple(axes), drawn, _identity(stated, base, rows, chunk), chunk)


def _from_file(choice: Any) -> bool:
    """Whether a history as typed takes its numbers from a file, which other machines need not have."""
    if isinstance(choice, list | tuple):
        return any(map(_from_file, choice))
    return isinstance(choice, dict) and ("file" in choice or any(map(_from_file, choice.values())))


def _each_once(stated: Stated, rows: listed.Listed | None, others: list[str]) -> None:
    for key in () if rows is None else rows.cells:
        if key in others:
            raise stated.refuse(key, f"stands in {rows.name} too; it is needed in one of them")  # type: ignore[union-attr]
        stated.at[key] = ("rows",)


def _refuse_too_large(stated: Stated, sizes: list[int], scattered: int) -> None:
    """The axes and the samples are held in memory, and their summary needs some columns at once."""
    samples = read_settings(stated)[0] if scattered else 1
    held = 8 * (sum(sizes) + samples * scattered) + BYTES_SUMMED * prod(sizes) * samples
    free = _free_memory()
    if held > free:
        raise stated.source.refuse(
            (),
            f"{prod(sizes) * samples:,} cases need about {held / 1e9:.3g} GB of memory, and {free / 1e9:.3g} GB are "
            "free; fewer cases are needed",
        )


def _free_memory() -> int:
    """Bytes of memory that are to be had, as far as the system tells."""
    try:
        return os.sysconf("SC_AVPHYS_PAGES") * os.sysconf("SC_PAGE_SIZE")
    except (AttributeError, ValueError, OSError):
        return 2**62


class _Reads:
    """Tries values of a key in a case that is known to read."""

    def __init__(self, case: Case):
        self.case = case

    def alone(self, key: str, value: Any) -> bool:
        """Whether the case reads with this value."""
        try:
            self.case.replace({key: value})
        except CaseError:
            return False
        return True


def _learn(
    stated: Stated, base: Case, rows: listed.Listed | None, ranges: dict[str, Range], tolerances: dict[str, Tolerance]
) -> tuple[dict[str, Facts], _Reads]:
    candidates = {} if rows is None else {key: rows.candidates(key) for key in rows.cells}
    candidates |= {key: one.candidates for key, one in {**ranges, **tolerances}.items()}
    facts, case = learn(base, stated, candidates)
    return facts, _Reads(case)


def _forms(case: Case, keys: tuple[Varied, ...]) -> list[Case]:
    """The case with every combination of choices (shapes, kinds of history), as far as these read."""
    choices = [key for key in keys if key.kind == "choice"]
    out = [case]
    for picks in itertools.islice(itertools.product(*(key.choices for key in choices)), MOST_FORMS if choices else 0):
        try:
            out.append(case.replace({key.name: pick for key, pick in zip(choices, picks, strict=True)}))
        except CaseError:
            continue
    return out


def _columns(forms: list[Case]) -> tuple[Column, ...]:
    return together(layout(case.problem()) for case in forms)


def _chunk(base: Case, keys: tuple[Varied, ...], rows: int, histories: bool) -> int:
    """Rows of a chunk: decided by the sweep alone, so that its pieces are the same for any number of workers."""
    alone = histories or len(runners(base, keys)) == 1
    least, most = bounds = ALONE if alone else TOGETHER
    wanted = -(-rows // WANTED_CHUNKS[bounds])
    return min(max(least, 2 ** max(wanted - 1, 0).bit_length()), most)


def _identity(stated: Stated, base: Case, rows: listed.Listed | None, chunk: int) -> dict[str, Any]:
    """All that decides the numbers, as plain values that JSON keeps."""
    import json
    from hashlib import sha256

    from transient.result.store import _program

    out: dict[str, Any] = {
        "program": _program(),
        "case": tomllib.loads(base.text()),
        "vary": stated.vary,
        "scatter": {**stated.settings, **stated.scatter},
        "histories": stated.histories,
        "chunk": chunk,
    }
    if rows is not None:
        cells = json.dumps([rows.cells, rows.units], default=str)
        out["rows"] = {"name": rows.name, "contents": sha256(cells.encode()).hexdigest()[:16]}
    return json.loads(json.dumps(out, default=str))

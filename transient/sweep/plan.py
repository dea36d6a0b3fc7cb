"""From what a user states to a plan: each key's kind learned from the case, the columns, the chunks, the identity."""

from __future__ import annotations

import itertools
import os
import tomllib
from collections.abc import Mapping
from dataclasses import replace
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
from transient.sweep.cases import Plan
from transient.sweep.chunk import Frame, left_open
from transient.sweep.columns import Column, layout, together
from transient.sweep.facts import Facts, learn
from transient.sweep.keys import Varied
from transient.sweep.scatter import Tolerance, read_settings, read_tolerance, scatter
from transient.sweep.stated import Stated, read_stated, state

__all__ = ["Plan", "plan_of", "read_plan"]

BYTES_SUMMED = 60  # of each case that the closing summary holds at once
TABLE_KEYS = tuple(key.name for key in TABLE_FILE)
MOST_FORMS = 64  # combinations of choices that are looked at for the columns they bring
# Rows of a chunk: what a kill may cost, against the cost of a file each.
ALONE, TOGETHER = (16, 256), (256, 8192)
TRIED, MOST_OPEN = 16, 0.25
WANTED_CHUNKS = {ALONE: 2000, TOGETHER: 64}


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
    draft = Plan(stated.title or base.title, frame, tuple(axes), drawn, {}, 1)
    chunk = _chunk(draft)
    return replace(draft, stated=_identity(stated, base, rows, axes, chunk), chunk=chunk)


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


def _chunk(plan: Plan) -> int:
    """Rows of a chunk: decided by the sweep alone, so that its pieces are the same for any number of workers.

    Where few rows can be solved many at once (some are tried), chunks are small: what a kill may cost is a chunk.
    """
    tried = np.unique(np.linspace(0, plan.rows - 1, TRIED).astype(int))
    together = left_open(plan.frame, plan.values_of(tried)) <= MOST_OPEN
    least, most = bounds = TOGETHER if together else ALONE
    wanted = -(-plan.rows // WANTED_CHUNKS[bounds])
    return min(max(least, 2 ** max(wanted - 1, 0).bit_length()), most)


def _identity(stated: Stated, base: Case, rows: listed.Listed | None, axes: list[Axis], chunk: int) -> dict[str, Any]:
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
        contents = sha256(json.dumps([key.name for key in axes[0].keys]).encode())
        for key, column in zip(axes[0].keys, axes[0].values, strict=True):
            contents.update(column.tobytes() + json.dumps(key.choices, default=str).encode())
        out["rows"] = {"name": rows.name, "contents": contents.hexdigest()[:16]}
    return json.loads(json.dumps(out, default=str))

"""What kind of value each varied key takes, learned from the case itself: it reads them, and echoes what it read."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from transient.case.model import Case, CaseError
from transient.case.reading import Input
from transient.sweep.stated import Stated
from transient.units import DIMENSIONS, QuantityError, quantity

MOST_TRIALS = 40


@dataclass(frozen=True)
class Facts:
    """``kind`` as in ``Varied``; ``dimension`` of a quantity ("fraction" for bare numbers too)."""

    kind: str
    dimension: str = ""


def learn(base: Case, stated: Stated, candidates: Mapping[str, Sequence[Any]]) -> tuple[dict[str, Facts], Case]:
    """(facts by key, the first case that reads); ``candidates`` are values of each key as typed.

    Raises ``CaseError`` where no combination tried makes a case: the first refusal, about the key it is about.
    """
    first: CaseError | None = None
    for trial in _trials(candidates):
        try:
            case = base.replace(trial)
        except CaseError as error:
            first = first or error
            continue
        echoed = {one.key: one for one in case.inputs()}
        return {key: _facts(value, echoed.get(key)) for key, value in trial.items()}, case
    assert first is not None
    raise about(stated, base, first, tuple(candidates))


def _trials(candidates: Mapping[str, Sequence[Any]]) -> list[dict[str, Any]]:
    """Combinations to try: the first of all, the last of all, then some drawn at random but always the same."""
    draw = np.random.default_rng(0)
    out = [{key: values[0] for key, values in candidates.items()}, {key: v[-1] for key, v in candidates.items()}]
    sizes = [len(values) for values in candidates.values()]
    for _ in range(min(MOST_TRIALS, int(np.prod([min(size, MOST_TRIALS) for size in sizes])))):
        picks = [int(draw.integers(size)) for size in sizes]
        out.append({key: v[pick] for (key, v), pick in zip(candidates.items(), picks, strict=True)})
    return out


def _facts(value: Any, echoed: Input | None) -> Facts:
    if echoed is None or echoed.value is None or isinstance(value, bool):
        return Facts("choice")
    if isinstance(value, int) and not echoed.unit:
        return Facts("whole")
    same = [d.name for d in DIMENSIONS.values() if d.si == (echoed.unit or "1")]
    for name in same:
        try:
            if quantity(value, name) == echoed.value:
                return Facts("quantity", name)
        except QuantityError:
            continue
    return Facts("quantity", same[0])


def about(stated: Stated, base: Case, error: CaseError, keys: Sequence[str]) -> CaseError:
    """A case's refusal, told of the place in the sweep file where its key varies."""
    message = str(error)
    for prefix in (f"{base.source.file}: ", f"{error.key}: "):
        message = message.removeprefix(prefix)
    key = next((key for key in keys if key == error.key), None)
    key = key or next((key for key in keys if error.key.startswith(key) or key.startswith(f"{error.key}.")), None)
    if key is None:
        return CaseError(f"{stated.source.file}: {error}" if stated.source.file else str(error), error.key)
    return stated.refuse(key, message if error.key in ("", key) else f"{error.key}: {message}")

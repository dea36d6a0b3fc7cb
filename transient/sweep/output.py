"""Where a sweep's result goes: what is there already, whether it may go on, and whether there is room."""

from __future__ import annotations

import json
import shutil
from collections.abc import Iterator, Mapping
from pathlib import Path
from typing import Any

from transient.case.model import CaseError
from transient.result.place import nearest, unwritable
from transient.result.result import ResultError
from transient.sweep.cases import Plan
from transient.sweep.pieces import Folder, identity

GOES_ON = "--resume goes on with it, --overwrite begins anew"
MOST_CASES = 10_000_000  # more are asked back
TEXT_BYTES = 300  # status, verdict and message of a row, in its chunk and in the result
HISTORY_ROWS = 400
NAMED = 3  # changes that a refusal names


def folder_of(path: Path) -> Path:
    """The folder beside a result in which its finished chunks wait."""
    return path.with_name(f"{path.name}.parts")


def refuse_too_many(plan: Plan, name: str, confirmed: bool, word: str) -> None:
    """More than ten million cases are asked back; ``word`` is how one says that they are meant."""
    if plan.rows > MOST_CASES and not confirmed:
        raise CaseError(f"{name}: makes {plan.rows:,} cases, more than {MOST_CASES:,}; if that is meant, add {word}")


def opened(plan: Plan, path: Path, resume: bool, overwrite: bool) -> Folder | None:
    """The folder of chunks to go on with or to begin; None where the result is there and complete.

    Raises ``CaseError`` where something is in the way, where the sweep is another than the one begun, or where there
    is no room.
    """
    if resume and overwrite:
        raise CaseError("--resume and --overwrite: one of them is needed, not both")
    if path.is_dir():
        raise CaseError(f"{path}: is a folder; the name of a result file is needed, such as {path / 'sweep.h5'}")
    folder = folder_of(path)
    begun = identity(folder)
    if resume and begun is not None:
        _refuse_change(folder, begun, plan)
    elif resume and path.exists():
        _refuse_change(path, _finished(path), plan)
        shutil.rmtree(folder, ignore_errors=True)  # what a kill left of a folder that was no longer needed
        return None
    elif begun is not None and not overwrite:
        raise CaseError(f"{folder}: holds an unfinished sweep; {GOES_ON}")
    elif path.exists() and not overwrite:
        raise CaseError(f"{path}: is there already; {GOES_ON}")
    elif folder.exists():
        shutil.rmtree(folder)
    _refuse_too_large(plan, path)
    out = Folder(plan, folder)
    try:
        out.begin()
    except OSError as error:
        raise CaseError(f"{path}: cannot be written ({error.strerror}); name another with --out") from None
    return out


def _finished(path: Path) -> dict[str, Any]:
    """What the sweep of a finished file was."""
    from transient.result.store import read

    try:
        return json.loads(read(path).attributes["sweep"])
    except (ResultError, KeyError, ValueError):
        raise CaseError(f"{path}: is not the result of a sweep; name another with --out, or add --overwrite") from None


def _refuse_change(place: Path, before: Mapping[str, Any], plan: Plan) -> None:
    found = list(_changes(before, plan.stated))
    if found:
        more = f" and {len(found) - NAMED} more" if len(found) > NAMED else ""
        raise CaseError(f"{place}: was begun with another sweep: {'; '.join(found[:NAMED])}{more}; {AS_BEFORE}")


AS_BEFORE = "put it back to go on, or begin anew with --overwrite"
_HOLDERS = ("vary.", "scatter.", "case.")


def _changes(before: Any, now: Any, path: str = "") -> Iterator[str]:
    """What is not as before, by key."""
    if before == now:
        return
    if isinstance(before, Mapping) and isinstance(now, Mapping):
        for key in dict.fromkeys([*before, *now]):
            if before.get(key) != now.get(key):
                yield from _changes(before.get(key), now.get(key), f"{path}.{key}" if path else key)
        return
    name = path
    for holder in _HOLDERS[:2]:
        name = name.removeprefix(holder)
    yield f"{name} was {_short(before)}, is {_short(now)}"


def _short(value: Any) -> str:
    if value is None:
        return "not given"
    text = json.dumps(value, ensure_ascii=False)
    return text if len(text) <= 60 else f"{text[:57]}..."


def _refuse_too_large(plan: Plan, path: Path) -> None:
    """Nothing is begun that could not be finished for want of disk."""
    reason = unwritable(path.parent)
    if reason is not None:
        raise CaseError(f"{path}: {reason}; name another with --out")
    numbers = 2 * len(plan.frame.columns) + len(plan.frame.keys) + 1
    if plan.frame.histories:
        numbers += 2 * HISTORY_ROWS * (1 + len(plan.frame.walls))
    needed = plan.rows * (8 * numbers + TEXT_BYTES)
    free = shutil.disk_usage(nearest(path.parent)).free
    if needed > free:
        raise CaseError(
            f"{path}: {plan.rows:,} cases need about {needed / 1e9:.3g} GB on that disk, which has {free / 1e9:.3g} GB "
            "free; fewer cases or another --out is needed"
        )

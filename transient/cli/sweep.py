"""``transient sweep``: many cases, and what they say together."""

from __future__ import annotations

import json
from contextlib import AbstractContextManager
from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from transient.cli.progress import Bar, announce_compiling
from transient.cli.rows_bar import rows_progress
from transient.cli.words import FAILED, GOOD, INTERRUPTED, Stop, Version, note, refusals, say

if TYPE_CHECKING:
    from transient.sweep.pieces import Folder
    from transient.sweep.places import Place
    from transient.sweep.plan import Plan

MOST_WORKERS = 1024


def sweep(
    file: Annotated[str, typer.Argument(metavar="SWEEP.toml", help="The sweep file: a case, and what varies.")],
    out: Annotated[
        Path | None, typer.Option("--out", metavar="FILE.h5", help="The result file (default: outputs/SWEEP.h5).")
    ] = None,
    workers: Annotated[
        int | None, typer.Option("--workers", metavar="N", help="Processes at work (default: one per core).")
    ] = None,
    cluster: Annotated[
        str | None, typer.Option("--cluster", metavar="ADDRESS", help="Solve on a dask.distributed scheduler.")
    ] = None,
    resume: Annotated[bool, typer.Option("--resume", help="Go on where an interrupted sweep stopped.")] = False,
    overwrite: Annotated[bool, typer.Option("--overwrite", help="Replace a result that is there.")] = False,
    confirm: Annotated[bool, typer.Option("--confirm", help="Do solve more than 10 million cases.")] = False,
    as_json: Annotated[bool, typer.Option("--json", help="Print one JSON object, in SI.")] = False,
    quiet: Annotated[bool, typer.Option("--quiet", help="Print only errors, and what --json asks for.")] = False,
    version: Version = False,
) -> int:
    """Solve many cases: every combination of a file's values, and samples of its tolerances.

    Finished cases are kept as they come, so that an interruption loses none of them.  A case that cannot be solved is a
    row that says why.
    """
    if workers is not None and not 1 <= workers <= MOST_WORKERS:
        raise Stop(f"--workers {workers}: a whole number from 1 to {MOST_WORKERS} is needed, such as --workers 2")
    target = Path("outputs") / f"{Path(file).stem}.h5" if out is None else out
    if target.suffix not in (".h5", ".nc", ".hdf5"):
        raise Stop(f"--out {target}: a result file ends in .h5, such as {target.name}.h5")
    from transient.sweep.output import opened, refuse_too_many
    from transient.sweep.places import chosen
    from transient.sweep.plan import read_plan

    if not quiet:
        announce_compiling(Bar())
    with refusals():
        plan = read_plan(file)
        refuse_too_many(plan, file, confirm, "--confirm")
        place = chosen(plan, workers, cluster)
        folder = opened(plan, target, resume, overwrite)
    if folder is None:
        return _say_again(target, as_json, quiet)
    with folder:
        effort = _solve(plan, folder, place, target, quiet)
        return _finish(plan, folder, target, effort, as_json, quiet)


def _solve(plan: Plan, folder: Folder, place: Place, target: Path, quiet: bool) -> tuple[float, int]:
    """Solves what is missing; (seconds, cases solved).  Raises Stop where it cannot go on, with what was kept."""
    from time import perf_counter

    from transient.sweep.run import solve

    began = perf_counter()
    missing = folder.missing()
    left = sum(behind - first for first, behind in map(plan.span, missing))
    bar: AbstractContextManager[Any] = rows_progress(plan.rows, plan.rows - left, quiet)
    try:
        with bar as advance:
            solve(plan, folder, place, advance)
    except KeyboardInterrupt:
        raise Stop(f"interrupted; {_kept(plan, folder)}", INTERRUPTED) from None
    except OSError as error:
        raise Stop(f"{target}: {error.strerror or error}; {_kept(plan, folder)}", FAILED) from None
    return perf_counter() - began, left


def _kept(plan: Plan, folder: Folder) -> str:
    left = sum(behind - first for first, behind in map(plan.span, folder.missing()))
    return f"{plan.rows - left:,} of {plan.rows:,} cases are finished and kept; --resume goes on with the rest"


def _finish(plan: Plan, folder: Folder, target: Path, effort: tuple[float, int], as_json: bool, quiet: bool) -> int:
    from transient.result.result import ResultError
    from transient.sweep.file import write

    try:
        said = write(plan, folder, target)
    except ResultError as error:
        raise Stop(f"{error}; {_kept(plan, folder)}", FAILED) from None
    folder.end()
    _say(said, target, effort, as_json, quiet)
    return GOOD


def _say_again(target: Path, as_json: bool, quiet: bool) -> int:
    """What a sweep that is already complete said."""
    from transient.sweep.table import read

    with refusals():
        said = read(target).summary
    if not quiet:
        note(f"{target}: is complete already")
    _say(said, target, None, as_json, quiet)
    return GOOD


def _say(said: dict[str, Any], target: Path, effort: tuple[float, int] | None, as_json: bool, quiet: bool) -> None:
    if as_json:
        say(json.dumps(said, allow_nan=False))
    elif not quiet:
        from transient.cli.sweep_words import describe

        say(describe(said, target, effort))

"""``transient run``: solve case files, write a result file each, print what came out."""

from __future__ import annotations

from pathlib import Path
from typing import Annotated

import typer

from transient.cli.outputs import result_paths
from transient.cli.printers import Json, Printer, Quiet, Words
from transient.cli.progress import announce_compiling, progress
from transient.cli.words import FAILED, REFUSED, Overrides, Version, changes, one_line, own_error


def run(
    cases: Annotated[list[str], typer.Argument(metavar="CASE.toml", help="The case files to solve.")],
    out: Annotated[Path, typer.Option("--out", metavar="DIR", help="Folder for the result files.")] = Path("outputs"),
    as_json: Annotated[
        bool, typer.Option("--json", help="Print exactly one JSON object per case, a line each, in SI.")
    ] = False,
    sheet: Annotated[bool, typer.Option("--sheet", help="Write a calculation sheet beside each result.")] = False,
    quiet: Annotated[bool, typer.Option("--quiet", help="Print only errors, and what --json asks for.")] = False,
    overrides: Overrides = None,
    version: Version = False,
) -> int:
    """Solve case files and print what came out.

    Writes DIR/NAME.h5 for each NAME.toml (a former result of that name is replaced) and prints settling time, wall
    stress, their errors and how far they can be trusted.  Each case is solved or refused on its own.
    """
    wanted = changes(overrides)
    paths = result_paths(cases, out)
    with progress(len(cases), quiet) as bar:
        printer = Json(bar) if as_json else Quiet(bar) if quiet else Words(bar)
        if not quiet:
            announce_compiling(bar)
        return max(_one(case, path, wanted, printer, sheet) for case, path in zip(cases, paths, strict=True))


def _one(case: str, path: Path, wanted: list[tuple[str, str]], printer: Printer, sheet: bool) -> int:
    """Solve one case and write its files; the exit status of this case alone."""
    from transient.answer import exit_status, run
    from transient.case.read import CaseError, read_case
    from transient.march.march import SolveError
    from transient.result.result import ResultError
    from transient.result.store import write

    printer.begun(case)
    try:
        result = run(read_case(case, wanted))
        path.parent.mkdir(parents=True, exist_ok=True)
        write(result, path)
        if sheet:
            _write_sheet(path)
    except (CaseError, ResultError) as error:
        printer.stopped(case, "refused", one_line(str(error)))
        return REFUSED
    except OSError as error:
        printer.stopped(case, "refused", f"{path}: cannot be written ({error.strerror})")
        return REFUSED
    except SolveError as error:
        printer.stopped(case, "failed", f"{case}: {one_line(str(error))}")
        return FAILED
    except Exception as error:  # the other cases of this call shall not suffer from it
        printer.stopped(case, "failed", f"{case}: {own_error(error)}")
        return FAILED
    printer.solved(result, path)
    if sheet:
        printer.wrote(path.with_suffix(".html"))
    return exit_status(result)


def _write_sheet(path: Path) -> None:
    """The sheet of a result file, beside it."""
    from transient.result.store import read
    from transient.sheet.document.write import write_sheet

    write_sheet(read(path), path.with_suffix(".html"), path.name)

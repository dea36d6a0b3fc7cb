"""``transient loads``: a wall's load history for a structural check."""

from __future__ import annotations

import json
import math
from pathlib import Path
from typing import TYPE_CHECKING, Annotated

import typer

from transient.cli.words import GOOD, Stop, Version, note, refusals, say

if TYPE_CHECKING:
    from transient.loads.measures import Wanted


def loads(
    result: Annotated[Path, typer.Argument(metavar="RESULT.h5", help="A result file.")],
    every: Annotated[str, typer.Option("--every", metavar="TIME", help='Step of the load table, such as "1 ms".')],
    wall: Annotated[
        str | None, typer.Option("--wall", metavar="NAME", help="Which wall; may be left out where there is one.")
    ] = None,
    factor: Annotated[
        str | None, typer.Option("--factor", metavar="NUMBER", help="Show the loads times this as well, apart.")
    ] = None,
    spectrum: Annotated[
        tuple[str, str] | None,
        typer.Option("--spectrum", metavar="LOW HIGH", help='Dynamic load factor, such as from "5 Hz" to "2 kHz".'),
    ] = None,
    damping_ratio: Annotated[
        str | None, typer.Option("--damping-ratio", metavar="RATIO", help="Of the spectrum's oscillators; else 0.")
    ] = None,
    cycles: Annotated[bool, typer.Option("--cycles", help="Count load cycles (rainflow, ASTM E1049).")] = False,
    repeat: Annotated[
        int | None, typer.Option("--repeat", metavar="N", help="Count the cycles of N runs end to end.")
    ] = None,
    harmonics: Annotated[bool, typer.Option("--harmonics", help="Harmonics of a periodic load.")] = False,
    csv: Annotated[
        Path | None, typer.Option("--csv", metavar="FILE", help="Write the table here, its extrema beside it.")
    ] = None,
    plain: Annotated[
        Path | None, typer.Option("--plain", metavar="FILE", help="Write two plain columns here, time and load.")
    ] = None,
    as_json: Annotated[bool, typer.Option("--json", help="Print one JSON object, in SI.")] = False,
    version: Version = False,
) -> int:
    """Loads of a wall for a structural check.

    A table at constant steps that keeps the largest load, its impulse against the history's, the extrema, and where
    wanted dynamic load factors, load cycles and harmonics.
    """
    runs = 1 if cycles and repeat is None else repeat
    wanted = _wanted(every, factor, spectrum, damping_ratio, runs, harmonics)
    from transient.cli.load_words import describe
    from transient.loads.load import load_of
    from transient.loads.measures import as_json as form
    from transient.loads.measures import measure
    from transient.loads.write import companions, write_files
    from transient.result.result import ResultError
    from transient.result.store import read

    with refusals():
        finished = read(result)
        try:
            measures = measure(load_of(finished, wall), wanted)
        except ResultError as error:
            raise ResultError(f"{result}: {error}") from None
        _named(csv, plain)
        _no_two_alike([result, *([csv, *companions(measures, csv)] if csv else []), *([plain] if plain else [])])
        program = finished.attributes.get("program", "transient")
        written = write_files(measures, f"{result.name} ({program})", csv, plain)
    if as_json:
        say(json.dumps(form(measures), allow_nan=False))
    else:
        say(describe(measures, result))
    for path in written:
        note(f"wrote {path}")
    return GOOD


def _wanted(
    every: str,
    factor: str | None,
    spectrum: tuple[str, str] | None,
    damping_ratio: str | None,
    repeat: int | None,
    harmonics: bool,
) -> Wanted:
    """The options in SI.  Raises Stop where one is of no use."""
    from transient.loads.measures import Wanted

    if damping_ratio is not None and not spectrum:
        raise Stop('--damping-ratio belongs to --spectrum, such as --spectrum "5 Hz" "2 kHz" --damping-ratio 0.02')
    damping = 0.0 if damping_ratio is None else _quantity("--damping-ratio", damping_ratio, "fraction")
    if not 0.0 <= damping < 1.0:
        raise Stop(f"--damping-ratio {damping_ratio}: at least 0 and less than 1 is needed, such as 0.02")
    if repeat is not None and repeat < 1:
        raise Stop(f"--repeat {repeat}: a number of runs of 1 or more is needed, such as 1000")
    band = None
    if spectrum:
        low, high = sorted(_positive("--spectrum", text, "frequency", '"5 Hz"') for text in spectrum)
        band = (low, high)
    return Wanted(
        _positive("--every", every, "time", '"1 ms"'), _factor(factor), band, damping,
        repeat, harmonics,
    )  # fmt: skip


def _quantity(option: str, text: str, dimension: str) -> float:
    from transient.units import QuantityError, quantity

    try:
        return quantity(float(text) if dimension == "fraction" and _is_number(text) else text, dimension)
    except QuantityError as error:
        raise Stop(f"{option}: {error}") from None


def _positive(option: str, text: str, dimension: str, example: str) -> float:
    value = _quantity(option, text, dimension)
    if value <= 0.0:
        raise Stop(f'{option}: "{text}" is not above zero; a positive {dimension} is needed, such as {example}')
    return value


def _factor(text: str | None) -> float | None:
    if text is None:
        return None
    if not _is_number(text) or not 0.0 < float(text) < math.inf:
        raise Stop(f"--factor {text}: a number above zero without unit is needed, such as 1.5")
    return float(text)


def _is_number(text: str) -> bool:
    try:
        float(text)
    except ValueError:
        return False
    return True


def _named(*paths: Path | None) -> None:
    for path in paths:
        if path is not None and (not path.name or path.is_dir()):
            raise Stop(f"{path} is a folder; the name of a file is needed, such as {path / 'load.csv'}")


def _no_two_alike(paths: list[Path]) -> None:
    """Refuse to write over the result or one file over another."""
    seen: dict[Path, Path] = {}
    for path in paths:
        place = path.resolve()
        if place in seen:
            raise Stop(f"{path}: would be written over {seen[place]}; choose another name")
        seen[place] = path

"""``transient figure``: pictures of a finished result."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Annotated, Any

import typer

from transient.cli.numbers import listed
from transient.cli.words import GOOD, Stop, Version, note, refusals

if TYPE_CHECKING:
    from matplotlib.figure import Figure

    from transient.result.result import Result

MOVING = (".html", ".svg")


def figure(
    result: Annotated[Path, typer.Argument(metavar="RESULT.h5", help="A result file.")],
    name: Annotated[str | None, typer.Argument(metavar="NAME", help="Which figure; else the overview.")] = None,
    out: Annotated[Path | None, typer.Option("--out", metavar="FILE", help="Write here: PNG, SVG or PDF.")] = None,
    animate: Annotated[
        bool, typer.Option("--animate", help="The profile as a moving picture: HTML or SVG for a browser.")
    ] = False,
    against: Annotated[
        Path | None,
        typer.Option("--against", metavar="FILE", help="Beside another result, or a measured history (CSV)."),
    ] = None,
    quantity: Annotated[
        str | None,
        typer.Option("--quantity", metavar="NAME", help='With --against, such as "wall_stress upper"; of a sweep.'),
    ] = None,
    column: Annotated[
        str | None, typer.Option("--column", metavar="NAME", help="With --against: the column of the CSV file.")
    ] = None,
    shift: Annotated[
        str | None, typer.Option("--shift", metavar="TIME", help="With --against: added to the other's times.")
    ] = None,
    laid: Annotated[
        list[str] | None,
        typer.Option("--laid", metavar="TIME", help="With lines: when a line is laid across the gap; repeatable."),
    ] = None,
    over: Annotated[
        list[str] | None,
        typer.Option("--over", metavar="KEY", help="Of a sweep: the varied key (map: two keys) to draw over."),
    ] = None,
    seen: Annotated[
        str | None, typer.Option("--seen", metavar="TIME", help="With lines: when the lines are looked at.")
    ] = None,
    version: Version = False,
) -> int:
    """Draw a result as PNG, SVG or PDF.

    Without a name: an overview of wall stress, drive, flow and profiles; of a sweep its map.  Written beside the
    result unless --out says otherwise.
    """
    from transient.result.store import read
    from transient.sheet.figures import FIGURES, SWEEP_FIGURES, default, draw

    names = [*FIGURES, *SWEEP_FIGURES]
    if name is not None and name not in names:
        raise Stop(f'there is no figure "{name}"; there are {listed(names)}')
    _refuse_mixtures(name, animate, against, {"--column": column, "--shift": shift})
    if name != "lines" and (laid or seen):
        raise Stop('--laid and --seen belong to the figure lines: transient figure RESULT.h5 lines --laid "0 s"')
    with refusals():
        if animate:
            return _animate(result, out)
        _target(out, result)  # before anything is read
        if against is not None:
            target = _target(out, result.with_name(f"{result.stem}_against_{against.stem}.png"))
            delay = 0.0 if shift is None else _time("--shift", shift)
            _save(_beside(read(result), result, against, quantity, column, delay), target)
            return GOOD
        finished = read(result)
        chosen = name or default(finished)
        options = _options(finished, chosen, quantity, over, laid, seen)
        target = _target(out, result.with_name(f"{result.stem}_{chosen}.png"))
        _save(draw(finished, chosen, **options), target)
    return GOOD


def _refuse_mixtures(
    name: str | None, animate: bool, against: Path | None, belonging: dict[str, str | None]
) -> None:
    """Raises Stop where options do not go together."""
    if name is not None and (animate or against is not None):
        option = "--animate" if animate else "--against"
        raise Stop(f"{option} draws a figure of its own; leave the name {name} out")
    if animate and against is not None:
        raise Stop("--animate and --against are two figures; give one of them")
    given = [option for option, value in belonging.items() if value is not None]
    if given and against is None:
        raise Stop(f"{given[0]} belongs to --against, such as --against measured.csv")


def _target(out: Path | None, usual: Path) -> Path:
    from transient.sheet.figures import FORMATS

    if out is not None and out.suffix.lower().removeprefix(".") not in FORMATS:
        raise Stop(f"--out {out}: a figure ends in .png, .svg or .pdf, such as {out.with_suffix('.png').name}")
    return out or usual


def _save(drawn: Figure, target: Path) -> None:
    from transient.sheet.figures import save

    save(drawn, target)
    note(f"wrote {target}")


def _options(
    result: Result, name: str, quantity: str | None, over: list[str] | None, laid: list[str] | None, seen: str | None
) -> dict[str, Any]:
    """What the figure is told beside the result.  Raises Stop where an option is of no use."""
    given: dict[str, Any] = {}
    if name == "lines" and laid:
        given["laid"] = [_time("--laid", text) for text in laid]
    if name == "lines" and seen is not None:
        given["seen"] = _time("--seen", seen)
    for option, value in (("--quantity", quantity), ("--over", over)):
        if not value:
            continue
        if "case" not in result.variables:
            more = " or with --against" if option == "--quantity" else ""
            raise Stop(f"{option} is for the figures of a sweep{more}; this file holds a single run")
        if option == "--over" and name == "ranking":
            raise Stop("--over is for map and spread; ranking shows every key")
        given[option.removeprefix("--")] = value
    return given


def _beside(
    result: Result, path: Path, against: Path, quantity: str | None, column: str | None, shift: float
) -> Figure:
    from transient.sheet.overlay import overlay

    labels = (path.stem, against.name if against.suffix.lower() != ".h5" else against.stem)
    return overlay(result, against, quantity, column, shift, labels)


def _animate(result: Path, out: Path | None) -> int:
    from transient.result.store import read
    from transient.sheet.moving import write_moving

    target = out or result.with_name(f"{result.stem}_moving.html")
    if target.suffix.lower() not in MOVING:
        example = target.with_suffix(".html").name
        raise Stop(f"--out {target}: a moving picture ends in .html or .svg, such as {example}")
    write_moving(read(result), target)
    note(f"wrote {target}")
    return GOOD


def _time(option: str, text: str) -> float:
    from transient.units import QuantityError, quantity

    try:
        return quantity(text, "time")
    except QuantityError as error:
        raise Stop(f"{option}: {error}") from None

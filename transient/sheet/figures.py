"""The figures by name, and how one is drawn and saved.

To add a figure: a file beside this one with a function of a Result that returns a matplotlib Figure (and raises
ResultError where the file lacks what it shows), and a line in ``FIGURES``.
"""

from __future__ import annotations

import os
import warnings
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING

from transient.result.result import Result, ResultError
from transient.result.view import nearest
from transient.result.whole import whole
from transient.sheet.energy import energy
from transient.sheet.flow import flow
from transient.sheet.lines import lines
from transient.sheet.motion import motion
from transient.sheet.overview import overview
from transient.sheet.profiles import profiles
from transient.sheet.reach import reach
from transient.sheet.sketch import sketch
from transient.sheet.stress import stress
from transient.sheet.style import drawing
from transient.sheet.trust import trust

if TYPE_CHECKING:
    from matplotlib.figure import Figure

FIGURES: dict[str, Callable[[Result], Figure]] = {
    "overview": overview,
    "stress": stress,
    "profiles": profiles,
    "flow": flow,
    "reach": reach,
    "motion": motion,
    "energy": energy,
    "lines": lines,
    "trust": trust,
    "sketch": sketch,
}
DEFAULT = "overview"
# File endings, with what keeps a picture of the same result the same file.
FORMATS = {"png": {}, "svg": {"Date": None}, "pdf": {"CreationDate": None}}
DOTS_PER_INCH = 200


def draw(result: Result, name: str = DEFAULT) -> Figure:
    """The figure ``name`` of a result.

    Raises ResultError for an unknown name, or where the result lacks what the figure shows.
    """
    if name not in FIGURES:
        raise ResultError(f"there is no figure {name!r}{nearest(name, FIGURES)}")
    if "case" in result.variables:
        raise ResultError(f"figure {name}: shows a single run, and this file holds a sweep")
    with drawing():
        return FIGURES[name](result)


def save(figure: Figure, path: str | os.PathLike[str]) -> None:
    """Writes the figure as the path's ending says (.png, .svg, .pdf), whole or not at all.

    Raises ResultError for another ending or where the file cannot be written.
    """
    kind = Path(path).suffix.lower().removeprefix(".")
    if kind not in FORMATS:
        raise ResultError(f"{path}: a figure ends in .png, .svg or .pdf")
    with drawing(), whole(path) as draft, warnings.catch_warnings():
        # A title in a script that the font lacks is shown with boxes, which is no fault of the result.
        warnings.filterwarnings("ignore", message="Glyph .* missing from")
        figure.savefig(draft, format=kind, dpi=DOTS_PER_INCH, metadata=FORMATS[kind])

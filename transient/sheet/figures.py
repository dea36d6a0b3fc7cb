"""The figures by name, and how one is drawn and saved.

To add a figure: a file beside this one with a function of a Result that returns a matplotlib Figure (and raises
ResultError where the file lacks what it shows), and a line in ``FIGURES``.
"""

from __future__ import annotations

import os
import warnings
from collections.abc import Callable
from pathlib import Path
from typing import TYPE_CHECKING, Any

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
from transient.sheet.sweeps.columns import stepped
from transient.sheet.sweeps.map import map as map_
from transient.sheet.sweeps.ranking import ranking
from transient.sheet.sweeps.spread import spread
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
SWEEP_FIGURES: dict[str, Callable[..., Figure]] = {"map": map_, "spread": spread, "ranking": ranking}
DEFAULT = "overview"
# File endings, with what keeps a picture of the same result the same file.
FORMATS = {"png": {}, "svg": {"Date": None}, "pdf": {"CreationDate": None}}
DOTS_PER_INCH = 200


def draw(result: Result, name: str | None = None, **options: Any) -> Figure:
    """The figure ``name`` of a result, or of a sweep (default: the overview, the map or the spread).

    ``options`` of the figure's own, such as ``quantity`` of a sweep's.  Raises ResultError for an unknown name, or
    where the result lacks what the figure shows.
    """
    many = "case" in result.variables
    known, others = (SWEEP_FIGURES, FIGURES) if many else (FIGURES, SWEEP_FIGURES)
    name = default(result) if name is None else name
    if name not in known and name in others:
        holds = "a sweep" if many else "a single run"
        raise ResultError(f"figure {name}: this file holds {holds}, of which there are {', '.join(known)}")
    if name not in known:
        raise ResultError(f"there is no figure {name!r}{nearest(name, known)}")
    with drawing():
        return known[name](result, **options)


def default(result: Result) -> str:
    """The figure that shows most of a result."""
    if "case" not in result.variables:
        return DEFAULT
    return "map" if len(stepped(result)) > 1 else "spread"


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

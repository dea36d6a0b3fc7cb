"""A sheet as one HTML page: no network, no scripts; every text is escaped, every figure an inline drawing."""

from __future__ import annotations

import io
import re
import warnings
from functools import lru_cache
from importlib.resources import files
from typing import TYPE_CHECKING

from transient.result.result import Result
from transient.sheet.document.blocks import Picture, Sheet
from transient.sheet.document.compose import compose
from transient.sheet.document.facts import Facts
from transient.sheet.style import drawing

if TYPE_CHECKING:
    from jinja2 import Template
    from markupsafe import Markup

# What matplotlib puts around the drawing itself, and comments, which repeat every text.
_AROUND = re.compile(r"<\?xml.*?\?>|<!DOCTYPE.*?>|<metadata>.*?</metadata>|<!--.*?-->", re.DOTALL)
_IDS = re.compile(r'(\bid="|(?:xlink:)?href="#|url\(#)')
# Names within a drawing, and those that something refers to.
_NAMED = re.compile(r' id="([^"]*)"')
_USED = re.compile(r"(?:href=\"#|url\(#)([^\")]+)")
_LOW = re.compile(r"_([A-Za-z]+)")
_PATH = re.compile(r' d="[^"]*"')
# Digits beyond a hundredth of a point are nothing that print shows.
_DIGITS = re.compile(r"(-?\d+\.\d{2})\d+")


def html(facts: Facts) -> str:
    """The page of a result."""
    return render(compose(facts))


def render(sheet: Sheet) -> str:
    """The page of a sheet."""
    pictures = [block for section in sheet.sections for block in section.blocks if isinstance(block, Picture)]
    drawn = {picture.name: inline(picture) for picture in pictures}
    return _template().render(sheet=sheet, drawn=drawn, style=_style(), generator="transient")


def inline(picture: Picture) -> Markup:
    """The figure as an SVG element; of its ids those are kept that are used, with the picture's name before them."""
    from markupsafe import Markup
    from matplotlib.transforms import Bbox

    figure, name = picture.figure, picture.name
    figure.texts[0].set_visible(False)
    wide, tall = figure.get_size_inches()
    seen = Bbox.from_extents(0.0, 0.0, wide, tall - picture.crop)
    out = io.StringIO()
    with drawing(), warnings.catch_warnings():
        warnings.filterwarnings("ignore", message="Glyph .* missing from")
        figure.savefig(out, format="svg", metadata={"Date": None}, bbox_inches=seen)
    text = _AROUND.sub("", out.getvalue())
    text = _PATH.sub(lambda path: _DIGITS.sub(r"\1", path[0]), text)
    used = set(_USED.findall(text))
    text = _NAMED.sub(lambda found: found[0] if found[1] in used else "", text)
    return Markup(_IDS.sub(rf"\g<1>{name}-", text).strip())


def maths(text: str) -> Markup:
    """A formula with its subscripts set low, such as ``τ_lower``."""
    from markupsafe import Markup, escape

    return Markup(_LOW.sub(r"<sub>\1</sub>", str(escape(text))))


@lru_cache(maxsize=1)
def _template() -> Template:
    from jinja2 import Environment, PackageLoader, StrictUndefined

    loader = PackageLoader("transient.sheet.document")
    environment = Environment(
        loader=loader, autoescape=True, undefined=StrictUndefined, trim_blocks=True, lstrip_blocks=True
    )
    environment.filters["maths"] = maths
    return environment.get_template("sheet.html")


@lru_cache(maxsize=1)
def _style() -> Markup:
    from markupsafe import Markup

    return Markup((files("transient.sheet.document") / "templates" / "sheet.css").read_text(encoding="utf-8"))


def facts_of(result: Result, name: str, factor: float | None = None, note: str = "") -> Facts:
    """What a sheet of ``result``, read from a file of that ``name``, is written from."""
    return Facts(result, name, factor, note)

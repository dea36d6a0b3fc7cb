"""How wide words are in matplotlib's own fonts, and where lines break."""

from __future__ import annotations

from functools import lru_cache

FAMILIES = {
    "sans": ("DejaVu Sans", "normal"), "bold": ("DejaVu Sans", "bold"), "serif": ("DejaVu Serif", "normal"),
    "monospace": ("DejaVu Sans Mono", "normal"),
}  # fmt: skip


@lru_cache(maxsize=8)
def _font(family: str):
    from matplotlib.font_manager import FontProperties, findfont, get_font

    name, weight = FAMILIES[family]
    return get_font(findfont(FontProperties(family=name, weight=weight)))


@lru_cache(maxsize=4096)
def _letter(letter: str, family: str) -> float:
    """Width of a letter per point of size, inches."""
    font = _font(family)
    font.set_size(100.0, 72)
    # a letter that the font lacks has the width of the box that stands for it
    return font.load_glyph(font.get_char_index(ord(letter))).linearHoriAdvance / 65536.0 / 100.0 / 72.0


def width(text: str, size: float, family: str = "sans") -> float:
    """Width (inches) of a line at ``size`` points."""
    return size * sum(_letter(letter, family) for letter in text)


def broken(text: str, size: float, room: float, family: str = "sans") -> list[str]:
    """Lines of at most ``room`` inches: broken at blanks, and within a word only where it alone is longer.

    Blanks at the beginning of the text are kept.
    """
    start = text[: len(text) - len(text.lstrip(" "))]
    lines, line = [], start
    fresh = True
    for word in text.split():
        longer = line + word if fresh else f"{line} {word}"
        if fresh or width(longer, size, family) <= room:
            line, fresh = longer, False
        else:
            lines.append(line)
            line = word
        while width(line, size, family) > room and len(line) > 1:
            fits = max(1, next((i - 1 for i in range(1, len(line) + 1) if width(line[:i], size, family) > room), 1))
            lines.append(line[:fits])
            line = line[fits:]
    return [*lines, line] if line.strip() or not lines else lines

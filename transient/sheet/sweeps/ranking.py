"""Which inputs matter: for each headline number the share of its variance that each varied key explains."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from transient.result.result import Result, ResultError
from transient.sheet.style import FAINT, INK, SOFT, WIDTH, page

if TYPE_CHECKING:
    from matplotlib.figure import Figure

BAR, BETWEEN, TOP, BOTTOM = 0.21, 0.42, 0.9, 0.5
LETTERS = 27  # of a key beside its bar
MOST = 6  # numbers in one figure


def ranking(result: Result, quantity: str | None = None) -> Figure:
    """The figure; with ``quantity`` of that number alone.

    Raises ResultError where the sweep states no shares, or for an unknown name.
    """
    headlines = result.summary.get("headlines") or {}
    known = {name: part["sensitivities"] for name, part in headlines.items() if part.get("sensitivities")}
    if quantity is not None:
        if quantity not in known:
            raise ResultError(f"figure ranking: there is none for {quantity!r}; there are {', '.join(known)}")
        known = {quantity: known[quantity]}
    if not known:
        raise ResultError("figure ranking: this sweep does not tell which inputs matter")
    groups = _alike(known)
    tall = TOP + BOTTOM + sum(BAR * len(bars) + BETWEEN for _, bars in groups)
    figure = page(
        result.title, tall,
        "Share of the variance that each input explains alone; + the number's size grows with it, − it falls",
    )  # fmt: skip
    y = tall - TOP + 0.2
    for i, (names, bars) in enumerate(groups):
        y -= BAR * len(bars) + BETWEEN
        axes = figure.add_axes((2.05 / WIDTH, (y + 0.08) / tall, 3.9 / WIDTH, BAR * len(bars) / tall))
        _bars(axes, names, bars, last=i == len(groups) - 1)
    return figure


def _alike(known: dict[str, list[dict[str, Any]]]) -> list[tuple[str, list[dict[str, Any]]]]:
    """Numbers whose shares agree to a hundredth, such as a stress and its force, together."""
    groups: list[tuple[list[str], list[dict[str, Any]]]] = []
    for name, bars in known.items():
        look = [(bar["key"], round(bar["share"], 2)) for bar in bars]
        for names, others in groups:
            if [(bar["key"], round(bar["share"], 2)) for bar in others] == look:
                names.append(name)
                break
        else:
            groups.append(([name], bars))
    return [(", ".join(name.replace("_", " ") for name in names), bars) for names, bars in groups[:MOST]]


def _bars(axes, names: str, bars: list[dict[str, Any]], last: bool) -> None:
    axes.set_xlim(0.0, 100.0)
    axes.set_ylim(len(bars) - 0.5, -0.5)
    for row, bar in enumerate(bars):
        percent = 100.0 * bar["share"]
        slope = bar.get("slope")
        axes.barh(row, percent, height=0.62, color=INK[0], gid=f"share {bar['key']}")
        sign = "" if slope is None or percent < 1.0 else " +" if slope > 0.0 else " −"
        text = f"{percent:.0f} %{sign}" if percent >= 1.0 else "< 1 %"
        axes.text(1.02, row, text, transform=axes.get_yaxis_transform(), va="center", size=7.8, color=INK[0])
    axes.set_yticks(range(len(bars)), [_short(bar["key"]) for bar in bars])
    axes.tick_params(axis="y", length=0)
    axes.tick_params(axis="x", labelbottom=last)
    axes.grid(axis="x", color=FAINT, lw=0.5)
    axes.set_axisbelow(True)
    short = names if len(names) <= 74 else f"{names[:73]}…"
    axes.set_title(short, loc="left", size=8.2, color=SOFT, pad=3, x=-0.02)
    if last:
        axes.set_xlabel("share of the variance [%]")


def _short(key: str) -> str:
    """The end of a long key, where keys differ."""
    return key if len(key) <= LETTERS else f"…{key[1 - LETTERS:]}"

"""Stress, drive, flow and profiles of one result on one page."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING

from transient.result.display import rows as headline_rows
from transient.result.result import Result
from transient.sheet.flow import flow_panel
from transient.sheet.histories import drive, drives
from transient.sheet.profiles import profiles_panel, subtitle
from transient.sheet.span import span
from transient.sheet.stress import finish, quasi_note, stress_panel, stress_signals
from transient.sheet.style import MINUS, PAGE, SOFT, need, page, rows

if TYPE_CHECKING:
    from matplotlib.figure import Figure

# A hyphen before a digit, which print sets as a minus sign.
_MINUS = re.compile(r"-(?=\d)")
# Inches: head of the page without and for each line of numbers, and the profiles at its foot.
_HEAD, _LINE, _FOOT = 0.5, 0.145, 3.35


def overview(result: Result) -> Figure:
    """The figure.  Raises ResultError where the file holds no histories or profiles."""
    need(result, "overview", "time", "wall", "wall_stress", "mean_velocity", "profile_time", "position", "velocity")
    shared = span(result, stress_signals(result))
    names = drives(result)
    facts = [f"{label}: {_MINUS.sub(MINUS, text)}" for label, text in headline_rows(result) if label != "sizes"]
    figure = page(result.title, PAGE, "\n".join(facts))
    axes = rows(figure, [2.4] + [0.9] * len(names) + [1.6], top=_HEAD + _LINE * len(facts), bottom=_FOOT + 0.72)
    stress_panel(axes[0], result, shared)
    for panel, name in zip(axes[1:], names, strict=False):
        drive(panel, result, name, shared)
    flow_panel(axes[-1], result, shared)
    finish(figure, axes, result, shared, quasi_note(result))
    below = figure.add_axes((0.1, 0.5 / PAGE, 0.86, (_FOOT - 0.85) / PAGE))
    profiles_panel(below, result)
    figure.text(0.015, (_FOOT - 0.2) / PAGE, subtitle(result), color=SOFT, va="bottom")
    return figure

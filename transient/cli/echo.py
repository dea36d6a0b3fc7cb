"""What ``transient check`` prints: inputs as typed and in SI, derived numbers, cautions."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence
from typing import TYPE_CHECKING

from transient.cli.numbers import columns

if TYPE_CHECKING:
    from transient.case.derived import Derived
    from transient.case.reading import Input
    from transient.trust.check import Check

WIDTH = 80


def inputs(rows: Sequence[Input]) -> list[str]:
    """Key, what was typed, and its SI value, one line each."""
    cells = [["Input", "as typed", "in SI"]]
    cells += [
        [row.key, row.typed, "" if row.value is None else f"{row.value:.10g} {row.unit}".rstrip()] for row in rows
    ]
    return list(columns(cells))


def derived(rows: Sequence[Derived]) -> list[str]:
    """Name, value in a fitting unit, and how it follows from the inputs."""
    from transient.units import show

    cells = [["Follows from it", "", ""]]
    for row in rows:
        value = f"{row.value:.4g}" if row.dimension == "number" else show(row.value, row.dimension)
        cells.append([row.name, value, row.note])
    return list(columns(cells))


def cautions(checks: Sequence[Check]) -> list[str]:
    """What the hand formula says about the limits of the model."""
    lines = [f"Limits of the model, judged by the steady flow of each instant: {len(checks)} looked at"]
    for check in checks:
        if check.status != "pass":
            word = "OUTSIDE" if check.status == "fail" else "caution"
            text = f"{word} ({check.name} {check.value:.3g}, limit {check.limit:.3g}): {check.note}"
            lines += textwrap.wrap(text, WIDTH, initial_indent="  ", subsequent_indent="    ")
    if len(lines) == 1:
        lines.append("  no caution")
    return lines

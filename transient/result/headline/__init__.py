"""Headline numbers: one file each, one entry here.  Each turns a ``Run`` into its part of the summary."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any

from transient.result.headline.bodies import bodies
from transient.result.headline.flow import flow
from transient.result.headline.motion import motion
from transient.result.headline.pressure import pressure
from transient.result.headline.settling import settling
from transient.result.headline.walls import walls
from transient.result.run import Run

HEADLINES: dict[str, Callable[[Run], dict[str, Any]]] = {
    "settling": settling,
    "walls": walls,
    "flow": flow,
    "pressure": pressure,
    "bodies": bodies,
    "motion": motion,
}


def headlines(run: Run) -> dict[str, Any]:
    """All parts of the summary that come from the history, by their summary keys."""
    return {name: compute(run) for name, compute in HEADLINES.items()}


def plain(value: float | None) -> float | None:
    """A float for JSON: None for what does not exist (nan) or has no finite value."""
    return None if value is None or not abs(value) < float("inf") else float(value)

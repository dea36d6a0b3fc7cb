"""One line of the installation check."""

from __future__ import annotations

from dataclasses import dataclass


@dataclass(frozen=True)
class Row:
    """What was checked, the ``worst`` error found, the ``limit`` it must keep, and the ``source`` of the exact answer.

    ``worst`` is a fraction of the largest magnitude of what was compared unless the name says otherwise.
    """

    name: str
    worst: float
    limit: float
    source: str
    passed: bool


def row(name: str, worst: float, limit: float, source: str) -> Row:
    """A row that passes where ``worst`` is a number not above ``limit``; what is not a number fails as infinite."""
    worst = float(worst)
    if not worst < float("inf"):
        return Row(name, 1e300, float(limit), source, False)
    return Row(name, worst, float(limit), source, worst <= limit)

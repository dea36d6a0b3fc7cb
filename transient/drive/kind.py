"""The shape of a history kind: what a user writes, and the function that compiles it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

from transient.drive.pieces import Drive


@dataclass(frozen=True)
class Field:
    """One key of a history kind.

    ``quantity``: "value" (the input's own dimension, such as a speed), "value_rate" (per second),
    "value_jerk" (per second squared), "time", "frequency" (cycles per second), "angle" (rad), "times", "values"
    (arrays in SI), "history", "histories", "count" (a whole number), or "choice" (one of ``choices``).
    ``default`` None and not ``required`` means that the key may be absent.
    """

    name: str
    quantity: str
    doc: str
    required: bool = False
    default: Any = None
    positive: bool = False
    choices: tuple[str, ...] = ()


@dataclass(frozen=True)
class Kind:
    """A history kind: its name in a case file, its keys, and ``build(**keys in SI) -> Drive``.

    ``build`` raises ``DriveError`` naming the key where values contradict each other.
    Python names: ``from`` is passed as ``from_``.
    """

    name: str
    doc: str
    fields: tuple[Field, ...]
    build: Callable[..., Drive]

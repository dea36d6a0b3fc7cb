"""What a viscosity law is: its keys in a case file, and the code and parameters that compiled code sees."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass


@dataclass(frozen=True)
class Parameter:
    """One key of a law; ``dimension`` is a plain word such as "viscosity"."""

    name: str
    dimension: str
    doc: str
    example: str


@dataclass(frozen=True)
class LawKind:
    """A viscosity law: its name, its keys, the ``code`` of compiled code, and ``parameters(**keys in SI)``."""

    name: str
    doc: str
    code: int
    keys: tuple[Parameter, ...]
    parameters: Callable[..., tuple[float, ...]]

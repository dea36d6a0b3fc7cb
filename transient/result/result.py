"""A finished answer: variables with dimensions and units, the summary, and the case that made it."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Any

import numpy as np


@dataclass(frozen=True, eq=False)
class Variable:
    """One stored quantity: ``data`` with the names of its dimensions, its SI unit ("1" for none) and a title."""

    dims: tuple[str, ...]
    data: np.ndarray
    units: str
    long_name: str


@dataclass(frozen=True, eq=False)
class Result:
    """What a run leaves behind and a result file holds.

    ``variables`` by name, the dimension scales (``time``, ``profile_time``, ``position``, ``wall``) among them;
    ``summary`` the contract's JSON object; ``case_text`` the whole case as TOML.
    """

    variables: dict[str, Variable]
    summary: dict[str, Any]
    case_text: str
    attributes: dict[str, Any] = field(default_factory=dict)

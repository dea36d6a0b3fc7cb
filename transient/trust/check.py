"""One self-check or validity check as plain data, and the verdict that several of them make."""

from __future__ import annotations

import math
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

STATUSES = ("pass", "caution", "fail")
KINDS = ("validity", "numerics")
# Share of a limit above which a value is near it: common practice, no source.
NEAR = 0.8


@dataclass(frozen=True)
class Check:
    """What was looked at and what came out.

    ``kind``: "validity" (does the model apply) or "numerics" (did the solver do its sums).
    ``value`` and ``limit`` share a unit (SI); ``source`` says where the limit comes from; ``note`` is one sentence.
    """

    name: str
    kind: str
    status: str
    value: float
    limit: float
    source: str
    note: str

    def __post_init__(self) -> None:
        if self.kind not in KINDS or self.status not in STATUSES:
            raise ValueError(f"{self.name}: kind {self.kind!r} or status {self.status!r} is not known")

    def as_dict(self) -> dict[str, Any]:
        """Keys of the summary's list of checks, every number finite or None."""
        return {
            "name": self.name,
            "kind": self.kind,
            "status": self.status,
            "value": _finite(self.value),
            "limit": _finite(self.limit),
            "source": self.source,
            "note": self.note,
        }


def _finite(number: float) -> float | None:
    return float(number) if math.isfinite(number) else None


def judge(value: float, caution_at: float, fail_at: float = math.inf) -> str:
    """Status of a value that should stay small: "fail" above ``fail_at``, "caution" above ``caution_at``.

    A value that is no number fails; an infinite ``fail_at`` means that the check only ever cautions.
    """
    if math.isnan(value):
        return "fail"
    if value > fail_at:
        return "fail"
    return "caution" if value > caution_at else "pass"


def verdict(checks: Iterable[Check]) -> str:
    """ "failed" if the numerics failed, else "outside" if the model does not apply, else "caution" or "good"."""
    seen = {(check.kind, check.status) for check in checks}
    if ("numerics", "fail") in seen:
        return "failed"
    if ("validity", "fail") in seen:
        return "outside"
    return "caution" if any(status == "caution" for _, status in seen) else "good"

"""Several histories added up."""

from __future__ import annotations

from collections.abc import Sequence

from transient.drive.kind import Field, Kind
from transient.drive.pieces import Drive, DriveError, total


def build(parts: Sequence[Drive]) -> Drive:
    """The sum of ``parts``, before t = 0 too."""
    if len(parts) == 0:
        raise DriveError("a sum needs at least one part", "parts")
    return total(list(parts))


KIND = Kind(
    "sum",
    "several histories added up",
    (Field("parts", "histories", "the histories to add", required=True),),
    build,
)

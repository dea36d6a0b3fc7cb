"""What a gap shape is: its sizes as a user gives them, and what they mean as one equation's numbers."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass


class ShapeError(ValueError):
    """Sizes that contradict each other.

    ``key`` names the size at fault; ``fault`` what is wrong with it ("is not below the outer radius"); ``need`` what
    is needed instead.
    """

    def __init__(self, key: str, fault: str, need: str):
        super().__init__(f"{key} {fault}; {need}")
        self.key, self.fault, self.need = key, fault, need


@dataclass(frozen=True)
class Size:
    """One key of a shape: ``dimension`` is a plain word such as "length"; all sizes are above zero."""

    name: str
    dimension: str
    doc: str
    example: str
    required: bool = False


@dataclass(frozen=True)
class Ends:
    """The two ends' coordinates in m (plates: 0 and the height; pipe: 0 and the radius), and their distance.

    ``gap`` is stored beside them: in a narrow annulus the difference of the radii has lost its digits.
    """

    inner: float
    outer: float
    gap: float


Sizes = Mapping[str, float]


@dataclass(frozen=True)
class Shape:
    """A gap shape: one entry of the registry.

    ``name`` is unique; ``word`` and ``motion`` are what a case file says; ``metric`` is m of the one equation;
    ``walls`` the names of the inner and outer end; ``axis``: the inner end is a centre line, no wall.
    ``ends(sizes)`` raises ``ShapeError``; ``areas(ends, sizes)`` are the wetted areas of one gap in m^2, each None
    where the sizes do not tell; ``section(ends, sizes)`` the flow area in m^2 or None; ``radii(ends)`` the walls'
    radii in m, 0 for a flat one.  ``sizes`` maps key names to SI values; absent keys were not given.
    """

    name: str
    word: str
    motion: str | None
    doc: str
    metric: int
    sizes: tuple[Size, ...]
    walls: tuple[str, str]
    ends: Callable[[Sizes], Ends]
    areas: Callable[[Ends, Sizes], tuple[float | None, float | None]]
    section: Callable[[Ends, Sizes], float | None]
    radii: Callable[[Ends], tuple[float, float]]
    axis: bool = False

    @property
    def rotating(self) -> bool:
        """Whether speeds are angular and forces are torques."""
        return self.metric == 3

    @property
    def real_walls(self) -> tuple[str, ...]:
        """Names of the ends that are walls."""
        return self.walls[1:] if self.axis else self.walls


def exactly_one(sizes: Sizes, names: tuple[str, ...], example: str) -> str:
    """The one of ``names`` that is given; raises ``ShapeError`` where none or several are."""
    given = [name for name in names if name in sizes]
    words = " or ".join(names)
    if len(given) > 1:
        raise ShapeError(given[1], f"is given beside {given[0]}", f"one of {words} is needed")
    if not given:
        raise ShapeError(names[0], "is missing", f"one of {words} is needed, such as {example}")
    return given[0]

"""What the case file may say one day and this version cannot do yet: the one list that shrinks as it learns."""

from __future__ import annotations

from fnmatch import fnmatchcase

# Pattern of a key's path -> what it would bring, as said to a user.
LATER: dict[str, str] = {
    "heat": "viscous heating",
    "fluid.name": "a known fluid by name",
    "fluid.points": "a viscosity from two temperatures",
    "fluid.law": "a viscosity that depends on the shear rate",
    "fluid.temperature": "a viscosity that depends on the temperature",
    "fluid.pressure": "a property that depends on the pressure",
    "fluid.density_temperature": "a density that depends on the temperature",
    "wall.*.temperature": "a wall temperature",
    "wall.*.insulated": "an insulated wall",
}

LATER_SHAPES: dict[str, str] = {
    "disc": "a gap between flat faces of revolution",
    "cone": "a gap between cones",
    "cone_plate": "a gap between a cone and a plate",
}


def later(key: str) -> str | None:
    """The plain words of a key that is not available yet, or None."""
    words = next((words for pattern, words in LATER.items() if fnmatchcase(key, pattern)), None)
    return None if words is None else f"{words} is not available in this version"

"""[wall.NAME.body]: a body that carries a wall."""

from __future__ import annotations

from typing import Any

from transient.case.history import read_history
from transient.case.inputs import BodyInput, Curve, GapInput
from transient.case.keys import BODY, ROTATING_ONLY, STRAIGHT_ONLY
from transient.case.reading import Reading, Section, si_value
from transient.drive.pieces import Drive, constant
from transient.units import DIMENSIONS, typed

_KEYS = {key.name: key for key in BODY}
_BEYOND = ("hold", "refuse")


def read_body(reading: Reading, gap: GapInput, end: int) -> BodyInput:
    """The body on one end of the gap; raises ``CaseError``."""
    section = reading.section(("wall", gap.shape.walls[end], "body"), _KEYS)
    _refuse_other_motion(section)
    turning = reading.rotating
    mass = section.read(_KEYS["inertia" if turning else "mass"])
    if mass is None:
        raise section.missing(_KEYS["inertia" if turning else "mass"])
    load_key, curve_key = ("torque", "torque_curve") if turning else ("force", "force_curve")
    values = {
        name: section.read(_KEYS[name])
        for name in ("incline", "damping", "dry_friction", "breakaway_friction", "stiffness", "initial_speed",
                     "initial_displacement", "displaces")
    }  # fmt: skip
    _check_values(section, gap, mass, values)
    return BodyInput(
        mass=mass,
        load=_load(section, load_key),
        curve=_curve(section, curve_key),
        area=_area(section, gap, end),
        **{**values, "breakaway_friction": values["breakaway_friction"] or values["dry_friction"]},
    )


def _refuse_other_motion(section: Section) -> None:
    """A mass has no place in a rotating gap, nor an inertia in a straight one."""
    table, place = (STRAIGHT_ONLY, "rotating") if section.reading.rotating else (ROTATING_ONLY, "straight")
    for name in section.given(table):
        instead = table[name]
        need = f"{instead} is needed, such as {instead} = {_KEYS[instead].example}" if instead else "leave it out"
        raise section.refuse(name, f"has no meaning in a {place} gap; {need}")


def _check_values(section: Section, gap: GapInput, mass: float, values: dict[str, Any]) -> None:
    breakaway = values["breakaway_friction"]
    if breakaway is not None and breakaway < values["dry_friction"]:
        raise section.fault("breakaway_friction", "is below dry_friction", "a value of dry_friction or more is needed")
    if values["initial_speed"] is not None and mass == 0.0:
        raise section.fault(
            "initial_speed", "is given to a body without mass", "its speed follows from the forces; leave it out"
        )
    if values["displaces"] is not None and section.reading.tree.get("pressure", {}).get("sealed") is not True:
        raise section.refuse("displaces", "is given without sealed; sealed = true in [pressure] is needed with it")
    if values["displaces"] is not None and (gap.length is None or gap.section is None):
        sizes = "gap.length and gap.width" if _has(gap, "width") else "gap.length"
        raise section.refuse("displaces", f"needs the gap's section and length; {sizes} is needed with it")


def _load(section: Section, name: str) -> Drive:
    if name not in section:
        return constant(0.0)
    return read_history(section.reading, (*section.path, name), section.tree[name], name)


def _area(section: Section, gap: GapInput, end: int) -> float:
    given = section.read(_KEYS["area"])
    if given is not None:
        return given
    if gap.areas[end] is not None:
        return gap.areas[end]  # type: ignore[return-value]
    sizes = " and ".join(f"gap.{name}" for name in ("length", "width") if _has(gap, name))
    raise section.refuse("area", f'is missing and cannot be derived; {sizes} or area = "15 cm^2" is needed')


def _has(gap: GapInput, name: str) -> bool:
    return any(size.name == name for size in gap.shape.sizes)


def _curve(section: Section, name: str) -> Curve | None:
    if name not in section:
        return None
    reading = section.reading
    dimension = _KEYS[name].dimension
    speed = "angular_speed" if reading.rotating else "speed"
    table = reading.section((*section.path, name), ("speeds", "values", "beyond"), section.tree[name])
    columns = []
    for column, own in (("speeds", speed), ("values", dimension)):
        items = table.tree.get(column)
        if not isinstance(items, list | tuple) or len(items) < 2:
            example = DIMENSIONS[own].example
            raise table.refuse(column, f'a list of at least two quantities is needed, such as ["{example}", ...]')
        columns.append(tuple(si_value(reading, (*table.path, column, i), v, own) for i, v in enumerate(items)))
    speeds, values = columns
    if len(speeds) != len(values):
        raise table.refuse("values", f"has {len(values)} items and speeds {len(speeds)}; as many are needed")
    for i in range(1, len(speeds)):
        if speeds[i] <= speeds[i - 1]:
            raise reading.source.fault(
                (*table.path, "speeds", i),
                items_at(table, i),
                "is not above the one before",
                "rising speeds are needed",
            )
    beyond = table.tree.get("beyond", "hold")
    if beyond not in _BEYOND:
        raise table.refuse("beyond", f'{typed(beyond)} is not known here; "hold" or "refuse" is needed')
    return Curve(speeds, values, beyond)


def items_at(table: Section, index: int) -> Any:
    """One speed of a curve as typed."""
    return table.tree["speeds"][index]

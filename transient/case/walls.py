"""[wall.NAME] and [wall.NAME.body]: what holds, moves or loads each wall."""

from __future__ import annotations

from typing import Any

from transient.case.body import read_body
from transient.case.history import read_history
from transient.case.inputs import GapInput, WallInput
from transient.case.keys import WALL
from transient.case.later import later
from transient.case.lines import Path
from transient.case.reading import Reading, Section
from transient.case.source import dotted, nearest
from transient.drive.pieces import Drive
from transient.units import typed

_ALONE = ("speed", "displacement", "shear_free", "body")


def read_walls(reading: Reading, gap: GapInput) -> tuple[WallInput | None, WallInput | None]:
    """The walls in the order of the ends, None for an axis; raises ``CaseError``."""
    names = gap.shape.real_walls
    tree = reading.tree.get("wall", {})
    if not isinstance(tree, dict):
        raise reading.source.fault(("wall",), tree, "is no table", f"a table such as [wall.{names[-1]}] is needed")
    for name in tree:
        if name not in names:
            raise reading.source.refuse(
                ("wall", name), f"{typed(name)} is no wall of this shape; {nearest(name, names)}"
            )
    return tuple(  # type: ignore[return-value]
        _wall(reading, gap, end) if name in names else None for end, name in enumerate(gap.shape.walls)
    )


def _wall(reading: Reading, gap: GapInput, end: int) -> WallInput:
    name = gap.shape.walls[end]
    section = reading.section(("wall", name), [key.name for key in WALL])
    keys = {key.name: key for key in WALL}
    given = [one for one in section.given(_ALONE) if section.tree[one] is not False]
    if len(given) > 1:
        raise section.refuse(given[1], f"is given beside {given[0]}; a wall has one of {', '.join(_ALONE)}")
    free = section.read(keys["shear_free"])
    slip = section.read(keys["slip_length"])
    if free and slip:
        raise section.refuse("slip_length", "is given beside shear_free; a wall has one of them")
    drives = {one: _drive(section, one) for one in ("speed", "displacement")}
    if drives["displacement"] is not None:
        _refuse_jump(section, drives["displacement"])
    body = None
    if "body" in section:
        section.read(keys["body"])
        body = read_body(reading, gap, end)
    return WallInput(name, drives["speed"], drives["displacement"], free, slip, body)


def _drive(section: Section, name: str) -> Drive | None:
    if name not in section:
        return None
    key = next(key for key in WALL if key.name == name)
    return history(section.reading, (*section.path, name), section.tree[name], key.measure(section.reading.rotating))


def history(reading: Reading, path: Path, value: Any, dimension: str) -> Drive:
    """A HISTORY at a key of its own; noted where this version cannot use that key yet."""
    drive = read_history(reading, path, value, dimension)
    words = later(dotted(path))
    if words:
        reading.not_yet.append((path, words))
    return drive


def _refuse_jump(section: Section, drive: Drive) -> None:
    """A displacement that jumps would need an infinite speed."""
    track_ends = [t.every if t.every < float("inf") else float(t.pieces.starts[-1]) for t in drive.tracks]
    # Two cycles of every repeat show each of its seams.
    until = 2.5 * max(track_ends) if max(track_ends) > 0.0 else 1.0
    pieces = drive.pieces(until)
    at = pieces.starts[pieces.jumps(0) != 0.0]
    if len(at):
        raise section.refuse(
            "displacement", f"jumps at t = {at[0]:.4g} s; a displacement without jumps is needed, such as a smooth_ramp"
        )

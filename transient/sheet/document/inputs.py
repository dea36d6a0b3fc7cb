"""Inputs as typed and in SI, and what follows from them without solving."""

from __future__ import annotations

from transient.case.derived import derived
from transient.case.reading import Input
from transient.sheet.document.blocks import Block, Table, Words
from transient.sheet.document.facts import Facts, number, printed
from transient.units import show

# More rows than this of one list (a table's values) are not repeated: the case stands in full at the end.
MOST = 80


def inputs(facts: Facts) -> tuple[Block, ...]:
    """The table of inputs."""
    if facts.case is None:
        return (Words("The inputs stand in the case file at the end; this version does not read it."),)
    given = facts.case.inputs()
    rows = tuple((one.key, one.typed, _si(one)) for one in given[:MOST])
    blocks: list[Block] = [Table(("input", "as typed", "in SI"), rows, numbers=(2,), wide=1)]
    if len(given) > MOST:
        blocks.append(Words(f"and {len(given) - MOST} more, all in the case file at the end."))
    return (*blocks, Words(_defaults(facts)))


def following(facts: Facts) -> tuple[Block, ...]:
    """Derived numbers; empty where the case cannot be read."""
    if facts.case is None:
        return ()
    rows = []
    for one in derived(facts.case):
        value = number(one.value) if one.dimension == "number" else printed(show(one.value, one.dimension))
        rows.append((one.name, value, one.note))
    return (Table(("follows", "value", "from"), tuple(rows), numbers=(1,), wide=2),)


def _si(one: Input) -> str:
    return "" if one.value is None else printed(f"{one.value:.10g} {one.unit}".rstrip())


def _defaults(facts: Facts) -> str:
    """What was left to its default and matters."""
    case = facts.case
    assert case is not None
    told = []
    still = [wall.name for wall in case.walls if wall is not None and _still(wall)]
    if still:
        told.append(f"the {' and the '.join(still)} wall stands still" if len(still) == 1 else "both walls stand still")
    if "state" not in (case.tree.get("start") or {}):
        told.append("the run starts from rest")
    if case.gap.count == 1:
        told.append("one gap")
    return f"Keys that are not listed have their defaults{': ' if told else ''}{'; '.join(told)}."


def _still(wall: object) -> bool:
    return all(getattr(wall, kind, None) in (None, False) for kind in ("speed", "displacement", "shear_free", "body"))

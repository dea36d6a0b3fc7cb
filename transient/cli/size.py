"""``transient size``: the value of one input at which a headline number meets its limit."""

from __future__ import annotations

import json
from typing import TYPE_CHECKING, Annotated

import typer

from transient.cli.progress import Bar, announce_compiling
from transient.cli.rows_bar import counting
from transient.cli.words import FAILED, GOOD, Overrides, Stop, Version, changes, note, one_line, refusals, say

if TYPE_CHECKING:
    from transient.sweep.size import Point, Sized


def size(
    case: Annotated[str, typer.Argument(metavar="CASE.toml", help="The case file.")],
    vary: Annotated[str, typer.Option("--vary", metavar="KEY", help="The key to find, such as gap.height.")],
    between: Annotated[
        tuple[str, str], typer.Option("--between", metavar="A B", help='Its bounds, such as "1 ms" "500 ms".')
    ],
    meet: Annotated[
        str, typer.Option("--meet", metavar="CONDITION", help='The limit, such as "upper.peak_stress <= 2 Pa".')
    ],
    as_json: Annotated[bool, typer.Option("--json", help="Print one JSON object, in SI.")] = False,
    overrides: Overrides = None,
    version: Version = False,
) -> int:
    """Find the value of one input at which a headline number just meets its limit.

    The quantities are settling.time, flow.final_mean_velocity and, of each wall, peak_stress, peak_force, peak_torque,
    final_stress and final_speed, all as magnitudes.  Where the limit is met everywhere or nowhere the values at both
    ends are said, and the status is 1.
    """
    from transient.case.read import read_case
    from transient.march.march import SolveError
    from transient.sweep.goal import read_goal
    from transient.sweep.size import size as sized

    wanted = changes(overrides)
    with refusals():
        stated = read_case(case, wanted)
        goal = read_goal(meet, stated)
        announce_compiling(Bar())
        try:
            with counting("evaluation") as watch:
                found = sized(stated, vary, between, goal, watch)
        except SolveError as error:
            raise Stop(f"{case}: {one_line(str(error))}", FAILED) from None
    if as_json:
        say(json.dumps(found.as_dict(), allow_nan=False))
    words = describe(found)
    for line in words:
        (note if as_json else say)(line)
    return GOOD if found.found is not None and found.found.verdict not in ("failed", "outside") else FAILED


def describe(found: Sized) -> list[str]:
    """What was found, in two or three lines."""
    goal = found.goal
    condition = f"{goal.name} {'<=' if goal.below else '>='} {_shown(found, goal.limit)}"
    low, high = found.ends
    reach = f"between {_input(found, low.value)} and {_input(found, high.value)}"
    count = f"{found.evaluations} evaluations"
    if found.found is None:
        where = "everywhere" if goal.met(low.magnitude) else "nowhere"
        at = " and ".join(f"{_answer(found, one)} at {_input(found, one.value)}" for one in found.ends)
        lines = [f"{condition} is met {where} {reach}: {goal.name} is {at} ({count})"]
    else:
        point = found.found
        met = " and ".join(f"from {_input(found, a)} to {_input(found, b)}" for a, b in found.met)
        lines = [
            f"{found.key} = {_input(found, point.value)}: {goal.name} is {_answer(found, point)}",
            f"{condition} is met {met} ({count})",
        ]
        if point.verdict in ("failed", "outside"):
            lines.append(f"caution: the answer there lies outside what the model describes (verdict {point.verdict})")
    if not found.monotone:
        lines.append(f"caution: {goal.name} is not monotone {reach}: it may pass the limit elsewhere too")
    return lines


def _input(found: Sized, value: float) -> str:
    from transient.units import show

    return show(value, found.dimension, 6)


def _shown(found: Sized, value: float) -> str:
    from transient.units import show

    return show(value, found.goal.dimension, 6)


def _answer(found: Sized, point: Point) -> str:
    from transient.result.said import stated

    if point.magnitude == float("inf"):
        return "not reached" if found.goal.name == "settling.time" else "infinite"
    return stated(point.magnitude, point.error, found.goal.unit)

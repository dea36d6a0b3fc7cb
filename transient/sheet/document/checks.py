"""Each check with value, limit, margin and source; cautions in words."""

from __future__ import annotations

from typing import Any

from transient.sheet.document.blocks import Block, Points, Table, Words
from transient.sheet.document.facts import Facts, number

WORDS = {"pass": "pass", "caution": "caution", "fail": "FAIL"}
MARKS = {"pass": "good", "caution": "caution", "fail": "bad"}
# A value this far below the limit of a check that did not pass is one that should have been above it.
ABOVE = 0.75

REVIEW = (
    "The flow is taken as laminar, one-dimensional and fully developed. Entrances, ends, side walls, turbulence and "
    "vortices are not in the numbers.",
    "Stresses on real machinery or on people need review under the local codes by a licensed practitioner.",
)


def validity(facts: Facts) -> tuple[Block, ...]:
    """Does the model apply."""
    return _table(facts, "validity", "No limit of the model was looked at in this run.")


def numerics(facts: Facts) -> tuple[Block, ...]:
    """Did the solver do its sums."""
    return _table(facts, "numerics", "No self-check was made in this run.")


def cautions(facts: Facts) -> tuple[Block, ...]:
    """What did not pass, then what holds for every sheet."""
    found = [one for one in facts.summary.get("checks") or [] if one["status"] != "pass"]
    own = [f"{WORDS[one['status']].capitalize()} ({one['name']}): {one['note']}." for one in found]
    for name, wall in facts.walls.items():
        if wall.get("unbounded"):
            own.append(
                f"The stress on {name} is infinite where its speed jumps. Real drives ramp: with the ramp stated, the "
                "stress has a peak."
            )
    factor = "No safety factor is included in any number."
    if facts.factor:
        factor = f"Only values named as factored are multiplied, by {facts.factor:g}; all others are unfactored."
    return (Points((*own, *REVIEW, factor)),)


def _table(facts: Facts, kind: str, none: str) -> tuple[Block, ...]:
    checks = [one for one in facts.summary.get("checks") or [] if one.get("kind", kind) == kind]
    if not checks:
        return (Words(none),)
    rows = tuple(
        (
            one["name"], WORDS[one["status"]], number(one["value"]), number(one["limit"]), margin(one),
            f"{one['note']}. Limit: {one['source']}.",
        )
        for one in checks
    )  # fmt: skip
    marks = tuple(MARKS[one["status"]] for one in checks)
    head = ("check", "", "value", "limit", "margin", "what it says, and where the limit is from")
    return (Table(head, rows, marks, numbers=(2, 3, 4), wide=5),)


def margin(check: dict[str, Any]) -> str:
    """How many times the value may still grow (or fall) until it meets the limit; below 1 it is past it."""
    value, limit = check.get("value"), check.get("limit")
    if value is None or not limit:
        return "–"
    if value == 0.0:
        return "all"
    passed = check["status"] == "pass"
    lower = value > limit if passed else value < ABOVE * limit
    ratio = abs(value / limit) if lower else abs(limit / value)
    return f"× {ratio:.2g}" if ratio < 100 else f"× {ratio:.0f}" if ratio < 1e3 else "× > 1000"

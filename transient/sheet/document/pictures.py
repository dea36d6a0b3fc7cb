"""Which figures a sheet shows, each with what it shows in a sentence."""

from __future__ import annotations

from transient.result.result import ResultError
from transient.sheet.document.blocks import Block, Picture
from transient.sheet.document.facts import Facts
from transient.sheet.figures import draw
from transient.sheet.sketch import subtitle

CAPTIONS = {
    "stress": "Drive and response: stress on every wall with the quasi-steady hand formula, and what drives it.",
    "flow": "Mean velocity and flow rate.",
    "profiles": "Velocity across the gap through time.",
    "lines": "Time lines: where lines of particles laid across the gap have moved.",
    "energy": "Loads, power and work: what walls and pressure put in, what the liquid keeps and what it dissipates.",
    "motion": "Motion of the walls' bodies, and the loads that move them.",
    "trust": "Stated errors and self-checks beside what is allowed: difference to the series or between refinements.",
}
# Inches from the top of a figure that its own title takes, which is the sheet's; with the line below it.
TITLE, HEADING = 0.2, 0.46


def pictures(facts: Facts) -> tuple[Block, ...]:
    """Every figure that this result has the histories for."""
    wanted = [name for name in CAPTIONS if name != "motion" or facts.summary.get("bodies")]
    found = []
    for name in wanted:
        try:
            found.append(Picture(name, CAPTIONS[name], draw(facts.result, name), TITLE))
        except ResultError:
            continue
    return tuple(found)


def sketch(facts: Facts) -> tuple[Block, ...]:
    """The gap with its directions and signs."""
    try:
        figure = draw(facts.result, "sketch")
    except ResultError:
        return ()
    return (Picture("sketch", subtitle(facts.result), figure, HEADING),)

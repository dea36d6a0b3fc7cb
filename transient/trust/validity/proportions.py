"""Proportions: is the gap long, wide and large enough to be one-dimensional and a continuum?"""

from __future__ import annotations

from transient.gap.problem import Problem
from transient.result.history import History
from transient.trust.check import Check, judge

TENTH = "end regions about one gap long; a tenth: common practice, no source"
SIDES = "side walls cost about 0.63 height/width of the flow (rectangular duct series, from memory)"
MOLECULES = "liquid layers below a micrometre: common practice, no source"


def thin_film(problem: Problem, history: History) -> Check | None:
    """Gap over length (a pipe: diameter over length), where the length is known."""
    if problem.length is None:
        return None
    size = 2.0 * problem.outer if problem.walls[0].kind == "axis" else problem.gap
    value = size / problem.length
    status = judge(value, 0.1, 1.0)
    words = {
        "pass": "the gap is short across and long along the flow",
        "caution": "the ends, about one gap long each, are a noticeable part of the length",
        "fail": "the gap is higher than long; the flow is not one-dimensional",
    }
    return Check("gap over length", "validity", status, value, 1.0, TENTH, words[status])


def side_walls(problem: Problem, history: History) -> Check | None:
    """Height over width, for plates of known width."""
    if problem.metric != 0 or problem.section is None:
        return None
    value = problem.gap**2 / problem.section
    status = judge(value, 0.05, 0.5)
    words = {
        "pass": "the side walls hardly matter",
        "caution": f"the side walls slow about {63 * value:.2g} % of the flow",
        "fail": "the gap is nearly as high as wide; the flow is not one-dimensional",
    }
    return Check("height over width", "validity", status, value, 0.5, SIDES, words[status])


def very_thin(problem: Problem, history: History) -> Check | None:
    """Gap against the scale of molecules and roughness; nothing to say above a micrometre."""
    if problem.gap >= 1e-6:
        return None
    status = "caution" if problem.gap >= 1e-8 else "fail"
    words = {
        "caution": "below a micrometre roughness and the liquid's molecules begin to matter",
        "fail": "only some molecules fit across the gap; the liquid is no continuum there",
    }
    return Check("very thin gap", "validity", status, problem.gap, 1e-6, MOLECULES, words[status])

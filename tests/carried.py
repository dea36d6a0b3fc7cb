"""Small cases whose walls carry bodies, or whose flow is prescribed, in plain numbers."""

from __future__ import annotations

from dataclasses import replace
from typing import Any

from problems import Value, held, problem

from transient.drive.pieces import Drive
from transient.gap.problem import Body, Problem

ENDS = {"lower": 0, "upper": 1}


def carried(shape: str = "plates", flow: Value | None = None, **more: Any) -> Problem:
    """``problems.problem`` with bodies: ``lower``, ``upper`` may be a dict of ``Body``'s fields (``load`` a number or a
    Drive, default 0; ``area`` 1, of which and of the wall's radius ``grip`` follows)."""
    bodies = {end: more.pop(end) for end in ENDS if isinstance(more.get(end), dict)}
    case = problem(shape, **more)
    walls = list(case.walls)
    for name, given in bodies.items():
        end = ENDS[name]
        fields = dict(given)
        load = fields.pop("load", 0.0)
        area = fields.pop("area", 1.0)
        lever = walls[end].radius if case.rotating else 1.0
        body = Body(load=load if isinstance(load, Drive) else held(load), grip=area * case.count * lever, **fields)
        walls[end] = replace(walls[end], body=body, area=area)
    given = None if flow is None else flow if isinstance(flow, Drive) else held(flow)
    return replace(case, walls=(walls[0], walls[1]), flow=given)

"""Grids of the lanes: a gap of unit width, density and viscosity, its two halves numbered from their walls inwards."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from transient.gap.problem import Law, Problem
from transient.gap.system import assemble, steady
from transient.march import lanes_layout as layout


def unit_problem(problem: Problem) -> Problem:
    """The same gap with lengths as shares of its width, unit density and viscosity."""
    gap = problem.gap
    inner = problem.inner / gap
    walls = tuple(replace(wall, slip_length=wall.slip_length / gap) for wall in problem.walls)
    return replace(
        problem, inner=inner, outer=inner + 1.0, density=1.0, law=Law(0, (1.0,)), walls=(walls[0], walls[1])
    )


def grid_table(unit: Problem, cells: int, layers: tuple[float, float]) -> tuple[np.ndarray, np.ndarray]:
    """(nodes [NODE_FIELDS, cells / 2 + 1, 2], ends [END_FIELDS, 2]) of a unit gap on an even number of ``cells``."""
    system = assemble(unit, cells, layers)
    grid = system.grid
    nodes = cells + 1
    fields = np.zeros((layout.NODE_FIELDS, nodes))
    fields[layout.STORAGE, system.first : system.first + system.unknowns] = system.volume
    fields[layout.WEIGHT] = grid.mean_weight
    fields[layout.LEVER] = grid.radius if unit.rotating else 1.0
    for row, unit_input in enumerate(np.eye(3)):
        if unit.rotating and row == 2:
            continue
        speeds = unit_input[:2]
        fields[layout.STEADY + row] = system.nodes(steady(system, speeds, unit_input[2]), speeds)
    half = cells // 2
    table = np.zeros((layout.NODE_FIELDS, half + 1, 2))
    table[:, :, 0] = fields[:, : half + 1]
    table[:, :, 1] = fields[:, : half - 1 : -1] if half else fields[:, ::-1]
    table[[layout.STORAGE, layout.WEIGHT], half] *= 0.5  # each half has its share of the middle node
    for side, order in ((0, 1), (1, -1)):
        table[layout.CONDUCTANCE, :half, side] = grid.conductance[::order][:half]
        step = grid.step[::order]
        table[layout.BEFORE, 1:, side] = step[:half]
        table[layout.AFTER, :, side] = step[: half + 1]
    ends = np.zeros((layout.END_FIELDS, 2))
    for side, wall in enumerate(unit.walls):
        held = bool(wall.kind == "moving" and wall.slip_length == 0.0)
        ends[layout.HELD, side] = held
        ends[layout.END, side] = 0.0 if held else system.end_conductance[side]
        ends[layout.FLUX, side] = system.end_conductance[side]
        ends[layout.CELL, side] = system.end_volume[side]
        ends[layout.RADIUS, side] = 1.0 / grid.stress_radius[side]
        ends[layout.DRIVE, side] = ends[layout.END, side]
        ends[layout.FLUID, side] = 1.0
    return table, ends

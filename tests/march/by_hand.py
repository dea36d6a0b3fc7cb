"""Marches on a grid and with steps of the test's own choice."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from transient.gap.problem import Problem
from transient.march.march import NO_PLAN, Plan, Trace, initial_state, march
from transient.march.plan import Resolution, features, resolve
from transient.march.readings import before_start, history, with_rates
from transient.result.history import History


def even_steps(starts: np.ndarray, until: float, each: int) -> Plan:
    """``each`` equal steps in every piece."""
    ends = np.append(starts[1:], until)
    share = np.arange(1, each + 1) / each
    lands = np.tile(np.arange(1, each + 1) == each, len(starts))
    return Plan(((ends - starts)[:, None] * share).ravel(), lands, 1)


def resolution(problem: Problem, until: float, cells: int, layers: tuple[float, float], accuracy=1e-3) -> Resolution:
    """Steps for ``accuracy``, but the grid as given."""
    inputs = problem.inputs(until)
    found = features(problem, inputs, until)
    slowest = 0.1 * problem.diffusion_time
    return replace(resolve(problem, inputs, found, accuracy, slowest, 1e-4), cells=cells, layers=layers)


def traced(problem: Problem, until: float, cells=24, layers=(0.3, 0.3), plan: Plan = NO_PLAN, **more) -> Trace:
    """What the kernel records."""
    inputs = problem.inputs(until)
    found = features(problem, inputs, until)
    return march(problem, inputs, until, found, resolution(problem, until, cells, layers, **more), plan=plan)


def told(problem: Problem, until: float, trace: Trace, every: int = 1) -> History:
    """The histories of a trace, ``every``-th node kept."""
    inputs = problem.inputs(until)
    before = before_start(problem, trace.system, inputs, initial_state(problem, trace.system, inputs))
    return with_rates(history(problem, inputs, trace, before, every))


def marched(problem: Problem, until: float, plan: Plan = NO_PLAN, **more) -> History:
    """The histories of one level."""
    return told(problem, until, traced(problem, until, plan=plan, **more))

"""One step of the lanes, and what is recorded of their state: see ``lanes``."""

from __future__ import annotations

from transient.compiled import part
from transient.march.lanes_layout import (
    LANE_A,
    LANE_BODY,
    LANE_CELL,
    LANE_CEND,
    LANE_DRIVE,
    LANE_FLUID,
    LANE_FLUX,
    LANE_FREE,
    LANE_HELD,
    LANE_RADIUS,
)
from transient.march.lanes_vector import fma, load, magnitude, splat, store, swapped, where_above

_TINY = 1e-300


@part
def factor(storage, conductance, pivot, lower, lane):
    """Factors of ``storage + a K`` for the lanes' steps."""
    last = storage.shape[0] - 1
    a = load(lane, LANE_A)
    free = load(lane, LANE_FREE)
    one = splat(1.0)
    through = a * load(conductance, 0)
    p = one / (load(storage, 0) + free * through + a * load(lane, LANE_CEND) + load(lane, LANE_HELD))
    store(pivot, 0, p)
    l = through * p
    store(lower, 1, l)
    gone = free * l * through
    for j in range(1, last):
        above = a * load(conductance, j)
        p = one / (load(storage, j) + through + above - gone)
        store(pivot, j, p)
        l = above * p
        store(lower, j + 1, l)
        gone = l * above
        through = above
    d = load(storage, last) + through - gone
    store(pivot, last, one / (d + swapped(d)))


@part
def polynomial(lane, row, x):
    """Cubic with coefficients in four rows of ``lane``."""
    return fma(x, fma(x, fma(x, load(lane, row + 3), load(lane, row + 2)), load(lane, row + 1)), load(lane, row))


@part
def slope_of(lane, row, x):
    """Derivative of that cubic."""
    return fma(x, fma(x, splat(3.0) * load(lane, row + 3), splat(2.0) * load(lane, row + 2)), load(lane, row + 1))


@part
def waved(lane, wave, turn):
    """Real part of the wave after a turn."""
    return load(lane, wave) * load(lane, turn) - load(lane, wave + 1) * load(lane, turn + 1)


@part
def turned(lane, wave, turn):
    """Move the wave on by a turn."""
    real = waved(lane, wave, turn)
    other = load(lane, wave) * load(lane, turn + 1) + load(lane, wave + 1) * load(lane, turn)
    store(lane, wave, real)
    store(lane, wave + 1, other)


@part
def first_stage(storage, pivot, lower, y, w, z, lane, share, low, push):
    """The Crank-Nicolson stage of all lanes: ``z`` becomes the base of the next one; the stage's wall speed, push."""
    last = storage.shape[0] - 1
    a = load(lane, LANE_A)
    bound = load(lane, LANE_HELD) + a * load(lane, LANE_DRIVE)
    fluid = load(lane, LANE_FLUID)
    free = load(lane, LANE_FREE)
    extra = a * push
    here = fma(load(storage, 0), fma(fluid, extra, load(z, 0)), bound * low)
    store(y, 0, here)
    for j in range(1, last):
        here = fma(load(lower, j), here, load(storage, j) * (load(z, j) + extra))
        store(y, j, here)
    here = fma(load(lower, last), here, load(storage, last) * (load(z, last) + extra))
    x = load(pivot, last) * (here + swapped(here))
    old = load(w, last)
    store(z, last, fma(share, x - old, old))
    for j in range(last - 1, 0, -1):
        x = fma(load(lower, j + 1), x, load(pivot, j) * load(y, j))
        old = load(w, j)
        store(z, j, fma(share, x - old, old))
    x = fma(free * load(lower, 1), x, load(pivot, 0) * load(y, 0))
    old = load(w, 0)
    store(z, 0, fma(share, x - old, old))


@part
def second_stage(storage, pivot, lower, y, w, z, lane, high, push):
    """The stage that closes the step: ``w`` and ``z`` move on."""
    last = storage.shape[0] - 1
    a = load(lane, LANE_A)
    bound = load(lane, LANE_HELD) + a * load(lane, LANE_DRIVE)
    fluid = load(lane, LANE_FLUID)
    free = load(lane, LANE_FREE)
    extra = a * push
    here = fma(load(storage, 0), fma(fluid, extra, load(z, 0)), bound * high)
    store(y, 0, here)
    for j in range(1, last):
        here = fma(load(lower, j), here, load(storage, j) * (load(z, j) + extra))
        store(y, j, here)
    base = load(z, last)
    here = fma(load(lower, last), here, load(storage, last) * (base + extra))
    x = load(pivot, last) * (here + swapped(here))
    store(w, last, x)
    store(z, last, x + x - base)
    for j in range(last - 1, 0, -1):
        x = fma(load(lower, j + 1), x, load(pivot, j) * load(y, j))
        base = load(z, j)
        store(w, j, x)
        store(z, j, x + x - base)
    x = fma(free * load(lower, 1), x, load(pivot, 0) * load(y, 0))
    base = load(z, 0)
    store(w, 0, x)
    store(z, 0, x + x - base)


@part
def respond(storage, pivot, lower, y, unit, weight, lane):
    """What one unit of push makes of a stage's velocities, into ``unit``; returns what it makes of their mean."""
    last = storage.shape[0] - 1
    a = load(lane, LANE_A)
    here = load(storage, 0) * a * load(lane, LANE_FLUID)
    store(y, 0, here)
    for j in range(1, last):
        here = fma(load(lower, j), here, load(storage, j) * a)
        store(y, j, here)
    here = fma(load(lower, last), here, load(storage, last) * a)
    x = load(pivot, last) * (here + swapped(here))
    store(unit, last, x)
    for j in range(last - 1, 0, -1):
        x = fma(load(lower, j + 1), x, load(pivot, j) * load(y, j))
        store(unit, j, x)
    store(unit, 0, fma(load(lane, LANE_FREE) * load(lower, 1), x, load(pivot, 0) * load(y, 0)))
    return mean_of(unit, weight)


@part
def mean_of(w, weight):
    """Mean velocity of all lanes."""
    total = load(weight, 0) * load(w, 0)
    for j in range(1, w.shape[0]):
        total = fma(load(weight, j), load(w, j), total)
    return total + swapped(total)


@part
def close_first(w, z, unit, weight, share, gain, wanted):
    """Push that gives the first stage the mean velocity ``wanted``, and its part of the next base."""
    old = mean_of(w, weight)
    found = old + (mean_of(z, weight) - old) / share
    push = (wanted - found) / gain
    part_of = share * push
    for j in range(w.shape[0]):
        store(z, j, fma(part_of, load(unit, j), load(z, j)))


@part
def close_second(w, z, unit, weight, gain, wanted):
    """The same for the step's end; returns the push."""
    push = (wanted - mean_of(w, weight)) / gain
    twice = push + push
    for j in range(w.shape[0]):
        store(w, j, fma(push, load(unit, j), load(w, j)))
        store(z, j, fma(twice, load(unit, j), load(z, j)))
    return push


@part
def _largest(w, steady, lever, before, after):
    """Largest deviation from the steady end over each case's gap, by the parabola around the largest node."""
    last = w.shape[0] - 1
    zero = splat(0.0)
    one = splat(1.0)
    half = splat(0.5)
    best = magnitude(load(w, 0) - load(steady, 0)) * load(lever, 0)
    left = zero
    right = zero
    low = zero  # distance to the node before; 0: the largest is at the wall
    high = one
    was = one
    previous = best
    for j in range(1, last):
        d = magnitude(load(w, j) - load(steady, j)) * load(lever, j)
        right = where_above(was, half, d, right)
        was = where_above(d, best, one, zero)
        left = where_above(d, best, previous, left)
        low = where_above(d, best, load(before, j), low)
        high = where_above(d, best, load(after, j), high)
        best = where_above(d, best, d, best)
        previous = d
    d = magnitude(load(w, last) - load(steady, last)) * load(lever, last)
    right = where_above(was, half, d, right)
    left = where_above(d, best, previous, left)
    right = where_above(d, best, swapped(previous), right)
    low = where_above(d, best, load(before, last), low)
    high = where_above(d, best, load(after, last), high)
    best = where_above(d, best, d, best)
    inside = where_above(low, zero, low, one)
    rise = (best - left) / inside
    fall = (best - right) / high
    bend = where_above(zero, fall, zero, rise + fall)  # 0 where the neighbour in the other half is larger
    width = inside + high
    slope = (rise * high - fall * inside) / width
    more = slope * slope * width * splat(0.25) / where_above(bend, splat(_TINY), bend, one)
    top = best + where_above(bend, splat(_TINY), where_above(low, zero, more, zero), zero)
    other = swapped(top)
    return where_above(top, other, top, other)


@part
def record(w, z, weight, steady, lever, before, after, lane, u, slope, g, out):
    """Stress, mean, largest deviation, wall speed and push of all lanes into rows 0 to 4 of ``out``.

    ``u``, ``slope``: the walls' inputs and their rates; a wall with a body has its node's speed and rate.
    """
    half = splat(0.5)
    body = load(lane, LANE_BODY)
    here = load(w, 0)
    beside = where_above(load(lane, LANE_HELD) + body, half, load(w, 1), here)
    u = where_above(body, half, here, u)
    slope = where_above(body, half, (load(z, 0) - here) / load(lane, LANE_A), slope)
    flux = fma(load(lane, LANE_FLUX), beside - u, load(lane, LANE_CELL) * (g - slope))
    store(out, 0, flux * load(lane, LANE_RADIUS))
    store(out, 1, mean_of(w, weight))
    store(out, 2, _largest(w, steady, lever, before, after))
    store(out, 3, u)
    store(out, 4, g)

"""Bodies on walls and prescribed flow, closed within the step.

In one stage the fluid's rates are linear in what the walls and the pressure do:
``f = p + dU_a h_a + dU_b h_b + dG h_g`` with ``h`` the rates that one unit of wall speed or pressure drop makes, known
with the step's factors.  What a body or a flow condition leaves unknown follows from a system of at most three
equations, so the fluid's own matrix stays tridiagonal and every coupling is implicit.  Unknowns are changes against
the stage's explicit guess: differences of speeds would lose their digits in tiny steps.
"""

from __future__ import annotations

from transient.compiled import part

# columns of the links between a wall and its body: [2, L, LINKS]
KIND, MASS, DAMPING, STIFFNESS, GRIP, PUSH, SLIDING, BREAKAWAY, SWEEP, CURVE_FIRST, CURVE_STOP, REFUSE = range(12)
LINKS = 12
PRESCRIBED, BODY = 0.0, 1.0
# rows of a wall's motion: [3, 2, L]
SPEED, RATE, PLACE = 0, 1, 2
# modes of dry friction: [2, L]
FREE, STUCK, FORWARD, BACKWARD = 0, 1, 2, 3
MOST_ITERATIONS = 60

# of the two stages: weight of the first two rates, implicit share, and the local error's weights (Hosea & Shampine)
GAMMA = 2.0 - 2.0**0.5
ALPHA = GAMMA / 2.0
SHARE = 2.0**0.5 / 4.0
ERROR = (SHARE - (1.0 - SHARE) / 3.0, SHARE - (3.0 * SHARE + 1.0) / 3.0, ALPHA - ALPHA / 3.0)


@part
def curve_load(speeds, values, first, stop, at, out):
    """Load and slope of a force-speed curve at a speed, end values held, into ``out`` (2,)."""
    if stop <= first:
        out[0] = 0.0
        out[1] = 0.0
        return
    if at <= speeds[first] or stop - first == 1:
        out[0] = values[first]
        out[1] = 0.0
        return
    if at >= speeds[stop - 1]:
        out[0] = values[stop - 1]
        out[1] = 0.0
        return
    low = first
    high = stop - 1
    while high - low > 1:
        middle = (low + high) // 2
        if speeds[middle] <= at:
            low = middle
        else:
            high = middle
    slope = (values[high] - values[low]) / (speeds[high] - speeds[low])
    out[0] = values[low] + slope * (at - speeds[low])
    out[1] = slope


@part
def friction(link, mode, e, l):
    """Dry friction's force on a sliding body."""
    if mode[e, l] == FORWARD:
        return -link[e, l, SLIDING]
    if mode[e, l] == BACKWARD:
        return link[e, l, SLIDING]
    return 0.0


@part
def solve_three(matrix, right, out):
    """Solve a 3 x 3 system by elimination with row exchange; ``matrix`` and ``right`` are used up."""
    for column in range(3):
        best = column
        for row in range(column + 1, 3):
            if abs(matrix[row, column]) > abs(matrix[best, column]):
                best = row
        if best != column:
            for k in range(3):
                held = matrix[column, k]
                matrix[column, k] = matrix[best, k]
                matrix[best, k] = held
            held = right[column]
            right[column] = right[best]
            right[best] = held
        for row in range(column + 1, 3):
            factor = matrix[row, column] / matrix[column, column]
            for k in range(column, 3):
                matrix[row, k] -= factor * matrix[column, k]
            right[row] -= factor * right[column]
    for row in range(2, -1, -1):
        total = right[row]
        for k in range(row + 1, 3):
            total -= matrix[row, k] * out[k]
        out[row] = total / matrix[row, row]


@part
def assemble_three(l, link, mode, flow, end_conductance, end_weight, response, scaled, slope, matrix):
    """The matrix of (dU_a, dU_b, dG).

    ``response`` [3, 3, L]: of each unit cause (columns) the rate beside the lower wall, beside the upper wall, and
    the mean of the rates; ``slope`` (2,) of the bodies' curves.
    """
    for e in range(2):
        for k in range(3):
            matrix[e, k] = 0.0
        if link[e, l, KIND] == PRESCRIBED or mode[e, l] == STUCK:
            matrix[e, e] = 1.0
            continue
        pull = link[e, l, GRIP] * end_conductance[e, l]
        for k in range(3):
            matrix[e, k] = -pull * scaled * response[e, k, l]
        matrix[e, e] += (
            link[e, l, MASS] / scaled + link[e, l, DAMPING] + scaled * link[e, l, STIFFNESS] + pull - slope[e]
        )
        matrix[e, 2] -= link[e, l, PUSH]
    for k in range(3):
        matrix[2, k] = 0.0
    if flow[l] == 0:
        matrix[2, 2] = 1.0
        return
    for k in range(3):
        matrix[2, k] = scaled * response[2, k, l]
    for e in range(2):
        matrix[2, e] += end_weight[e, l] + link[e, l, SWEEP]


@part
def close_stage(
    l, link, mode, flow, end_conductance, end_weight, response, scaled, curve_speed, curve_value,
    inputs, guess, place, near, mean, matrix, right, out, load, slope,
):  # fmt: skip
    """Changes (dU_a, dU_b, dG) of a stage's guess into ``out`` (3,).

    ``inputs`` [3, L] at the stage (loads where a wall carries a body); ``guess`` (3,) wall speeds and pressure drop
    assumed; ``place`` (2,) displacements at the stage if the speeds were zero in it; ``near`` (2,) the velocities
    beside the walls and ``mean`` of all unknowns under the guess.
    """
    at0 = guess[0]
    at1 = guess[1]
    for _ in range(MOST_ITERATIONS):
        for e in range(2):
            slope[e] = 0.0
            right[e] = 0.0
            if link[e, l, KIND] == PRESCRIBED:
                continue
            if mode[e, l] == STUCK:
                right[e] = -guess[e]
                continue
            at = at0 if e == 0 else at1
            curve_load(curve_speed, curve_value, int(link[e, l, CURVE_FIRST]), int(link[e, l, CURVE_STOP]), at, load)
            slope[e] = load[1]
            right[e] = (
                inputs[e, l]
                + load[0]
                + load[1] * (guess[e] - at)
                + friction(link, mode, e, l)
                - link[e, l, DAMPING] * guess[e]
                - link[e, l, STIFFNESS] * (place[e] + scaled * guess[e])
                + link[e, l, GRIP] * end_conductance[e, l] * (near[e] - guess[e])
                + link[e, l, PUSH] * guess[2]
            )
        right[2] = 0.0
        if flow[l] != 0:
            right[2] = inputs[2, l] - mean
            for e in range(2):
                right[2] -= (end_weight[e, l] + link[e, l, SWEEP]) * guess[e]
        assemble_three(l, link, mode, flow, end_conductance, end_weight, response, scaled, slope, matrix)
        solve_three(matrix, right, out)
        settled = True
        for e in range(2):
            if link[e, l, CURVE_STOP] <= link[e, l, CURVE_FIRST]:
                continue
            at = at0 if e == 0 else at1
            now = guess[e] + out[e]
            curve_load(curve_speed, curve_value, int(link[e, l, CURVE_FIRST]), int(link[e, l, CURVE_STOP]), now, load)
            predicted = load[0]
            steep = load[1]
            curve_load(curve_speed, curve_value, int(link[e, l, CURVE_FIRST]), int(link[e, l, CURVE_STOP]), at, load)
            off = abs(load[0] + load[1] * (now - at) - predicted)
            if steep != load[1] and off > 1e-13 * (abs(predicted) + abs(load[0])):
                settled = False
        at0 = guess[0] + out[0]
        at1 = guess[1] + out[1]
        if settled:
            return


@part
def guess_walls(link, flow, wall_base, gradient, inputs, given):
    """Walls' speeds and pressure of a stage before it is closed, in place of ``inputs``; these go to ``given``."""
    for l in range(inputs.shape[1]):
        for e in range(2):
            given[e, l] = inputs[e, l]
            if link[e, l, KIND] != PRESCRIBED:
                inputs[e, l] = wall_base[e, l]
        given[2, l] = inputs[2, l]
        if flow[l] != 0:
            inputs[2, l] = gradient[l]


@part
def close_walls(
    l, link, mode, flow, end_conductance, mean_weight, end_weight, units, response, scaled,
    curve_speed, curve_value, inputs, given, base, stage_rate, wall_base, place_base, wall_stage,
    gradient_stage, guess, place, near, matrix, right, change, load, slope,
):  # fmt: skip
    """Close one lane's stage: the walls' motion and the pressure, and the fluid's rates that go with them."""
    n = base.shape[0]
    s = scaled[l]
    for k in range(3):
        guess[k] = inputs[k, l]
    place[0], place[1] = place_base[0, l], place_base[1, l]
    near[0] = base[0, l] + s * stage_rate[0, l]
    near[1] = base[n - 1, l] + s * stage_rate[n - 1, l]
    mean = 0.0
    if flow[l] != 0:
        for i in range(n):
            mean += mean_weight[i, l] * (base[i, l] + s * stage_rate[i, l])
    close_stage(
        l, link, mode, flow, end_conductance, end_weight, response, s, curve_speed, curve_value,
        given, guess, place, near, mean, matrix, right, change, load, slope,
    )  # fmt: skip
    for i in range(n):
        stage_rate[i, l] += change[0] * units[0, i, l] + change[1] * units[1, i, l] + change[2] * units[2, i, l]
    for e in range(2):
        inputs[e, l] = guess[e] + change[e]
        wall_stage[SPEED, e, l] = inputs[e, l]
        # a body's rate; that of a prescribed wall is its own history's and not needed within the step
        wall_stage[RATE, e, l] = change[e] / s if link[e, l, KIND] != PRESCRIBED else 0.0
        wall_stage[PLACE, e, l] = place_base[e, l] + s * inputs[e, l]
    inputs[2, l] = guess[2] + change[2]
    gradient_stage[l] = inputs[2, l]


@part
def close_error(
    l, link, mode, flow, end_conductance, mean_weight, end_weight, units, response, scaled,
    curve_speed, curve_value, step, wall, wall_middle, wall_end, error, wall_error,
    matrix, right, change, load, slope,
):  # fmt: skip
    """Pass one lane's local error through the closed matrix, bodies and flow included."""
    n = error.shape[0]
    s = scaled[l]
    for e in range(2):
        slope[e] = 0.0
        right[e] = 0.0
        wall_error[e, l] = 0.0
        if link[e, l, KIND] == PRESCRIBED or mode[e, l] == STUCK:
            continue
        own = step[l] * (
            ERROR[0] * wall[RATE, e, l] + ERROR[1] * wall_middle[RATE, e, l] + ERROR[2] * wall_end[RATE, e, l]
        )
        gone = step[l] * (
            ERROR[0] * wall[SPEED, e, l] + ERROR[1] * wall_middle[SPEED, e, l] + ERROR[2] * wall_end[SPEED, e, l]
        )
        beside = error[0, l] if e == 0 else error[n - 1, l]
        right[e] = (
            link[e, l, MASS] * own / s
            - link[e, l, STIFFNESS] * gone
            + link[e, l, GRIP] * end_conductance[e, l] * beside
        )
        if link[e, l, CURVE_STOP] > link[e, l, CURVE_FIRST]:
            first, stop = int(link[e, l, CURVE_FIRST]), int(link[e, l, CURVE_STOP])
            curve_load(curve_speed, curve_value, first, stop, wall_end[SPEED, e, l], load)
            slope[e] = load[1]
    right[2] = 0.0
    if flow[l] != 0:
        for i in range(n):
            right[2] -= mean_weight[i, l] * error[i, l]
    assemble_three(l, link, mode, flow, end_conductance, end_weight, response, s, slope, matrix)
    solve_three(matrix, right, change)
    for i in range(n):
        error[i, l] += s * (change[0] * units[0, i, l] + change[1] * units[1, i, l] + change[2] * units[2, i, l])
    for e in range(2):
        wall_error[e, l] = change[e]

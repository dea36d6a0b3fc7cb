"""Bodies on walls and prescribed flow, closed within the step.

In one stage the fluid's rates are linear in what the walls and the pressure do:
``f = p + dU_a h_a + dU_b h_b + dG h_g`` with ``h`` the rates that one unit of wall speed or pressure drop makes, known
with the step's factors.  What a body or a flow condition leaves unknown follows from a system of at most three
equations, so the fluid's own matrix stays tridiagonal and every coupling is implicit.  Unknowns are changes against the stage's explicit guess: differences of
speeds would lose their digits in tiny steps.
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
def net_load(l, e, link, end_conductance, curve_speed, curve_value, inputs, near, wall, gradient, load):
    """Force on a body short of friction and of its own inertia."""
    curve_load(
        curve_speed, curve_value, int(link[e, l, CURVE_FIRST]), int(link[e, l, CURVE_STOP]), wall[SPEED, e, l], load
    )
    return (
        inputs[e, l]
        + load[0]
        - link[e, l, DAMPING] * wall[SPEED, e, l]
        - link[e, l, STIFFNESS] * wall[PLACE, e, l]
        + link[e, l, GRIP] * end_conductance[e, l] * (near - wall[SPEED, e, l])
        + link[e, l, PUSH] * gradient[l]
    )


@part
def choose_mode(l, e, link, mode, end_conductance, curve_speed, curve_value, inputs, near, wall, gradient, load):
    """What dry friction does from a body's present state on."""
    if link[e, l, KIND] == PRESCRIBED or link[e, l, BREAKAWAY] == 0.0:
        mode[e, l] = FREE
        return
    speed = wall[SPEED, e, l]
    if speed > 0.0:
        mode[e, l] = FORWARD
    elif speed < 0.0:
        mode[e, l] = BACKWARD
    else:
        net = net_load(l, e, link, end_conductance, curve_speed, curve_value, inputs, near, wall, gradient, load)
        if net > link[e, l, BREAKAWAY]:
            mode[e, l] = FORWARD
        elif net < -link[e, l, BREAKAWAY]:
            mode[e, l] = BACKWARD
        else:
            mode[e, l] = STUCK


@part
def begin(
    l, link, mode, flow, storage, conductance, volume, end_conductance, end_weight, mean_weight,
    curve_speed, curve_value, inputs, input_rates, velocity, rates, wall, gradient, load,
):  # fmt: skip
    """Rates of fluid and bodies, and the pressure drop, that belong to the present velocities and inputs.

    ``inputs``, ``input_rates`` [3, L]: values and slopes at the instant.
    """
    n = velocity.shape[0]
    for e in range(2):
        if link[e, l, KIND] == PRESCRIBED:
            wall[SPEED, e, l] = inputs[e, l]
            wall[RATE, e, l] = input_rates[e, l]
    if flow[l] == 0:
        gradient[l] = inputs[2, l]
    for i in range(n):
        here = velocity[i, l]
        below = end_conductance[0, l] * (wall[SPEED, 0, l] - here)
        if i > 0:
            below = conductance[i - 1, l] * (velocity[i - 1, l] - here)
        above = end_conductance[1, l] * (wall[SPEED, 1, l] - here)
        if i + 1 < n:
            above = conductance[i, l] * (velocity[i + 1, l] - here)
        rates[i, l] = (below + above) / storage[i, l]
    # with a prescribed flow the pressure is what keeps the flow's own rate; friction's mode depends on it and back
    for _ in range(3):
        for e in range(2):
            near = velocity[0, l] if e == 0 else velocity[n - 1, l]
            choose_mode(
                l, e, link, mode, end_conductance, curve_speed, curve_value, inputs, near, wall, gradient, load
            )
        if flow[l] == 0:
            break
        have = 0.0
        per_push = 0.0
        for i in range(n):
            have += mean_weight[i, l] * rates[i, l]
            per_push += mean_weight[i, l] * volume[i, l] / storage[i, l]
        for e in range(2):
            share = end_weight[e, l] + link[e, l, SWEEP]
            if link[e, l, KIND] == PRESCRIBED:
                have += share * wall[RATE, e, l]
            elif mode[e, l] != STUCK:
                near = velocity[0, l] if e == 0 else velocity[n - 1, l]
                net = net_load(l, e, link, end_conductance, curve_speed, curve_value, inputs, near, wall, gradient, load)
                still = net - link[e, l, PUSH] * gradient[l] + friction(link, mode, e, l)
                have += share * still / link[e, l, MASS]
                per_push += share * link[e, l, PUSH] / link[e, l, MASS]
        gradient[l] = (input_rates[2, l] - have) / per_push
    for i in range(n):
        rates[i, l] += volume[i, l] * gradient[l] / storage[i, l]
    for e in range(2):
        if link[e, l, KIND] == PRESCRIBED:
            continue
        if mode[e, l] == STUCK:
            wall[RATE, e, l] = 0.0
            continue
        near = velocity[0, l] if e == 0 else velocity[n - 1, l]
        net = net_load(l, e, link, end_conductance, curve_speed, curve_value, inputs, near, wall, gradient, load)
        wall[RATE, e, l] = (net + friction(link, mode, e, l)) / link[e, l, MASS]


@part
def impulse(l, link, mode, flow, storage, volume, end_weight, mean_weight, step_of_flow, velocity, wall):
    """A sudden change of the prescribed flow: all fluid (and what hangs on it) is pushed at once."""
    if flow[l] == 0 or step_of_flow == 0.0:
        return
    n = velocity.shape[0]
    per_push = 0.0
    for i in range(n):
        per_push += mean_weight[i, l] * volume[i, l] / storage[i, l]
    for e in range(2):
        if link[e, l, KIND] != PRESCRIBED and mode[e, l] != STUCK:
            share = end_weight[e, l] + link[e, l, SWEEP]
            per_push += share * link[e, l, PUSH] / link[e, l, MASS]
    push = step_of_flow / per_push
    for i in range(n):
        velocity[i, l] += volume[i, l] * push / storage[i, l]
    for e in range(2):
        if link[e, l, KIND] != PRESCRIBED and mode[e, l] != STUCK:
            wall[SPEED, e, l] += link[e, l, PUSH] * push / link[e, l, MASS]

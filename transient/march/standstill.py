"""What bodies do at instants: their first rates, dry friction's modes, stops and breakings-away."""

from __future__ import annotations

from transient.compiled import part
from transient.march.closure import (
    BACKWARD,
    BREAKAWAY,
    CURVE_FIRST,
    CURVE_STOP,
    DAMPING,
    FORWARD,
    FREE,
    GRIP,
    KIND,
    MASS,
    PLACE,
    PRESCRIBED,
    PUSH,
    RATE,
    REFUSE,
    SPEED,
    STIFFNESS,
    STUCK,
    SWEEP,
    curve_load,
    friction,
)

EVENT_SHARE = 0.01  # of the step tolerance: how exactly a stop or a breaking away is located


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
                net = net_load(
                    l, e, link, end_conductance, curve_speed, curve_value, inputs, near, wall, gradient, load
                )
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


@part
def until_event(
    l, link, mode, end_conductance, curve_speed, curve_value, given, end, wall, wall_end,
    gradient_end, net_before, step, tolerance, velocity_scale, stress_scale, load,
):  # fmt: skip
    """A shorter step where a body passes standstill, or breaks away, well inside this one; else 0.

    The speed that a stop leaves away must be nothing to the motion, nor to the stress on the wall.
    """
    n = end.shape[0]
    shorter = 0.0
    for e in range(2):
        if link[e, l, KIND] == PRESCRIBED or mode[e, l] == FREE:
            continue
        if mode[e, l] == STUCK:
            held = link[e, l, BREAKAWAY]
            near = end[0, l] if e == 0 else end[n - 1, l]
            net = abs(
                net_load(
                    l, e, link, end_conductance, curve_speed, curve_value, given, near, wall_end, gradient_end, load
                )
            )
            before = min(net_before[e, l], held)
            if net - held > EVENT_SHARE * tolerance * held and net > before:
                wanted = step * max(0.05, min((held - before) / (net - before) + 0.01, 0.95))
                shorter = wanted if shorter == 0.0 else min(shorter, wanted)
            continue
        now = wall_end[SPEED, e, l]
        if (mode[e, l] == FORWARD and now < 0.0) or (mode[e, l] == BACKWARD and now > 0.0):
            before = abs(wall[SPEED, e, l])
            left = max(abs(now) / velocity_scale, end_conductance[e, l] * abs(now) / stress_scale[e, l])
            if left > EVENT_SHARE * tolerance and before > 0.0:
                wanted = step * max(0.05, min(before / (before + abs(now)) + 0.01, 0.95))
                shorter = wanted if shorter == 0.0 else min(shorter, wanted)
    return shorter


@part
def advance_walls(
    l, link, mode, end_conductance, curve_speed, curve_value, given, end_slope, velocity, wall,
    wall_end, gradient, gradient_end, net_before, load,
):  # fmt: skip
    """Take over the walls' motion; whether a body came to a stop or broke away at this instant."""
    n = velocity.shape[0]
    gradient[l] = gradient_end[l]
    event = False
    for e in range(2):
        for kind in range(3):
            wall[kind, e, l] = wall_end[kind, e, l]
        if link[e, l, KIND] == PRESCRIBED:
            wall[RATE, e, l] = end_slope[e, l]
            continue
        if mode[e, l] == FREE:
            continue
        if mode[e, l] == STUCK:
            near = velocity[0, l] if e == 0 else velocity[n - 1, l]
            net = net_load(l, e, link, end_conductance, curve_speed, curve_value, given, near, wall, gradient, load)
            net = abs(net)
            net_before[e, l] = net
            event = event or net > link[e, l, BREAKAWAY]
            continue
        now = wall[SPEED, e, l]
        if (mode[e, l] == FORWARD and now <= 0.0) or (mode[e, l] == BACKWARD and now >= 0.0):
            wall[SPEED, e, l] = 0.0
            net_before[e, l] = 0.0
            event = True
    return event


@part
def left_curve(l, link, curve_speed, wall):
    """Whether a body that refuses it has left the speeds of its curve."""
    for e in range(2):
        if link[e, l, KIND] != PRESCRIBED and link[e, l, REFUSE] > 0.0:
            low = curve_speed[int(link[e, l, CURVE_FIRST])]
            high = curve_speed[int(link[e, l, CURVE_STOP]) - 1]
            if wall[SPEED, e, l] < low or wall[SPEED, e, l] > high:
                return True
    return False

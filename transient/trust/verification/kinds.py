"""Every history kind twice: as the product compiles it, and restated."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from transient.drive import KINDS
from transient.drive.pieces import Drive, constant
from transient.trust.verification import motion
from transient.trust.verification.motion import Motion

UNTIL = 1.8  # length of the runs in diffusion times


@dataclass(frozen=True)
class Twin:
    """A history kind in words, and a pair (product's drive, restated motion) for a size and a diffusion time (s)."""

    name: str
    build: Callable[[float, float], tuple[Drive, Motion]]


def build(kind: str, **keys: object) -> Drive:
    """A history as the product compiles it."""
    return KINDS[kind].build(**keys)


def sudden(u: float, t: float) -> tuple[Drive, Motion]:
    return constant(u, before=0.0), motion.held(u)


def step(u: float, t: float) -> tuple[Drive, Motion]:
    return build("step", to=u, from_=0.3 * u, at=0.1 * t), motion.step(u, 0.3 * u, 0.1 * t)


def ramp(u: float, t: float) -> tuple[Drive, Motion]:
    return build("ramp", to=u, over=0.2 * t, at=0.05 * t), motion.ramp(u, 0.2 * t, at=0.05 * t)


def smooth_ramp(u: float, t: float) -> tuple[Drive, Motion]:
    keys = {"to": u, "over": 0.5 * t, "from_": 0.2 * u, "at": 0.1 * t}
    return build("smooth_ramp", **keys), motion.smooth_ramp(**keys)


def s_curve(u: float, t: float) -> tuple[Drive, Motion]:
    keys = {"to": u, "acceleration": 3.0 * u / t, "jerk": 30.0 * u / t**2}
    return build("s_curve", **keys), motion.s_curve(**keys)


def trapezoid(u: float, t: float) -> tuple[Drive, Motion]:
    keys = {"to": u, "rise": 0.2 * t, "hold": 0.3 * t, "fall": 0.1 * t, "from_": -0.25 * u}
    return build("trapezoid", **keys), motion.trapezoid(**keys)


def lag(u: float, t: float) -> tuple[Drive, Motion]:
    keys = {"to": u, "time_constant": 0.15 * t, "from_": 0.0}
    return build("lag", **keys), motion.lag(**keys)


def sine(u: float, t: float) -> tuple[Drive, Motion]:
    keys = {"amplitude": u, "frequency": 2.5 / t, "mean": 0.3 * u, "phase": 0.0}
    return build("sine", **keys), motion.sine(**keys)


def half_sine(u: float, t: float) -> tuple[Drive, Motion]:
    keys = {"amplitude": u, "over": 0.4 * t, "at": 0.1 * t}
    return build("half_sine", **keys), motion.half_sine(**keys)


def table(u: float, t: float) -> tuple[Drive, Motion]:
    times, values = [0.0, 0.2 * t, 0.5 * t, 0.9 * t], [0.1 * u, 0.8 * u, 0.3 * u, u]
    return build("table", times=np.array(times), values=np.array(values)), motion.lines(times, values)


def smooth_table(u: float, t: float) -> tuple[Drive, Motion]:
    times, values = [0.0, 0.2 * t, 0.5 * t, 0.9 * t], [0.0, 0.7 * u, 0.9 * u, u]
    drive = build("table", times=np.array(times), values=np.array(values), interpolation="smooth")
    return drive, motion.monotone(times, values)


def added(u: float, t: float) -> tuple[Drive, Motion]:
    one, first = build("ramp", to=u, over=0.3 * t), motion.ramp(u, 0.3 * t)
    other, second = half_sine(-0.4 * u, t)
    return build("sum", parts=[one, other]), motion.total(first, second)


def repeated(u: float, t: float) -> tuple[Drive, Motion]:
    part, once = half_sine(u, 0.8 * t)
    return build("repeat", part=part, every=0.6 * t), motion.again(once, 0.6 * t, UNTIL * t)


TWINS = (
    Twin("sudden step", step),
    Twin("ramp", ramp),
    Twin("smooth ramp", smooth_ramp),
    Twin("s-curve", s_curve),
    Twin("trapezoid", trapezoid),
    Twin("lag", lag),
    Twin("sine", sine),
    Twin("half sine", half_sine),
    Twin("table of straight lines", table),
    Twin("smooth table", smooth_table),
    Twin("sum", added),
    Twin("repeat", repeated),
)

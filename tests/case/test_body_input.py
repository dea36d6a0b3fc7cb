"""Bodies, displacements, slip and prescribed flow: read and checked in full, solved by a later version."""

from __future__ import annotations

import math
from collections.abc import Callable

import numpy as np
import pytest

from transient.case.inputs import Curve
from transient.case.model import Case

F = "carriage.toml"
SPEED = 'speed = { kind = "ramp", to = "0.30 m/s", over = "50 ms" }'
GAP = 'shape = "plates"\n\n\nheight = "0.2 mm"\nlength = "60 mm"\nwidth = "25 mm"'
RING = 'shape = "annulus"\nmotion = "rotating"\ninner_radius = "9 mm"\nradial_clearance = "1 mm"\nlength = "40 mm"'
UPPER = "[wall.upper]\n" + SPEED


def body(text: str) -> dict[str, str]:
    """The carriage with a body instead of a speed."""
    return {SPEED: f"[wall.upper.body]\n{text}"}


def rotor(text: str) -> dict[str, str]:
    """A rotor in a rotating gap."""
    return {GAP: RING, UPPER: f"[wall.inner.body]\n{text}"}


@pytest.mark.usefixtures("everything")
def test_a_body_in_numbers(read: Callable[..., Case]) -> None:
    case = read(body(
        'mass = "2 kg"\nforce = "5 N"\nincline = "30 deg"\ndamping = "3 N*s/m"\ndry_friction = "0.4 N"\n'
        'stiffness = "200 N/m"\ninitial_speed = "0.1 m/s"\ninitial_displacement = "2 mm"\n'
        'force_curve = { speeds = ["0 m/s", "1 m/s"], values = ["8 N", "0 N"], beyond = "refuse" }'
    ))  # fmt: skip
    carried = case.walls[1].body  # type: ignore[union-attr]
    assert carried is not None
    assert (carried.mass, carried.damping, carried.stiffness) == (2.0, 3.0, 200.0)
    assert (carried.dry_friction, carried.breakaway_friction) == (0.4, 0.4)
    assert carried.incline == pytest.approx(math.pi / 6, rel=1e-15)
    assert (carried.initial_speed, carried.initial_displacement) == (0.1, 0.002)
    assert carried.area == pytest.approx(60e-3 * 25e-3)
    assert carried.curve == Curve((0.0, 1.0), (8.0, 0.0), "refuse")
    assert carried.load.pieces(1.0).value(np.array([0.5])).tolist() == [5.0]
    assert carried.displaces is None


@pytest.mark.usefixtures("everything")
def test_a_rotor_in_numbers(read: Callable[..., Case]) -> None:
    carried = read(rotor('inertia = "0 kg*m^2"\ntorque = "0.5 N*m"\nstiffness = "1 N*m/deg"')).walls[0].body  # type: ignore[union-attr]
    assert carried is not None
    assert (carried.mass, carried.initial_speed) == (0.0, None)
    assert carried.stiffness == pytest.approx(180 / math.pi, rel=1e-15)
    assert carried.area == pytest.approx(2 * math.pi * 9e-3 * 40e-3)


@pytest.mark.usefixtures("everything")
def test_a_plunger_pushes_its_volume(read: Callable[..., Case]) -> None:
    case = read(body('mass = "2 kg"\narea = "15 cm^2"\ndisplaces = "3 cm^2"'), "[pressure]\nsealed = true\n")
    carried = case.walls[1].body  # type: ignore[union-attr]
    assert carried is not None
    assert (carried.area, carried.displaces) == (0.0015, 0.0003)
    assert case.pressure.kind == "sealed"


@pytest.mark.usefixtures("everything")
def test_other_walls_and_flows(read: Callable[..., Case]) -> None:
    case = read({SPEED: "shear_free = true"}, '[wall.lower]\nslip_length = "2 um"\n[pressure]\nflow_rate = "6 L/min"\n')
    assert case.walls[1].shear_free  # type: ignore[union-attr]
    assert case.walls[0].slip_length == 2e-6  # type: ignore[union-attr]
    assert case.pressure.kind == "flow_rate"
    assert case.pressure.drive.pieces(1.0).value(np.array([0.5])) == pytest.approx([1e-4])  # type: ignore[union-attr]
    kinds = [wall.kind for wall in case.problem().walls]
    assert kinds == ["moving", "shear_free"]


W = f"{F}:16: wall.upper"
B = f"{F}:17: wall.upper.body"
R = f"{F}:15: wall.inner.body"


@pytest.mark.usefixtures("everything")
@pytest.mark.parametrize(
    ("exchange", "message"),
    [
        ({SPEED: SPEED + '\nbody = { mass = "2 kg" }'},
         f"{F}:17: wall.upper.body: is given beside speed; a wall has one of speed, displacement, shear_free, body"),
        ({SPEED: SPEED + "\nshear_free = true"},
         f"{F}:17: wall.upper.shear_free: is given beside speed; "
         "a wall has one of speed, displacement, shear_free, body"),
        ({SPEED: 'shear_free = true\nslip_length = "1 um"'},
         f"{F}:17: wall.upper.slip_length: is given beside shear_free; a wall has one of them"),
        ({SPEED: 'shear_free = "yes"'},
         f'{W}.shear_free: "yes" is neither true nor false; true or false is needed, without quotes'),
        ({SPEED: 'slip_length = "-1 um"'},
         f'{W}.slip_length: "-1 um" is below zero; a length of zero or more is needed, such as "0.2 mm"'),
        (body('force = "5 N"'), f'{W}.body.mass: is missing; a mass is needed, such as "2 kg"'),
        (body('inertia = "1 kg*m^2"'),
         f'{B}.inertia: has no meaning in a straight gap; mass is needed, such as mass = "2 kg"'),
        (body('mass = "1 kg"\ntorque = "1 N*m"'),
         f'{F}:18: wall.upper.body.torque: has no meaning in a straight gap; force is needed, such as force = "5 N"'),
        (rotor('mass = "1 kg"'),
         f'{R}.mass: has no meaning in a rotating gap; inertia is needed, such as inertia = "0.02 kg*m^2"'),
        (rotor('inertia = "1 kg*m^2"\nincline = "1 deg"'),
         f"{F}:16: wall.inner.body.incline: has no meaning in a rotating gap; leave it out"),
        (rotor('inertia = "1 kg"'),
         f'{R}.inertia: "1 kg" is a mass; a moment of inertia is needed, such as "1 kg*m^2"'),
        (body('mass = "-1 kg"'),
         f'{B}.mass: "-1 kg" is below zero; a mass of zero or more is needed, such as "2 kg"'),
        (body('mass = "1 kg"\nstiffness = "-5 N/m"'),
         f'{F}:18: wall.upper.body.stiffness: "-5 N/m" is below zero; '
         'a stiffness (force per length) of zero or more is needed, such as "200 N/m"'),
        (body('mass = "1 kg"\ndry_friction = "2 N"\nbreakaway_friction = "1 N"'),
         f'{F}:19: wall.upper.body.breakaway_friction: "1 N" is below dry_friction; '
         "a value of dry_friction or more is needed"),
        (body('mass = "0 kg"\ninitial_speed = "1 m/s"'),
         f'{F}:18: wall.upper.body.initial_speed: "1 m/s" is given to a body without mass; '
         "its speed follows from the forces; leave it out"),
        (body('mass = "1 kg"\ndisplaces = "3 cm^2"'),
         f"{F}:18: wall.upper.body.displaces: is given without sealed; sealed = true in [pressure] is needed with it"),
        ({'width = "25 mm"': "", **body('mass = "1 kg"')},
         f"{F}:16: wall.upper.body.area: is missing and cannot be derived; "
         'gap.length and gap.width or area = "15 cm^2" is needed'),
        ({GAP: RING.replace('\nlength = "40 mm"', ""), UPPER: '[wall.inner.body]\ninertia = "1 kg*m^2"'},
         f"{F}:13: wall.inner.body.area: is missing and cannot be derived; "
         'gap.length or area = "15 cm^2" is needed'),
        (body('mass = "1 kg"\nforce_curve = { speeds = ["1 m/s", "0 m/s"], values = ["1 N", "2 N"] }'),
         f'{F}:18: wall.upper.body.force_curve.speeds.2: "0 m/s" is not above the one before; '
         'rising speeds are needed'),
        (body('mass = "1 kg"\nforce_curve = { speeds = ["1 m/s", "2 m/s"], values = ["1 N"] }'),
         f"{F}:18: wall.upper.body.force_curve.values: "
         'a list of at least two quantities is needed, such as ["5 N", ...]'),
        (body('mass = "1 kg"\nforce_curve = { speeds = ["0 m/s", "2 m/s"], values = ["1 N", "2 N", "3 N"] }'),
         f"{F}:18: wall.upper.body.force_curve.values: has 3 items and speeds 2; as many are needed"),
        (body('mass = "1 kg"\nforce_curve = { speeds = ["0 m/s", "2 m/s"], values = ["1 N", "2 N"], beyond = "x" }'),
         f'{F}:18: wall.upper.body.force_curve.beyond: "x" is not known here; "hold" or "refuse" is needed'),
        (body('mass = "1 kg"\nforce_curve = { speeds = [0, 2], values = ["1 N", "2 N"] }'),
         f'{F}:18: wall.upper.body.force_curve.speeds.1: 0 has no unit; a speed is needed, such as "0.3 m/s"'),
        (body('mass = "1 kg"\nmas = "1 kg"'), f'{F}:18: wall.upper.body.mas: unknown key; did you mean "mass"?'),
        ({SPEED: 'displacement = "1 mm"'},
         f"{W}.displacement: jumps at t = 0 s; a displacement without jumps is needed, such as a smooth_ramp"),
        ({SPEED: 'displacement = { kind = "step", to = "1 mm", at = "2 s" }'},
         f"{W}.displacement: jumps at t = 2 s; a displacement without jumps is needed, such as a smooth_ramp"),
        ({SPEED: 'displacement = { kind = "repeat", every = "1 s", '
                'part = { kind = "ramp", to = "1 mm", over = "1 s" } }'},
         f"{W}.displacement: jumps at t = 1 s; a displacement without jumps is needed, such as a smooth_ramp"),
        ({'width = "25 mm"': '[pressure]\nflow_rate = "1 L/min"'},
         f'{F}:10: pressure.flow_rate: needs gap.width; add it, such as width = "25 mm" in [gap]'),
    ],
)  # fmt: skip
def test_refused(refusal: Callable[..., str], exchange: dict[str, str], message: str) -> None:
    assert refusal(exchange) == message


@pytest.mark.usefixtures("everything")
@pytest.mark.parametrize(
    "displacement",
    [
        '{ kind = "sine", amplitude = "1 mm", frequency = "5 Hz" }',
        '{ kind = "smooth_ramp", to = "1 mm", over = "1 s" }',
        '{ kind = "repeat", every = "1 s", part = { kind = "half_sine", amplitude = "1 mm", over = "1 s" } }',
    ],
)
def test_displacements_without_jumps_pass(read: Callable[..., Case], displacement: str) -> None:
    assert read({SPEED: f"displacement = {displacement}"}).walls[1].displacement is not None  # type: ignore[union-attr]


@pytest.mark.parametrize(
    "exchange",
    [body('mass = "1 kg"'), {SPEED: 'slip_length = "1 um"'}, {SPEED: "shear_free = true"}],
)
def test_bodies_slip_and_free_surfaces_become_part_of_the_problem(
    read: Callable[..., Case], exchange: dict[str, str]
) -> None:
    wall = read(exchange).problem().walls[1]
    assert wall.body is not None or wall.slip_length > 0.0 or wall.kind == "shear_free"


def test_what_changes_nothing_passes(read: Callable[..., Case]) -> None:
    assert read({SPEED: SPEED + '\nshear_free = false\nslip_length = "0 um"'}).problem().walls[1].slip_length == 0.0

"""Every refusal is one line with file, line, key, what was given, what is needed and an example."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

import pytest

from transient.case.read import CaseError, read_case

F = "carriage.toml"
HEIGHT = 'height = "0.2 mm"'
SPEED = 'speed = { kind = "ramp", to = "0.30 m/s", over = "50 ms" }'
AUTO = 'duration = "auto"'
GAP = 'shape = "plates"\n\n\nheight = "0.2 mm"\nlength = "60 mm"\nwidth = "25 mm"'
UPPER = "[wall.upper]\n" + SPEED


def spoilt(old: str, new: str, message: str) -> object:
    """One row: what is exchanged in the carriage's file, and the exact message."""
    return pytest.param({old: new}, message, id=message.split(": ", 1)[1][:60])


SIZES = [
    spoilt(HEIGHT, 'height = "0.2 kg"', f'{F}:7: gap.height: "0.2 kg" is a mass; a length is needed, such as "0.2 mm"'),
    spoilt(HEIGHT, "height = 0.2", f'{F}:7: gap.height: 0.2 has no unit; a length is needed, such as "0.2 mm"'),
    spoilt(HEIGHT, "height = nan", f'{F}:7: gap.height: nan is not a finite number; '
           'a length is needed, such as "0.2 mm"'),
    spoilt(HEIGHT, 'height = "inf mm"',
           f'{F}:7: gap.height: "inf mm" is not a finite number; a length is needed, such as "0.2 mm"'),
    spoilt(HEIGHT, 'height = "-0.2 mm"',
           f'{F}:7: gap.height: "-0.2 mm" is not above zero; a length above zero is needed, such as "0.2 mm"'),
    spoilt(HEIGHT, 'height = "0 mm"',
           f'{F}:7: gap.height: "0 mm" is not above zero; a length above zero is needed, such as "0.2 mm"'),
    spoilt(HEIGHT, 'height = "0,2 mm"',
           f'{F}:7: gap.height: "0,2 mm" has a decimal comma; a length is needed, such as "0.2 mm"'),
    spoilt(HEIGHT, 'heigth = "0.2 mm"', f'{F}:7: gap.heigth: unknown key; did you mean "height"?'),
    spoilt(HEIGHT, HEIGHT + '\ncolour = "red"',
           f"{F}:8: gap.colour: unknown key; known here: shape, height, length, width, count"),
    spoilt(HEIGHT, "", f'{F}:3: gap.height: is missing; a length is needed, such as "0.80 mm"'),
    spoilt(HEIGHT, HEIGHT + "\ncount = 0",
           f"{F}:8: gap.count: 0 is no whole number from 1 to 1000000; one is needed, such as 4"),
    spoilt(HEIGHT, HEIGHT + "\ncount = 2.5",
           f"{F}:8: gap.count: 2.5 is no whole number from 1 to 1000000; one is needed, such as 4"),
    spoilt('shape = "plates"', "", f'{F}:3: gap.shape: is missing; '
           'a shape is needed, one of "plates", "pipe", "annulus"'),
    spoilt('shape = "plates"', 'shape = "plate"', f'{F}:4: gap.shape: "plate" is no shape; did you mean "plates"?'),
    spoilt('shape = "plates"', 'shape = "disc"',
           f'{F}:4: gap.shape: "disc" (a gap between flat faces of revolution) is not available in this version; '
           'one of "plates", "pipe", "annulus" is needed'),
    spoilt('shape = "plates"', 'shape = "annulus"', f'{F}:3: gap.motion: is missing; "axial" or "rotating" is needed'),
    spoilt('shape = "plates"', 'shape = "annulus"\nmotion = "spinning"',
           f'{F}:5: gap.motion: "spinning" is no motion of this shape; "axial" or "rotating" is needed'),
    spoilt(GAP, 'shape = "pipe"\ndiameter = "8 mm"\nradius = "4 mm"',
           f'{F}:6: gap.radius: "4 mm" is given beside diameter; one of diameter or radius is needed'),
    spoilt(GAP, 'shape = "pipe"',
           f'{F}:3: gap.diameter: is missing; one of diameter or radius is needed, such as diameter = "12 mm"'),
    spoilt("[gap]\n" + GAP, "",
           f'{F}: gap: is missing; a [gap] is needed, such as shape = "plates", height = "0.80 mm"'),
]  # fmt: skip

ANNULUS = 'shape = "annulus"\nmotion = "axial"\n'
TWO = "exactly two of an inner size, an outer size and a clearance are needed"
RINGS = [
    spoilt(GAP, ANNULUS + 'inner_radius = "12 mm"\nouter_radius = "10 mm"',
           f'{F}:6: gap.inner_radius: "12 mm" does not lie inside the outer wall; '
           "a smaller inner or a larger outer wall is needed"),
    spoilt(GAP, ANNULUS + 'inner_radius = "12 mm"\nouter_diameter = "24 mm"',
           f'{F}:6: gap.inner_radius: "12 mm" does not lie inside the outer wall; '
           "a smaller inner or a larger outer wall is needed"),
    spoilt(GAP, ANNULUS + 'outer_radius = "10 mm"\nradial_clearance = "10 mm"',
           f'{F}:7: gap.radial_clearance: "10 mm" leaves no inner wall; a clearance below the outer radius is needed'),
    spoilt(GAP, ANNULUS + 'inner_radius = "9 mm"\nouter_radius = "10 mm"\nradial_clearance = "1 mm"',
           f'{F}:8: gap.radial_clearance: "1 mm" is given beside inner_radius and outer_radius; {TWO}'),
    spoilt(GAP, ANNULUS + 'inner_radius = "9 mm"\ninner_diameter = "18 mm"\nouter_radius = "10 mm"',
           f'{F}:6: gap.inner_radius: "9 mm" is given beside inner_diameter; '
           "one of inner_diameter or inner_radius is needed"),
    spoilt(GAP, ANNULUS + 'inner_radius = "9 mm"',
           f'{F}:3: gap.outer_diameter: is missing; '
           f'{TWO}, such as inner_diameter = "20 mm", radial_clearance = "0.5 mm"'),
]  # fmt: skip

FLUID = [
    spoilt('density = "870 kg/m^3"', "", f'{F}:11: fluid.density: is missing; '
           'a density is needed, such as "998 kg/m^3"'),
    spoilt('viscosity = "40 mPa*s"', "",
           f'{F}:11: fluid.viscosity: is missing; viscosity or kinematic_viscosity is needed, such as "1.002 mPa*s"'),
    spoilt('viscosity = "40 mPa*s"', 'viscosity = "40 mPa*s"\nkinematic_viscosity = "46 cSt"',
           f"{F}:14: fluid.kinematic_viscosity: is given beside viscosity; one of them is needed"),
    spoilt('viscosity = "40 mPa*s"', 'viscosity = "46 cSt"',
           f'{F}:13: fluid.viscosity: "46 cSt" is a kinematic viscosity; '
           'a dynamic viscosity is needed, such as "46 mPa*s"'),
    spoilt('viscosity = "40 mPa*s"', 'name = "water"',
           f"{F}:13: fluid.name: a known fluid by name is not available in this version"),
    spoilt('viscosity = "40 mPa*s"', 'law = { kind = "bingham" }',
           f"{F}:13: fluid.law: a viscosity that depends on the shear rate is not available in this version"),
    spoilt('[fluid]\ndensity = "870 kg/m^3"\nviscosity = "40 mPa*s"', "",
           f'{F}: fluid: is missing; a [fluid] is needed, such as density = "998 kg/m^3", viscosity = "1.002 mPa*s"'),
]  # fmt: skip

KINDS = "step, ramp, smooth_ramp, s_curve, trapezoid, lag, sine, half_sine, table, sum, repeat"
WALLS = [
    spoilt("[wall.upper]", "[wall.top]", f'{F}:15: wall.top: "top" is no wall of this shape; known here: lower, upper'),
    spoilt("[wall.upper]", "[wall.uper]", f'{F}:15: wall.uper: "uper" is no wall of this shape; did you mean "upper"?'),
    spoilt(SPEED, 'speed = "50 Hz"',
           f'{F}:16: wall.upper.speed: "50 Hz" is a frequency; a speed is needed, such as "50 m/s"'),
    spoilt(SPEED, "speed = 0.3", f'{F}:16: wall.upper.speed: 0.3 has no unit; a speed is needed, such as "0.3 m/s"'),
    spoilt('over = "50 ms"', 'over = "-50 ms"',
           f'{F}:16: wall.upper.speed.over: "-50 ms" is not above zero; a time above zero is needed, such as "50 ms"'),
    spoilt(', over = "50 ms"', "", f'{F}:16: wall.upper.speed.over: is missing; a time is needed, such as "50 ms"'),
    spoilt('kind = "ramp"', 'kind = "rampe"',
           f'{F}:16: wall.upper.speed.kind: "rampe" is no kind of history; did you mean "ramp"?'),
    spoilt('kind = "ramp", ', "",
           f"{F}:16: wall.upper.speed.kind: is missing; a history needs a kind, one of {KINDS}"),
    spoilt('to = "0.30 m/s"', 'too = "0.30 m/s"', f'{F}:16: wall.upper.speed.too: unknown key; did you mean "to"?'),
    spoilt(SPEED, 'speed = { kind = "sine", amplitude = "1 m/s", frequency = "600 rpm" }',
           f'{F}:16: wall.upper.speed.frequency: "600 rpm" is an angular speed; '
           'a frequency is needed, such as "600 Hz"'),
    spoilt(SPEED, 'speed = { kind = "sine", amplitude = "1 m/s" }',
           f"{F}:16: wall.upper.speed.frequency: a sine needs exactly one of frequency and period"),
    spoilt(SPEED, 'speed = { kind = "sum", parts = ["1 m/s", "2 kg"] }',
           f'{F}:16: wall.upper.speed.parts.2: "2 kg" is a mass; a speed is needed, such as "2 m/s"'),
    spoilt(SPEED, 'speed = { kind = "sum", parts = "1 m/s" }',
           f'{F}:16: wall.upper.speed.parts: "1 m/s" is no list; a list of histories is needed, in [ ]'),
    spoilt(SPEED, 'speed = { kind = "repeat", part = "1 m/s", every = "1 s", times = 0.5 }',
           f"{F}:16: wall.upper.speed.times: 0.5 is no whole number from 1 to 1000000000; one is needed, such as 10"),
    spoilt(SPEED, 'speed = { kind = "s_curve", to = "1 m/s", acceleration = "2 m/s", jerk = "3 m/s^3" }',
           f'{F}:16: wall.upper.speed.acceleration: "2 m/s" is a speed; an acceleration is needed, such as "2 m/s^2"'),
    spoilt(SPEED, SPEED + '\ntemperature = "20 degC"',
           f"{F}:17: wall.upper.temperature: a wall temperature is not available in this version"),
    spoilt(UPPER, 'wall = "upper"', f'{F}:15: fluid.wall: unknown key; '
           'known here: density, viscosity, kinematic_viscosity'),
]  # fmt: skip

RUN = [
    spoilt(AUTO, 'duration = "-1 s"',
           f'{F}:19: run.duration: "-1 s" is not above zero; a time above zero is needed, such as "50 ms"'),
    spoilt(AUTO, 'duration = "automatic"',
           f'{F}:19: run.duration: "automatic" does not begin with a number; '
           'a time is needed, such as "50 ms" or "auto"'),
    spoilt(AUTO, "settle_within = 1",
           f'{F}:19: run.settle_within: 1 is not above 0 % and below 100 %; a fraction is needed, such as "1 %"'),
    spoilt(AUTO, 'accuracy = "30 %"',
           f'{F}:19: run.accuracy: "30 %" is not within 1e-05 % to 20 %; a fraction is needed, such as "0.1 %"'),
    spoilt(AUTO, "profiles = 1",
           f"{F}:19: run.profiles: 1 is no whole number from 2 to 100000; one is needed, such as 120"),
    spoilt(AUTO, 'profiles = 10\nprofile_times = ["1 s"]',
           f"{F}:20: run.profile_times: is given beside profiles; one of them is needed"),
    spoilt(AUTO, 'profile_times = ["1 s", "-1 s"]',
           f'{F}:19: run.profile_times.2: "-1 s" is below zero; a time of zero or more is needed, such as "50 ms"'),
    spoilt(AUTO, "profile_times = []",
           f'{F}:19: run.profile_times: an empty list is no list of quantities; '
           'a list is needed, such as ["0 s", "10 ms", "1 s"]'),
    spoilt(AUTO, 'duration = "1 s"\nprofile_times = ["2 s"]',
           f"{F}:20: run.profile_times: 2 s lies after the end of the run, 1 s"),
    spoilt(AUTO, '[start]\nstate = "moving"',
           f'{F}:20: start.state: "moving" is not known here; "rest" or "steady" is needed'),
]  # fmt: skip

PRESSURE = [
    spoilt("[run]", '[pressure]\ndrop = "1 kPa"\ndrop_per_length = "1 kPa/m"\n[run]',
           f"{F}:19: pressure.drop: is given beside drop_per_length; "
           "one of drop_per_length, drop, flow_rate, mean_velocity, sealed is needed"),
    spoilt("[run]", '[pressure]\ndrop = "1 kPa/m"\n[run]',
           f'{F}:19: pressure.drop: "1 kPa/m" is a pressure drop per length; a pressure is needed, such as "1 kPa"'),
    spoilt('length = "60 mm"\nwidth = "25 mm"', "[pressure]\ndrop = '1 kPa'",
           f'{F}:9: pressure.drop: needs gap.length; add it, such as length = "60 mm" in [gap]'),
    spoilt("[run]", "[heat]\nconductivity = 3\n[run]",
           f"{F}:18: heat: viscous heating is not available in this version"),
    spoilt("[run]", "[sweep]\n[run]",
           f"{F}:18: sweep: unknown key; known here: title, gap, fluid, wall, pressure, start, run"),
]  # fmt: skip


@pytest.mark.parametrize(("exchange", "message"), [*SIZES, *RINGS, *FLUID, *WALLS, *RUN, *PRESSURE])
def test_refused_values(refusal: Callable[..., str], exchange: dict[str, str], message: str) -> None:
    assert refusal(exchange) == message


@pytest.mark.parametrize(
    ("exchange", "message"),
    [
        spoilt(HEIGHT, HEIGHT + "\n" + HEIGHT, f"{F}:8: gap.height: is given twice; keep one of them"),
        spoilt("[run]", "[gap]\n[run]", f"{F}:18: gap: is given twice; keep one of them"),
        spoilt('to = "0.30 m/s"', 'to = "0.30 m/s", to = "1 m/s"',
               f"{F}:16: wall.upper.speed.to: is given twice; keep one of them"),
        spoilt(HEIGHT, "height = 0.2 mm", f'{F}:7: gap.height: 0.2 mm needs quotes; write height = "0.2 mm"'),
        spoilt(HEIGHT, "height = mm", f'{F}:7: gap.height: mm needs quotes; write height = "mm"'),
        spoilt(HEIGHT, "height = 0,2", f"{F}:7: gap.height: 0,2 has a decimal comma; a decimal point is needed"),
        spoilt(HEIGHT, 'height "0.2 mm"', f"{F}:7: is not TOML: expected '=' after a key in a key/value pair"),
    ],
)  # fmt: skip
def test_refused_toml(refusal: Callable[..., str], exchange: dict[str, str], message: str) -> None:
    assert refusal(exchange) == message


def refused(path: str) -> str:
    """The message with which a file is refused."""
    with pytest.raises(CaseError) as caught:
        read_case(path)
    assert "\n" not in str(caught.value)
    return str(caught.value)


@pytest.mark.parametrize(
    ("content", "message"),
    [
        (b"", 'is empty; "transient template plates" prints a case file to start from'),
        (b"# only a comment\n", 'is empty; "transient template plates" prints a case file to start from'),
        (b"\x89HDF\r\n\x1a\n\x00\x00", "is not a text file (UTF-8); a TOML case file is needed"),
        ("title = 'Öl'".encode("latin-1"), "is not a text file (UTF-8); a TOML case file is needed"),
        (b"a = " + b"[" * 5000, "is nested too deeply"),
    ],
)
def test_refused_files(write: Callable[..., str], content: bytes, message: str) -> None:
    assert refused(write(content, "odd.toml")) == f"odd.toml: {message}"


def test_refused_paths(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "folder.toml").mkdir()
    assert refused("none.toml") == "none.toml: there is no such file; the path of a case file is needed"
    assert refused("folder.toml") == "folder.toml: is a folder; the path of a case file is needed"
    assert refused("nul\x00.toml").endswith("cannot be read (not a path)")


ENDLESS = '"auto" needs a drive that ends in a steady or periodic state; a time is needed, such as "2 s"'


def test_automatic_duration_needs_an_end(refusal: Callable[..., str], read: Callable[..., object]) -> None:
    """Two periods without a common multiple never come back to the same state together."""
    odd = {SPEED: 'speed = { kind = "sine", amplitude = "1 m/s", period = "1.4142135623 s" }'}
    more = '[wall.lower]\nspeed = { kind = "sine", amplitude = "1 m/s", period = "1 s" }\n'
    assert refusal(odd, more) == f"{F}:19: run.duration: {ENDLESS}"
    assert read({**odd, AUTO: 'duration = "2 s"'}, more)
    assert refusal({**odd, AUTO: ""}, more) == f"{F}:18: run.duration: {ENDLESS}"


def test_pressure_in_a_rotating_gap(refusal: Callable[..., str]) -> None:
    ring = {GAP: 'shape = "annulus"\nmotion = "rotating"\ninner_radius = "9 mm"\nradial_clearance = "1 mm"', UPPER: ""}
    for key, value in (("drop_per_length", '"1 kPa/m"'), ("sealed", "true")):
        message = refusal(ring, f"[pressure]\n{key} = {value}\n")
        assert message == f"{F}:18: pressure.{key}: no pressure drives a rotating gap; leave [pressure] out"


def test_angular_speed_in_hertz(refusal: Callable[..., str]) -> None:
    ring = {
        GAP: 'shape = "annulus"\nmotion = "rotating"\ninner_radius = "9 mm"\nradial_clearance = "1 mm"',
        UPPER: '[wall.inner]\nspeed = "50 Hz"',
    }
    assert refusal(ring) == (
        f'{F}:14: wall.inner.speed: "50 Hz" is a frequency; '
        'an angular speed in rpm or rad/s is needed, such as "3000 rpm"'
    )


def test_too_many_cycles(refusal: Callable[..., str]) -> None:
    """A repeat of microseconds over an hour is millions of pieces."""
    fast = (
        'speed = { kind = "repeat", every = "2 us", part = { kind = "half_sine", amplitude = "1 m/s", over = "1 us" } }'
    )
    message = refusal({SPEED: fast, AUTO: 'duration = "1 h"'})
    assert message.startswith(f"{F}:19: run.duration: the repeats make ")


@pytest.mark.parametrize(
    "text", ["title = 3", 'title = ""', "gap = 3", 'gap = "plates"', "wall = 3", "[[gap]]\nx = 1", "run = []"]
)
def test_wrong_kinds_of_value_are_refused(write: Callable[..., str], text: str) -> None:
    refused(write(text + "\n"))

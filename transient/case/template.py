"""Commented case files to start from, one per shape."""

from __future__ import annotations

from transient.case.source import CaseError, nearest
from transient.drive import KINDS
from transient.units import typed

_PLATES = """\
title = "Slide on an oil film, started by a ramp"

[gap]
shape  = "plates"
height = "0.12 mm"            # distance between the plates
length = "140 mm"             # along the motion; needed for forces and for `drop`
width  = "45 mm"              # across it; needed for forces and flow rates
# count = 2                   # identical gaps in parallel

[fluid]
density = "868 kg/m^3"
kinematic_viscosity = "68 cSt"    # or viscosity = "59 mPa*s"

[wall.upper]                  # and [wall.lower]; a wall that is not mentioned stands still
speed = { kind = "ramp", to = "0.45 m/s", over = "4 ms" }
"""

_PIPE = """\
title = "Coolant line after its valve opens"

[gap]
shape    = "pipe"
diameter = "8 mm"             # or radius
length   = "2.2 m"            # along the flow; needed for forces and for `drop`

[fluid]
density   = "1045 kg/m^3"
viscosity = "3.1 mPa*s"       # or kinematic_viscosity = "2.97 mm^2/s"

[pressure]                    # inlet minus outlet; or drop_per_length = "0.7 kPa/m"
drop = { kind = "smooth_ramp", to = "1.5 kPa", over = "80 ms" }

# [wall.bore]                 # the pipe itself may move along its axis
# speed = "0.1 m/s"
"""

_ANNULUS_AXIAL = """\
title = "Rod drawn through a long guide sleeve"

[gap]
shape  = "annulus"
motion = "axial"              # along the axis; "rotating" about it
inner_diameter   = "18 mm"    # exactly two of an inner size, an outer size and a clearance:
radial_clearance = "0.35 mm"  # inner_/outer_ diameter or radius, radial_ or diametral_clearance
length = "120 mm"             # along the flow; needed for forces and for `drop`

[fluid]
density   = "905 kg/m^3"
viscosity = "31 mPa*s"        # or kinematic_viscosity = "34 cSt"

[wall.inner]                  # and [wall.outer]; a wall that is not mentioned stands still
speed = { kind = "s_curve", to = "0.6 m/s", acceleration = "30 m/s^2", jerk = "4000 m/s^3" }

[pressure]                    # a counter-pressure against the motion; leave out for none
drop = "-80 kPa"
"""

_ANNULUS_ROTATING = """\
title = "Test spindle run up in oil"

[gap]
shape  = "annulus"
motion = "rotating"           # about the axis; "axial" along it
inner_diameter   = "42 mm"    # exactly two of an inner size, an outer size and a clearance:
radial_clearance = "0.50 mm"  # inner_/outer_ diameter or radius, radial_ or diametral_clearance
length = "65 mm"              # along the axis; needed for torques

[fluid]
density = "880 kg/m^3"
kinematic_viscosity = "22 cSt"    # or viscosity = "19.4 mPa*s"

[wall.inner]                  # and [wall.outer]; a wall that is not mentioned stands still
speed = { kind = "smooth_ramp", to = "600 rpm", over = "40 ms" }
"""

_RUN = """\

[start]
state = "rest"                # or "steady": the flow that belongs to the values before t = 0

[run]
duration      = "auto"        # or a time such as "2 s"
settle_within = "1 %"         # settled: within this share of the steady state from then on
accuracy      = "0.1 %"       # of each headline number; grid and steps follow from it
# profiles    = 120           # how many velocity profiles to keep, or
# profile_times = ["5 ms", "20 ms", "100 ms"]
"""

TEMPLATES: dict[str, str] = {
    "plates": _PLATES,
    "pipe": _PIPE,
    "annulus_axial": _ANNULUS_AXIAL,
    "annulus_rotating": _ANNULUS_ROTATING,
}
_ALSO = {"annulus": "annulus_axial"}


def template(shape: str) -> str:
    """A commented case file of ``shape`` ("plates", "pipe", "annulus", "annulus_rotating"); raises ``CaseError``."""
    name = _ALSO.get(shape, shape)
    if name not in TEMPLATES:
        raise CaseError(f"{typed(shape)} is no shape with a template; {nearest(shape, [*TEMPLATES, *_ALSO])}")
    return TEMPLATES[name] + _RUN + _histories()


def _histories() -> str:
    """What a speed or a pressure may be, as comments: one line for each registered kind."""
    lines = [
        "",
        "# A speed or a pressure is a quantity (held from t = 0 on) or { kind = ..., keys of that kind }:",
    ]
    for kind in KINDS.values():
        keys = ", ".join(field.name if field.required else f"({field.name})" for field in kind.fields)
        lines += [f"#   {kind.name}: {keys}", f"#       {kind.doc}"]
    return "\n".join([*lines, "# Keys in ( ) may be left out.", ""])

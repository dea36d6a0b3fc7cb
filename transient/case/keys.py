"""Every key of the case file that no registry owns: what it takes, what it means, how it is written.

Reading, the JSON Schema and the echo of the inputs all follow from these tables.  Keys of shapes, history kinds and
laws come from their own registries.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any


@dataclass(frozen=True)
class Key:
    """One key.

    ``kind``: "quantity", "history", "curve", "times" (a list of quantities), "table", "text", "flag", "whole" or
    "choice".
    ``dimension`` of a quantity or history, ``turning`` that in a rotating gap where it differs.
    ``least``: "positive", "zero" (zero allowed) or "" (any sign); ``low``, ``high`` bound a whole number or fraction.
    ``words``: texts taken beside a quantity ("auto").
    """

    name: str
    kind: str
    doc: str
    dimension: str = ""
    turning: str = ""
    example: str = ""
    default: Any = None
    required: bool = False
    least: str = ""
    low: float | None = None
    high: float | None = None
    choices: tuple[str, ...] = ()
    words: tuple[str, ...] = ()

    def measure(self, rotating: bool) -> str:
        """The dimension in a straight or a rotating gap."""
        return self.turning if rotating and self.turning else self.dimension


MOST_GAPS = 1_000_000
MOST_PROFILES = 100_000

COUNT = Key("count", "whole", "Identical gaps in parallel", default=1, low=1, high=MOST_GAPS, example="4")

FLUID = (
    Key("density", "quantity", "Density", "density", example='"998 kg/m^3"', required=True, least="positive"),
    Key("viscosity", "quantity", "Dynamic viscosity", "viscosity", example='"1.002 mPa*s"', least="positive"),
    Key("kinematic_viscosity", "quantity", "Kinematic viscosity, instead of the dynamic one", "kinematic_viscosity",
        example='"46 cSt"', least="positive"),
)  # fmt: skip

WALL = (
    Key("speed", "history", "Speed of the wall; a wall without one stands still", "speed", "angular_speed",
        example='{ kind = "ramp", to = "0.30 m/s", over = "50 ms" }'),
    Key("displacement", "history", "Displacement of the wall; its rate of change drives", "length", "angle",
        example='{ kind = "sine", amplitude = "1 mm", frequency = "5 Hz" }'),
    Key("shear_free", "flag", "A free surface: no stress there", default=False),
    Key("slip_length", "quantity", "Slip length: slip speed over shear rate at the wall", "length", default=0.0,
        least="zero", example='"2 um"'),
    Key("body", "table", "A body that carries the wall and is moved by forces"),
)  # fmt: skip

BODY = (
    Key("mass", "quantity", "Mass (straight gaps)", "mass", least="zero", example='"2 kg"'),
    Key("inertia", "quantity", "Moment of inertia (rotating gaps)", "inertia", least="zero", example='"0.02 kg*m^2"'),
    Key("force", "history", "Force along +x (straight gaps)", "force", example='"5 N"'),
    Key("torque", "history", "Torque (rotating gaps)", "torque", example='"0.5 N*m"'),
    Key("force_curve", "curve", "Force that depends on the body's speed, added to `force`", "force",
        example='{ speeds = ["0 m/s", "1 m/s"], values = ["8 N", "0 N"] }'),
    Key("torque_curve", "curve", "Torque that depends on the body's speed, added to `torque`", "torque",
        example='{ speeds = ["0 rpm", "3000 rpm"], values = ["2 N*m", "0 N*m"] }'),
    Key("incline", "quantity", "Angle by which +x points downhill (straight gaps)", "angle", default=0.0,
        example='"30 deg"'),
    Key("damping", "quantity", "Force per speed that opposes motion", "damping", "angular_damping", default=0.0,
        least="zero", example='"3 N*s/m"'),
    Key("dry_friction", "quantity", "Friction while it slides, whatever the speed", "force", "torque", default=0.0,
        least="zero", example='"0.4 N"'),
    Key("breakaway_friction", "quantity", "Friction to overcome from standstill (default: dry_friction)", "force",
        "torque", least="zero", example='"0.5 N"'),
    Key("stiffness", "quantity", "Spring force per displacement since t = 0", "stiffness", "angular_stiffness",
        default=0.0, least="zero", example='"200 N/m"'),
    Key("initial_speed", "quantity", "Speed at t = 0", "speed", "angular_speed", example='"0.1 m/s"'),
    Key("initial_displacement", "quantity", "Displacement at t = 0", "length", "angle", default=0.0,
        example='"2 mm"'),
    Key("area", "quantity", "Area of one gap that acts on the body (default: its wetted area)", "area",
        least="positive", example='"15 cm^2"'),
    Key("displaces", "quantity", "Area whose volume the moving wall pushes (with sealed)", "area", least="positive",
        example='"3 cm^2"'),
)  # fmt: skip

STRAIGHT_ONLY = {"mass": "inertia", "force": "torque", "force_curve": "torque_curve", "incline": "", "displaces": ""}
ROTATING_ONLY = {"inertia": "mass", "torque": "force", "torque_curve": "force_curve"}

PRESSURE = (
    Key("drop_per_length", "history", "Pressure drop per length; positive drives along +x", "pressure_gradient",
        example='"2 kPa/m"'),
    Key("drop", "history", "Inlet pressure minus outlet pressure over gap.length", "pressure", example='"2 kPa"'),
    Key("flow_rate", "history", "Flow rate through all gaps; the pressure follows", "flow_rate", example='"2 L/min"'),
    Key("mean_velocity", "history", "Mean velocity; the pressure follows", "speed", example='"0.3 m/s"'),
    Key("sealed", "flag", "No net flow; the pressure follows", default=False),
)  # fmt: skip

START = (
    Key("state", "choice", "rest: all still before t = 0; steady: the flow of the drives' values just before t = 0",
        default="rest", choices=("rest", "steady"), example='"rest"'),
)  # fmt: skip

RUN = (
    Key("duration", "quantity", "Length of the run; auto: until settled or periodic, and a margin", "time",
        default="auto", least="positive", words=("auto",), example='"2 s"'),
    Key("settle_within", "quantity", "Band about the steady state that counts as settled", "fraction", default=0.01,
        low=0.0, high=1.0, example='"1 %"'),
    Key("accuracy", "quantity", "Largest error of each headline number; grid and steps follow from it", "fraction",
        default=0.001, low=1e-7, high=0.2, example='"0.1 %"'),
    Key("profiles", "whole", "How many velocity profiles to keep", default=120, low=2, high=MOST_PROFILES,
        example="120"),
    Key("profile_times", "times", "Times at which velocity profiles are kept, exactly; instead of `profiles`", "time",
        least="zero", example='["0 s", "10 ms", "1 s"]'),
)  # fmt: skip

# Keys that a table history may have beside those of its kind: where its numbers come from and their units.
TABLE_FILE = (
    Key("file", "text", "CSV file beside the case file, instead of times and values", example='"speed.csv"'),
    Key("time_column", "text", "Header name or number (from 1) of the times' column", default=1, example='"time"'),
    Key("column", "text", "Header name or number (from 1) of the values' column", default=2, example='"speed"'),
)
TABLE_UNITS = (
    Key("time_unit", "text", "Unit of the times", required=True, example='"s"'),
    Key("unit", "text", "Unit of the values", required=True, example='"m/s"'),
)

TITLE = Key("title", "text", "One line that names the case", example='"Flow cell brought up to speed"')

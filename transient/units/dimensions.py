"""Every dimension that a case file may ask for: its words, its SI unit and the plain units it is written in.

The plain units serve twice: they are read without loading the unit library, and those in ``ladder`` are the
ones that values are shown in.  Factors are exact fractions, so that "0.2 mm" is the float nearest to 0.0002.
"""

from __future__ import annotations

from dataclasses import dataclass
from fractions import Fraction

PI = Fraction("3.14159265358979323846264338327950288")
# International foot, pound and standard gravity are exact by definition (NIST SP 811, 2008, appendix B).
INCH = Fraction("0.0254")
POUND_FORCE = Fraction("0.45359237") * Fraction("9.80665")

Exponents = tuple[int, int, int, int, int]  # length, mass, time, temperature, angle


@dataclass(frozen=True)
class Dimension:
    """One kind of quantity.

    ``words`` with its article, as said to a user; ``si`` the unit of its SI value; ``exponents`` of length, mass,
    time, temperature and angle; ``plain`` factor to SI of each common unit text; ``ladder`` the units to show values
    in, rising; ``example`` of how one is written; ``smallest``, ``largest`` magnitude taken (zero always is).
    ``loose``: an angle counts as a pure number (a torque per angle may be written with or without rad).
    """

    name: str
    words: str
    si: str
    exponents: Exponents
    plain: dict[str, Fraction]
    ladder: tuple[str, ...]
    example: str
    smallest: float = 1e-18
    largest: float = 1e15
    loose: bool = False

    @property
    def example_unit(self) -> str:
        """The unit of the example."""
        return self.example.partition(" ")[2]


def _d(length: int = 0, mass: int = 0, time: int = 0, temperature: int = 0, angle: int = 0) -> Exponents:
    return length, mass, time, temperature, angle


def _plain(**factors: str | Fraction) -> dict[str, Fraction]:
    return {name: Fraction(factor) for name, factor in factors.items()}


_LENGTH = _plain(nm="1e-9", um="1e-6", mm="1e-3", cm="1e-2", m="1", km="1e3", mil=INCH / 1000, ft=12 * INCH)
_LENGTH["in"] = INCH
_TIME = _plain(ns="1e-9", us="1e-6", ms="1e-3", s="1", min="60", h="3600")
_PRESSURE = _plain(mPa="1e-3", Pa="1", kPa="1e3", MPa="1e6", mbar="100", bar="1e5", psi=POUND_FORCE / INCH**2)
_FORCE = _plain(mN="1e-3", N="1", kN="1e3", lbf=POUND_FORCE)
_ANGLE = _plain(rad="1", mrad="1e-3", deg=PI / 180)
_RPM = PI / 30


def _per(units: dict[str, Fraction], divisor: str, size: str | Fraction = "1") -> dict[str, Fraction]:
    """The same units, each divided by one more unit."""
    return {name + divisor: factor / Fraction(size) for name, factor in units.items()}


_SPEED = {
    **_per({k: _LENGTH[k] for k in ("um", "mm", "m", "in", "ft")}, "/s"),
    **_per({"m": Fraction(1)}, "/min", "60"),
    **_per({"km": Fraction(1000)}, "/h", "3600"),
}

_ALL = (
    Dimension("fraction", "a fraction", "1", _d(), {"%": Fraction(1, 100)}, ("%",), "1 %"),
    Dimension("length", "a length", "m", _d(1), _LENGTH, ("nm", "um", "mm", "m"), "0.2 mm", 1e-10, 1e6),
    Dimension("mass", "a mass", "kg", _d(0, 1), _plain(mg="1e-6", g="1e-3", kg="1", lb="0.45359237"),
              ("mg", "g", "kg"), "2 kg"),
    Dimension("time", "a time", "s", _d(0, 0, 1), _TIME, ("ns", "us", "ms", "s"), "50 ms", 1e-15, 1e12),
    Dimension("angle", "an angle", "rad", _d(angle=1), _ANGLE, ("deg",), "90 deg"),
    Dimension("frequency", "a frequency", "Hz", _d(0, 0, -1),
              {**_plain(mHz="1e-3", Hz="1", kHz="1e3", MHz="1e6"), "1/s": Fraction(1), "1/min": Fraction(1, 60)},
              ("mHz", "Hz", "kHz", "MHz"), "10 Hz"),
    Dimension("temperature", "a temperature", "K", _d(temperature=1),
              _plain(degC="1", degF=Fraction(5, 9), K="1"), ("degC",), "20 degC"),
    Dimension("temperature_difference", "a temperature difference", "K", _d(temperature=1),
              _plain(K="1", degC="1", degF=Fraction(5, 9)), ("K",), "5 K"),
    Dimension("area", "an area", "m^2", _d(2), {"mm^2": Fraction("1e-6"), "cm^2": Fraction("1e-4"), "m^2": Fraction(1),
              "in^2": INCH**2}, ("mm^2", "cm^2", "m^2"), "20 cm^2"),
    Dimension("volume", "a volume", "m^3", _d(3), {"mm^3": Fraction("1e-9"), "mL": Fraction("1e-6"),
              "cm^3": Fraction("1e-6"), "L": Fraction("1e-3"), "m^3": Fraction(1)}, ("mm^3", "mL", "L", "m^3"), "2 mL"),
    Dimension("speed", "a speed", "m/s", _d(1, 0, -1), _SPEED, ("um/s", "mm/s", "m/s"), "0.3 m/s", 1e-18, 1e8),
    Dimension("acceleration", "an acceleration", "m/s^2", _d(1, 0, -2),
              {"mm/s^2": Fraction("1e-3"), "m/s^2": Fraction(1)}, ("mm/s^2", "m/s^2"), "2 m/s^2"),
    Dimension("jerk", "a jerk", "m/s^3", _d(1, 0, -3),
              {"mm/s^3": Fraction("1e-3"), "m/s^3": Fraction(1)}, ("mm/s^3", "m/s^3"), "50 m/s^3"),
    Dimension("angular_speed", "an angular speed", "rad/s", _d(0, 0, -1, 0, 1),
              {"rpm": _RPM, "rad/s": Fraction(1), "mrad/s": Fraction(1, 1000), "deg/s": PI / 180},
              ("rpm",), "300 rpm", 1e-18, 1e8),
    Dimension("angular_acceleration", "an angular acceleration", "rad/s^2", _d(0, 0, -2, 0, 1),
              {"rad/s^2": Fraction(1), "rpm/s": _RPM}, ("rad/s^2",), "50 rad/s^2"),
    Dimension("angular_jerk", "an angular jerk", "rad/s^3", _d(0, 0, -3, 0, 1),
              {"rad/s^3": Fraction(1), "rpm/s^2": _RPM}, ("rad/s^3",), "500 rad/s^3"),
    Dimension("density", "a density", "kg/m^3", _d(-3, 1), {"kg/m^3": Fraction(1), "g/cm^3": Fraction(1000),
              "kg/L": Fraction(1000), "g/L": Fraction(1), "g/mL": Fraction(1000)}, ("kg/m^3",), "998 kg/m^3",
              1e-6, 1e6),
    Dimension("viscosity", "a dynamic viscosity", "Pa*s", _d(-1, 1, -1), {"Pa*s": Fraction(1),
              "mPa*s": Fraction("1e-3"), "uPa*s": Fraction("1e-6"), "cP": Fraction("1e-3"), "P": Fraction("0.1")},
              ("uPa*s", "mPa*s", "Pa*s"), "1.002 mPa*s", 1e-9, 1e9),
    Dimension("kinematic_viscosity", "a kinematic viscosity", "m^2/s", _d(2, 0, -1), {"m^2/s": Fraction(1),
              "mm^2/s": Fraction("1e-6"), "cSt": Fraction("1e-6"), "St": Fraction("1e-4")}, ("mm^2/s", "m^2/s"),
              "46 cSt", 1e-12, 1e9),
    Dimension("pressure", "a pressure", "Pa", _d(-1, 1, -2), _PRESSURE, ("mPa", "Pa", "kPa", "MPa"), "2 kPa"),
    Dimension("pressure_gradient", "a pressure drop per length", "Pa/m", _d(-2, 1, -2),
              {**_per(_PRESSURE, "/m"), "psi/in": POUND_FORCE / INCH**3, "psi/ft": POUND_FORCE / INCH**3 / 12},
              ("Pa/m", "kPa/m", "MPa/m"), "2 kPa/m"),
    Dimension("flow_rate", "a flow rate", "m^3/s", _d(3, 0, -1), {"m^3/s": Fraction(1), "m^3/h": Fraction(1, 3600),
              "L/s": Fraction(1, 1000), "L/min": Fraction(1, 60000), "mL/min": Fraction(1, 60_000_000),
              "mL/s": Fraction("1e-6"), "cm^3/s": Fraction("1e-6"), "mm^3/s": Fraction("1e-9")},
              ("mm^3/s", "mL/s", "L/s", "m^3/s"), "2 L/min"),
    Dimension("mass_flow", "a mass flow", "kg/s", _d(0, 1, -1), {"kg/s": Fraction(1)}, ("kg/s",), "2 kg/s"),
    Dimension("force", "a force", "N", _d(1, 1, -2), _FORCE, ("mN", "N", "kN"), "5 N"),
    Dimension("torque", "a torque", "N*m", _d(2, 1, -2), {"N*m": Fraction(1), "mN*m": Fraction("1e-3"),
              "kN*m": Fraction("1e3"), "N*cm": Fraction("1e-2"), "lbf*in": POUND_FORCE * INCH,
              "lbf*ft": POUND_FORCE * INCH * 12}, ("mN*m", "N*m", "kN*m"), "0.5 N*m"),
    Dimension("inertia", "a moment of inertia", "kg*m^2", _d(2, 1), {"kg*m^2": Fraction(1),
              "g*m^2": Fraction("1e-3"), "kg*cm^2": Fraction("1e-4"), "g*cm^2": Fraction("1e-7"),
              "kg*mm^2": Fraction("1e-6")}, ("kg*mm^2", "kg*m^2"), "0.02 kg*m^2"),
    Dimension("damping", "a damping coefficient (force per speed)", "N*s/m", _d(0, 1, -1),
              {"N*s/m": Fraction(1), "kg/s": Fraction(1)}, ("N*s/m",), "3 N*s/m"),
    Dimension("angular_damping", "a damping coefficient (torque per angular speed)", "N*m*s/rad",
              _d(2, 1, -1, 0, -1), {"N*m*s/rad": Fraction(1), "N*m*s": Fraction(1)}, ("N*m*s/rad",),
              "0.02 N*m*s/rad", loose=True),
    Dimension("stiffness", "a stiffness (force per length)", "N/m", _d(0, 1, -2),
              {"N/m": Fraction(1), "N/mm": Fraction(1000), "kN/m": Fraction(1000)}, ("N/m",), "200 N/m"),
    Dimension("angular_stiffness", "a stiffness (torque per angle)", "N*m/rad", _d(2, 1, -2, 0, -1),
              {"N*m/rad": Fraction(1), "N*m/deg": 180 / PI}, ("N*m/rad",), "5 N*m/rad", loose=True),
    Dimension("power", "a power", "W", _d(2, 1, -3), _plain(mW="1e-3", W="1", kW="1e3"), ("mW", "W", "kW"), "5 W"),
    Dimension("conductivity", "a thermal conductivity", "W/(m*K)", _d(1, 1, -3, -1), {"W/(m*K)": Fraction(1)},
              ("W/(m*K)",), "0.13 W/(m*K)"),
    Dimension("specific_heat", "a specific heat", "J/(kg*K)", _d(2, 0, -2, -1),
              {"J/(kg*K)": Fraction(1), "kJ/(kg*K)": Fraction(1000)}, ("J/(kg*K)",), "1900 J/(kg*K)"),
    Dimension("per_temperature", "a rate per temperature", "1/K", _d(temperature=-1),
              {"1/K": Fraction(1), "1/degC": Fraction(1)}, ("1/K",), "0.045 1/K"),
)  # fmt: skip


def _rates(base: Dimension, words: str) -> tuple[Dimension, ...]:
    """First and second rate of change of a quantity whose rates have no name of their own."""
    out = []
    for order, (suffix, per) in enumerate((("_rate", "/s"), ("_second_rate", "/s^2")), start=1):
        length, mass, time, temperature, angle = base.exponents
        unit = base.example_unit
        out.append(
            Dimension(
                base.name + suffix,
                f"a {words} per second" + (" squared" if order == 2 else ""),
                base.si + per,
                (length, mass, time - order, temperature, angle),
                {base.si + per: Fraction(1), unit + per: base.plain[unit]},
                (base.si + per,),
                base.example + per,
            )
        )
    return tuple(out)


DIMENSIONS: dict[str, Dimension] = {d.name: d for d in _ALL}
for _name, _words in (
    ("pressure_gradient", "pressure drop per length"),
    ("pressure", "pressure"),
    ("flow_rate", "flow rate"),
    ("force", "force"),
    ("torque", "torque"),
):
    DIMENSIONS.update({d.name: d for d in _rates(DIMENSIONS[_name], _words)})

# The dimensions of a quantity's first and second rate of change, for history kinds that state them.
_NAMED_RATES = {
    "length": ("speed", "acceleration"),
    "angle": ("angular_speed", "angular_acceleration"),
    "speed": ("acceleration", "jerk"),
    "angular_speed": ("angular_acceleration", "angular_jerk"),
}


def rate_of(dimension: str, order: int = 1) -> str:
    """Name of the dimension of the ``order``-th (1 or 2) rate of change of ``dimension``."""
    if dimension in _NAMED_RATES:
        return _NAMED_RATES[dimension][order - 1]
    return dimension + ("_rate" if order == 1 else "_second_rate")


def named(exponents: Exponents) -> Dimension | None:
    """The first dimension with these exponents, or None where they have no name here."""
    return next((d for d in DIMENSIONS.values() if d.exponents == exponents), None)

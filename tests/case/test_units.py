"""Quantities in, SI out; SI in, words out.

Factors: NIST SP 811 (2008), appendix B.8, seven digits as printed there (from memory).
"""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from transient.units import DIMENSIONS, QuantityError, convert, quantity, rate_of, show, si_unit
from transient.units.registry import parse_unit

NIST = [
    ("1 psi", "pressure", 6.894757e3),
    ("1 lbf*in", "torque", 1.129848e-1),
    ("1 lbf", "force", 4.448222),
    ("1 mil", "length", 2.54e-5),
    ("1 in", "length", 2.54e-2),
    ("1 ft", "length", 3.048e-1),
    ("1 cP", "viscosity", 1e-3),
    ("1 cSt", "kinematic_viscosity", 1e-6),
    ("1 reyn", "viscosity", 6.894757e3),
    ("1 bar", "pressure", 1e5),
    ("1 rpm", "angular_speed", 1.047198e-1),
    ("1 deg", "angle", 1.745329e-2),
    ("1 lb", "mass", 4.535924e-1),
    ("1 gal/min", "flow_rate", 6.309020e-5),
    ("1 kgf", "force", 9.80665),
    ("1 L/min", "flow_rate", 1.666667e-5),
    ("1 lb/ft^3", "density", 1.601846e1),
    ("1 slug", "mass", 1.459390e1),
    ("1 mile/hour", "speed", 4.4704e-1),
    ("32 degF", "temperature", 273.15),
    ("212 degF", "temperature", 373.15),
    ("-40 degC", "temperature", 233.15),
    ("9 degF", "temperature_difference", 5.0),
]


@pytest.mark.parametrize(("text", "dimension", "value"), NIST)
def test_published_factors(text: str, dimension: str, value: float) -> None:
    assert quantity(text, dimension) == pytest.approx(value, rel=5e-7)


@pytest.mark.parametrize(
    ("text", "dimension", "value"),
    [
        ("0.80 mm", "length", 0.0008),
        ("0.2 mm", "length", 0.0002),
        ("1.002 mPa*s", "viscosity", 0.001002),
        ("1.002mPa*s", "viscosity", 0.001002),
        ("1.002 mPa s", "viscosity", 0.001002),
        ("1.002 mPa·s", "viscosity", 0.001002),
        ("30 µm", "length", 30e-6),
        ("30 μm", "length", 30e-6),
        ("30 um", "length", 30e-6),
        ("3 mm²/s", "kinematic_viscosity", 3e-6),
        ("3 mm**2/s", "kinematic_viscosity", 3e-6),
        ("20 °C", "temperature", 293.15),
        ("4 N m", "torque", 4.0),
        ("2 kg m^2", "inertia", 2.0),
        ("3 N*m*s/rad", "angular_damping", 3.0),
        ("3 N*m*s", "angular_damping", 3.0),
        ("0.13 W/(m*K)", "conductivity", 0.13),
        ("-3 mm/s", "speed", -0.003),
        ("−3 mm/s", "speed", -0.003),
        ("1.5e-2 m/s", "speed", 0.015),
        (".5 s", "time", 0.5),
        ("1 %", "fraction", 0.01),
        ("0.1 %", "fraction", 0.001),
        ("0.01", "fraction", 0.01),
        (0.01, "fraction", 0.01),
        ("0 Pa", "pressure", 0.0),
        ("2 kPa/m/s", "pressure_gradient_rate", 2000.0),
    ],
)
def test_typed_forms_give_the_nearest_float(text: str | float, dimension: str, value: float) -> None:
    assert quantity(text, dimension) == value


@pytest.mark.parametrize("name", DIMENSIONS)
def test_plain_tables_agree_with_the_unit_library(name: str) -> None:
    dimension = DIMENSIONS[name]
    assert quantity(dimension.example, name) > 0.0
    assert set(dimension.ladder) <= set(dimension.plain)
    for unit, factor in dimension.plain.items():
        if unit == "%":
            continue
        library, exponents = parse_unit(unit)
        assert float(library) == pytest.approx(float(factor), rel=1e-15)
        assert exponents[:4] == dimension.exponents[:4]
        assert exponents == dimension.exponents or dimension.loose


@pytest.mark.parametrize(
    ("given", "dimension", "message"),
    [
        ("0.2 kg", "length", '"0.2 kg" is a mass; a length is needed, such as "0.2 mm"'),
        (0.8, "length", '0.8 has no unit; a length is needed, such as "0.8 mm"'),
        (3, "speed", '3 has no unit; a speed is needed, such as "3 m/s"'),
        ("0.8", "length", '"0.8" has no unit; a length is needed, such as "0.8 mm"'),
        ("50 Hz", "angular_speed",
         '"50 Hz" is a frequency; an angular speed in rpm or rad/s is needed, such as "3000 rpm"'),
        ("5 rad/s", "frequency", '"5 rad/s" is an angular speed; a frequency is needed, such as "5 Hz"'),
        ("0,8 mm", "length", '"0,8 mm" has a decimal comma; a length is needed, such as "0.8 mm"'),
        ("nan mm", "length", '"nan mm" is not a finite number; a length is needed, such as "0.2 mm"'),
        ("inf s", "time", '"inf s" is not a finite number; a time is needed, such as "50 ms"'),
        (math.nan, "time", 'nan is not a finite number; a time is needed, such as "50 ms"'),
        (math.inf, "fraction", 'inf is not a finite number; a fraction is needed, such as "1 %"'),
        ("1e300 m", "length",
         '"1e300 m" is outside the range taken, 1e-10 m to 1e+06 m; a length is needed, such as "0.2 mm"'),
        ("1e400 m", "length", '"1e400 m" is not a finite number; a length is needed, such as "0.2 mm"'),
        ("5 furlong", "length", '"5 furlong" has an unknown unit, "furlong"; a length is needed, such as "5 mm"'),
        ("3 kg*m", "length", '"3 kg*m" has the unit kg*m; a length is needed, such as "3 mm"'),
        ("3 mm", "fraction", '"3 mm" is a length; a fraction is needed, such as "1 %"'),
        ("3 %", "length", '"3 %" is a fraction; a length is needed, such as "3 mm"'),
        ("mm", "length", '"mm" does not begin with a number; a length is needed, such as "0.2 mm"'),
        ("", "length", '"" is empty; a length is needed, such as "0.2 mm"'),
        (True, "length", 'true is no quantity; a length is needed, such as "0.2 mm"'),
        ({"a": 1}, "length", 'a table is no quantity; a length is needed, such as "0.2 mm"'),
        ([1], "length", 'a list is no quantity; a length is needed, such as "0.2 mm"'),
        ("-300 degC", "temperature", '"-300 degC" is below absolute zero; a temperature is needed, such as "20 degC"'),
        ("2 degC", "length", '"2 degC" is a temperature; a length is needed, such as "2 mm"'),
        ("2 cSt", "viscosity",
         '"2 cSt" is a kinematic viscosity; a dynamic viscosity is needed, such as "2 mPa*s"'),
    ],
)  # fmt: skip
def test_refused_quantities(given: object, dimension: str, message: str) -> None:
    with pytest.raises(QuantityError) as caught:
        quantity(given, dimension)
    assert str(caught.value) == message


@pytest.mark.parametrize(
    "text",
    [
        "1e-999999999 m",
        "2 m^9999999",
        "2 ((m^9)^9)^9",
        "2 " + "m*" * 200 + "m",
        "2 m;import",
        "9**9**9 m",
        "1 " + "k" * 50,
    ],
)
def test_hostile_units_are_refused_at_once(text: str) -> None:
    with pytest.raises(QuantityError):
        quantity(text, "length")


@settings(derandomize=True, database=None, deadline=None, max_examples=200)
@given(st.floats(1e-6, 1e6), st.sampled_from([n for n in DIMENSIONS if n not in ("temperature", "fraction")]))
def test_what_is_shown_reads_back_to_four_digits(value: float, name: str) -> None:
    assert quantity(show(value, name), name) == pytest.approx(value, rel=6e-4)


@pytest.mark.parametrize(
    ("value", "dimension", "words"),
    [
        (0.00043, "time", "0.43 ms"),
        (0.0, "time", "0 s"),
        (0.3, "speed", "0.3 m/s"),
        (8e-4, "length", "0.8 mm"),
        (0.9999999e-3, "length", "1 mm"),
        (31.41592653589793, "angular_speed", "300 rpm"),
        (1.002e-3, "viscosity", "1.002 mPa*s"),
        (0.01, "fraction", "1 %"),
        (293.15, "temperature", "20 degC"),
        (-2.5, "pressure", "-2.5 Pa"),
        (math.nan, "time", "none"),
        (math.inf, "time", "infinite"),
        (1234.5678, "time", "1235 s"),
    ],
)
def test_shown_values(value: float, dimension: str, words: str) -> None:
    assert show(value, dimension) == words


def test_columns_convert_to_the_nearest_floats() -> None:
    assert convert(np.array([3.0, 9.0, 0.1]), "ms", "time").tolist() == [0.003, 0.009, 0.0001]
    assert convert(np.array([60.0]), "rpm", "angular_speed") == pytest.approx([2 * math.pi], rel=1e-15)


@pytest.mark.parametrize(
    ("unit", "message"),
    [
        ("kg", '"kg" is the unit of a mass; the unit of a time is needed, such as "ms"'),
        ("sx", '"sx" is not a known unit; the unit of a time is needed, such as "ms"'),
        ("", '"" is no unit; the unit of a time is needed, such as "ms"'),
        (3, '3 is no unit; the unit of a time is needed, such as "ms"'),
    ],
)
def test_refused_column_units(unit: object, message: str) -> None:
    with pytest.raises(QuantityError) as caught:
        convert(np.ones(1), unit, "time")
    assert str(caught.value) == message


def test_rates_of_every_drive_dimension_exist() -> None:
    for name in (
        "speed",
        "angular_speed",
        "length",
        "angle",
        "pressure_gradient",
        "pressure",
        "flow_rate",
        "force",
        "torque",
    ):
        for order in (1, 2):
            rate = DIMENSIONS[rate_of(name, order)]
            assert rate.exponents[2] == DIMENSIONS[name].exponents[2] - order
    assert si_unit(rate_of("speed")) == "m/s^2"

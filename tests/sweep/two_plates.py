"""The case that sweeps of these tests start from."""

CASE = """
title = "Two plates"
[gap]
shape = "plates"
height = "0.80 mm"
length = "60 mm"
[fluid]
density = "998 kg/m^3"
viscosity = "1.002 mPa*s"
[wall.upper]
speed = { kind = "ramp", to = "0.30 m/s", over = "50 ms" }
[run]
accuracy = "1 %"
"""

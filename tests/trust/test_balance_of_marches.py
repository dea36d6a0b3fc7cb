"""Balances of marched cases close within the accuracy asked for, in every shape."""

from __future__ import annotations

from dataclasses import replace

import closed_histories as closed
import pytest

from transient.drive.pieces import constant
from transient.march.levels import climb
from transient.march.regime import outlook
from transient.trust import balance

RAMP = closed.ramp_drive(0.3, 2e-3)
SUDDEN = constant(0.3, before=0.0)
PRESSED = constant(2e4, before=0.0)
BORE = {"kinds": ("axis", "moving")}

CASES = {
    "plates, ramp": closed.problem(speeds=(0.0, RAMP)),
    "plates, sudden": closed.problem(speeds=(SUDDEN, 0.0)),
    "both plates, sudden": closed.problem(speeds=(SUDDEN, SUDDEN)),
    "plates, sudden stop from steady flow": closed.problem(speeds=(0.0, constant(0.0, before=0.3)), start="steady"),
    "plates, sudden with slip": closed.problem(speeds=(0.0, SUDDEN), slips=(0.0, 1e-4)),
    "plates, ramp and pressure from steady flow": closed.problem(speeds=(0.2, RAMP), gradient=1e4, start="steady"),
    "plates, sine": closed.problem(speeds=(0.0, closed.sine_drive(0.3, 5e-3))),
    "film": closed.problem(gradient=closed.ramp_drive(2e4, 2e-3), kinds=("moving", "shear_free")),
    "pipe, pressure": closed.problem(1, 0.0, 1e-3, gradient=PRESSED, **BORE),
    "pipe, sudden bore": closed.problem(1, 0.0, 1e-3, speeds=(0.0, SUDDEN), **BORE),
    "annulus": closed.problem(1, 1e-5, 1e-3, speeds=(RAMP, 0.0), gradient=PRESSED),
    "nearly closed annulus": closed.problem(1, 9.999, 10.0, speeds=(RAMP, 0.0), gradient=PRESSED),
    "rotating": closed.problem(3, 1e-2, 1.1e-2, speeds=(RAMP, SUDDEN)),
    "rotating with slip": closed.problem(3, 1e-2, 1.1e-2, speeds=(RAMP, SUDDEN), slips=(1e-4, 1e-4)),
}


@pytest.mark.parametrize("accuracy", [1e-3, 1e-5])
@pytest.mark.parametrize("name", CASES)
def test_marches_close(name, accuracy):
    case = replace(CASES[name], accuracy=accuracy, duration=0.02)
    history = climb(case, outlook(case), accuracy, 1.0, 2).best.flow
    for check in balance.BALANCES:
        found = check(case, history)
        assert found.status == "pass", found

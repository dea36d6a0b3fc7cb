"""A viscosity that depends on nothing (Newtonian): stress = viscosity x shear rate."""

from __future__ import annotations

from transient.fluid.law import LawKind, Parameter


def _parameters(viscosity: float) -> tuple[float, ...]:
    return (viscosity,)


CONSTANT = LawKind(
    name="constant",
    doc="One viscosity at every shear rate",
    code=0,
    keys=(Parameter("viscosity", "viscosity", "Dynamic viscosity", "1.002 mPa*s"),),
    parameters=_parameters,
)

"""Viscosity laws: one file and one entry each."""

from __future__ import annotations

from transient.fluid.constant import CONSTANT
from transient.fluid.law import LawKind, Parameter

LAWS: dict[str, LawKind] = {law.name: law for law in (CONSTANT,)}

__all__ = ["LAWS", "LawKind", "Parameter"]

"""Quantities in, SI floats out; SI floats in, words out.  The only room that knows the unit library."""

from __future__ import annotations

from transient.units.dimensions import DIMENSIONS, Dimension, rate_of
from transient.units.read import QuantityError, convert, quantity, typed
from transient.units.show import show, si_unit

__all__ = ["DIMENSIONS", "Dimension", "QuantityError", "convert", "quantity", "rate_of", "show", "si_unit", "typed"]

"""The installation check: the solver against exact solutions of the textbooks, row by row.

One entry in ``FAMILIES`` per family of rows; each yields its rows in the order in which they are read.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator

from transient.trust.verification.bodies import driven_bodies
from transient.trust.verification.everykind import every_kind
from transient.trust.verification.order import balances, orders
from transient.trust.verification.oscillation import oscillations
from transient.trust.verification.row import Row
from transient.trust.verification.solved import Bench, Solver
from transient.trust.verification.starting import refined_alone, startups
from transient.trust.verification.steady import steadies
from transient.trust.verification.walls import other_walls

FAMILIES: dict[str, Callable[[Bench], Iterator[Row]]] = {
    "steady flow": steadies,
    "start-up": startups,
    "every history kind": every_kind,
    "oscillation": oscillations,
    "slip and shear-free walls": other_walls,
    "bodies and prescribed flow": driven_bodies,
    "errors from refinement": refined_alone,
    "orders of convergence": orders,
    "balances": balances,
}


def verify(solver: Solver) -> list[Row]:
    """All rows of a ``solver``: a function of a problem and of where errors come from ("series", "refinement")."""
    bench = Bench(solver)
    return [row for family in FAMILIES.values() for row in family(bench)]


__all__ = ["FAMILIES", "Row", "verify"]

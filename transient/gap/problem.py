"""One case as frozen plain numbers in SI: what the march solves and the series answers.

The equation for every shape is ``density r^m dw/dt = d/dr(r^m mu dw/dr) + r^m G`` with ``w`` the
velocity (m = 0 plates; m = 1 pipe and axial annulus) or the angular speed (m = 3, G = 0, rotating annulus).
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from transient.drive.pieces import Drive, Pieces, merge_times

LOWER, UPPER, PRESSURE = 0, 1, 2  # rows of Inputs: the two walls' speeds, the pressure drop per length


@dataclass(frozen=True, eq=False)
class Law:
    """A viscosity law as data for compiled code: its code and parameters (Newtonian: 0, [viscosity])."""

    code: int
    parameters: tuple[float, ...]


@dataclass(frozen=True, eq=False)
class Body:
    """A body that carries a wall, in N, m, kg or (rotating) N m, rad, kg m^2; all gaps act on the one body.

    ``mass``; ``load`` the Drive of all outside forces, weight on an incline included; ``damping`` per speed,
    ``stiffness`` per displacement; ``curve`` (speeds, values) of a speed-dependent drive, empty without,
    ``held_beyond`` its ends; ``sliding`` <= ``breakaway`` dry friction; ``initial_speed`` None where not given;
    ``grip`` what a wall stress (Pa) of every gap adds up to on the body (area x count, x radius);
    ``displaced`` area that the moving wall pushes, m^2 (0 without).
    """

    mass: float
    load: Drive
    grip: float
    damping: float = 0.0
    stiffness: float = 0.0
    curve: tuple[tuple[float, ...], tuple[float, ...]] = ((), ())
    held_beyond: bool = True
    sliding: float = 0.0
    breakaway: float = 0.0
    initial_speed: float | None = None
    initial_displacement: float = 0.0
    displaced: float = 0.0

    @property
    def linear(self) -> bool:
        """Whether its force is linear in speed and displacement."""
        return not self.curve[0] and self.breakaway == 0.0


@dataclass(frozen=True, eq=False)
class Wall:
    """One end of the gap.

    ``kind``: "moving" (speed prescribed, possibly 0, or that of its ``body``), "shear_free", "axis" (a pipe's
    centre, no wall).
    ``slip_length`` m.  ``area`` wetted area of one gap in m^2 or None where the sizes given do not tell.
    ``radius`` m: 0 for plates; its lever arm in a rotating gap.
    """

    name: str
    kind: str
    slip_length: float = 0.0
    area: float | None = None
    radius: float = 0.0
    body: Body | None = None


@dataclass(frozen=True, eq=False)
class Inputs:
    """All inputs on common pieces: ``starts`` (P,) s; ``poly`` (P, 3, 4); ``coeff``, ``rate`` (P, 3, K) complex.

    Row order LOWER, UPPER, PRESSURE; ``before`` (3,).  The row of a wall with a body is its load; that of the
    pressure is the mean velocity where the flow is prescribed.  Form and time as in ``drive.pieces.Pieces``.
    """

    starts: np.ndarray
    poly: np.ndarray
    coeff: np.ndarray
    rate: np.ndarray
    before: np.ndarray

    def row(self, index: int) -> Pieces:
        """One input as Pieces."""
        return self._rows[index]

    @cached_property
    def _rows(self) -> tuple[Pieces, ...]:
        return tuple(
            Pieces(self.starts, self.poly[:, i], self.coeff[:, i], self.rate[:, i], float(self.before[i]))
            for i in range(self.poly.shape[1])
        )


@dataclass(frozen=True, eq=False)
class Problem:
    """A linear start-up problem between two coaxial or parallel surfaces.

    ``metric`` is m; ``inner``, ``outer`` (m) the ends' coordinates (plates: 0 and the height; pipe: 0 and the
    radius).  ``speeds`` the two walls' Drives in m/s (rad/s where ``rotating``), ``gradient`` that of the
    pressure drop per length, Pa/m; ``flow`` that of a prescribed mean velocity instead, m/s.
    ``start`` "rest" (all still and no pressure before t = 0, whatever the drives say) or "steady" (the steady flow of
    the drives' values before t = 0).
    ``duration`` s or None for "auto"; ``settle_within``, ``accuracy`` fractions.
    ``section`` flow area of one gap in m^2 or None; ``count`` gaps in parallel.
    """

    shape: str
    metric: int
    inner: float
    outer: float
    density: float
    law: Law
    walls: tuple[Wall, Wall]
    speeds: tuple[Drive, Drive]
    gradient: Drive
    start: str
    duration: float | None
    settle_within: float
    accuracy: float
    length: float | None = None
    section: float | None = None
    count: int = 1
    profiles: int = 120
    profile_times: tuple[float, ...] | None = None
    flow: Drive | None = None

    @property
    def closed(self) -> bool:
        """Whether a body or a prescribed flow closes the steps."""
        return self.flow is not None or any(wall.body is not None for wall in self.walls)

    @property
    def linear(self) -> bool:
        """Whether superposition holds, and with it an exact solution."""
        return all(wall.body is None or wall.body.linear for wall in self.walls)

    @property
    def rotating(self) -> bool:
        """Whether speeds are angular."""
        return self.metric == 3

    @property
    def gap(self) -> float:
        """Distance between the ends, m."""
        return self.outer - self.inner

    @property
    def viscosity(self) -> float:
        """Dynamic viscosity of the Newtonian law, Pa s."""
        return self.law.parameters[0]

    @property
    def diffusion_time(self) -> float:
        """gap^2 / kinematic viscosity, s."""
        return self.gap**2 * self.density / self.viscosity

    @property
    def drives(self) -> tuple[Drive, Drive, Drive]:
        """Rows LOWER, UPPER, PRESSURE."""
        low, high = (
            wall.body.load if wall.body is not None else speed
            for wall, speed in zip(self.walls, self.speeds, strict=True)
        )
        return (low, high, self.gradient if self.flow is None else self.flow)

    def inputs(self, until: float) -> Inputs:
        """The inputs over [0, until) on common pieces; with a start from rest nothing moves before t = 0."""
        if until not in self._joined:
            self._joined[until] = join(self.drives, until, still=self.start == "rest")
        return self._joined[until]

    @cached_property
    def _joined(self) -> dict[float, Inputs]:
        return {}


def join(drives: tuple[Drive, ...], until: float, still: bool) -> Inputs:
    """Several drives on the union of their break times; ``still``: all were zero before t = 0."""
    starts = merge_times([drive.breaks(until) for drive in drives])
    rows = [drive.pieces(until, starts) for drive in drives]
    most = max(row.coeff.shape[1] for row in rows)
    coeff = np.zeros((len(starts), len(rows), most), complex)
    rate = np.zeros_like(coeff)
    for i, row in enumerate(rows):
        coeff[:, i, : row.coeff.shape[1]] = row.coeff
        rate[:, i, : row.rate.shape[1]] = row.rate
    before = np.zeros(len(rows)) if still else np.array([drive.before for drive in drives], dtype=float)
    return Inputs(starts, np.stack([row.poly for row in rows], axis=1), coeff, rate, before)

"""What a case says, section by section, as frozen plain data in SI."""

from __future__ import annotations

from dataclasses import dataclass

from transient.drive.pieces import Drive
from transient.gap.shapes import Ends, Shape


@dataclass(frozen=True, eq=False)
class GapInput:
    """``sizes`` as given, m; ``areas`` wetted, of one gap, and ``section``, m^2, None where unknown; ``radii`` m."""

    shape: Shape
    sizes: dict[str, float]
    ends: Ends
    count: int
    areas: tuple[float | None, float | None]
    section: float | None
    radii: tuple[float, float]

    @property
    def length(self) -> float | None:
        """Length along the flow or the axis, m."""
        return self.sizes.get("length")


@dataclass(frozen=True)
class FluidInput:
    """``density`` kg/m^3; ``law`` a name in the registry of laws, its ``parameters`` in SI; ``viscosity`` Pa s."""

    density: float
    law: str
    parameters: tuple[float, ...]
    viscosity: float


@dataclass(frozen=True)
class Curve:
    """Load against the body's speed: ``speeds`` rising, m/s or rad/s; ``values`` N or N m.

    ``beyond`` the ends: "hold" or "refuse".
    """

    speeds: tuple[float, ...]
    values: tuple[float, ...]
    beyond: str


@dataclass(frozen=True, eq=False)
class BodyInput:
    """A body on a wall, in N, m, kg or (rotating) N m, rad, kg m^2.

    ``mass`` mass or inertia; ``load`` force or torque; ``incline`` rad; ``damping``, ``stiffness`` per speed and
    displacement; ``dry_friction`` <= ``breakaway_friction``; ``initial_speed`` None where not given; ``area``
    of one gap, m^2, given or the wetted one; ``displaces`` m^2 or None.
    """

    mass: float
    load: Drive
    curve: Curve | None
    incline: float
    damping: float
    dry_friction: float
    breakaway_friction: float
    stiffness: float
    initial_speed: float | None
    initial_displacement: float
    area: float
    displaces: float | None


@dataclass(frozen=True, eq=False)
class WallInput:
    """One wall: at most one of ``speed`` (m/s, rad/s), ``displacement`` (m, rad), ``shear_free``, ``body``."""

    name: str
    speed: Drive | None = None
    displacement: Drive | None = None
    shear_free: bool = False
    slip_length: float = 0.0
    body: BodyInput | None = None


@dataclass(frozen=True, eq=False)
class PressureInput:
    """``kind`` the key given ("drop_per_length", "drop", "flow_rate", "mean_velocity", "sealed") or "none".

    ``drive`` in SI of that key (a drop in Pa), None where there is nothing to drive.
    """

    kind: str = "none"
    drive: Drive | None = None


@dataclass(frozen=True)
class RunInput:
    """``duration`` s, None for "auto"; ``settle_within``, ``accuracy`` fractions; ``profile_times`` s, sorted."""

    duration: float | None
    settle_within: float
    accuracy: float
    profiles: int
    profile_times: tuple[float, ...] | None

"""What the rows of a sweep have in common, and every row's own numbers as arrays.

The case room reads the base case; here its numbers are taken from there, varied ones from the sweep's values, and
everything that follows from them (ends, areas, drives) is worked out for all rows together.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Any

import numpy as np

from transient.case.model import Case
from transient.drive import KINDS
from transient.drive.kind import Kind
from transient.drive.pieces import constant
from transient.gap.problem import Problem
from transient.sweep.keys import Values, Varied
from transient.sweep.lanes_bodies import Bodies, bodies_of
from transient.sweep.lanes_drives import BUILDERS, DriveRows, held, shared, varied
from transient.units import DIMENSIONS

_FLUID = ("fluid.density", "fluid.viscosity", "fluid.kinematic_viscosity")
_RUN = ("run.duration", "run.settle_within")
_DRIVEN = ("drop", "drop_per_length", "mean_velocity", "flow_rate")


@dataclass(frozen=True, eq=False)
class Geometry:
    """(n,) each: ends' coordinates and distance, m; walls' wetted areas and section of one gap, None where unknown."""

    inner: np.ndarray
    outer: np.ndarray
    gap: np.ndarray
    areas: tuple[np.ndarray | None, np.ndarray | None]
    section: np.ndarray | None
    radii: tuple[np.ndarray, np.ndarray]
    length: np.ndarray | None
    bad: np.ndarray


class Form:
    """A base case and the keys that vary over it."""

    def __init__(self, base: Case, keys: Sequence[Varied]):
        self.base, self.keys = base, {key.name: key for key in keys}
        self.problem: Problem = base.problem()
        self.stated = {one.key: one.value for one in base.inputs() if one.value is not None}

    @property
    def fits(self) -> bool:
        """Whether the lanes can march rows of this form."""
        problem = self.problem
        if problem.law.code != 0 or problem.profile_times is not None:
            return False
        if problem.flow is not None and (problem.start != "rest" or self.side is not None):
            return False
        if not self._bodies_fit():
            return False
        if not any(wall.kind == "moving" for wall in problem.walls):
            return False
        if any(key.kind not in ("quantity", "number", "whole") for key in self.keys.values()):
            return False
        return all(self._known(name) for name in self.keys) and all(self._fixed(which) for which in range(3))

    @property
    def side(self) -> int | None:
        """The end whose wall carries a body, None without."""
        found = [end for end, wall in enumerate(self.problem.walls) if wall.body is not None]
        return found[0] if found else None

    def _bodies_fit(self) -> bool:
        """Whether there is no body, or one with a mass, a load and a damper only, opposite a wall that is held."""
        problem, side = self.problem, self.side
        if side is None:
            return True
        wall, other = problem.walls[side], problem.walls[1 - side]
        if other.body is not None or other.kind != "moving" or other.slip_length or wall.slip_length:
            return False
        body, stated = wall.body, self.base.walls[side]
        assert body is not None
        assert stated is not None
        assert stated.body is not None
        if not body.linear or body.mass == 0.0 or body.stiffness or body.displaced or problem.start != "rest":
            return False
        if body.initial_speed or body.initial_displacement:
            return False
        return not stated.body.incline or not any(name.startswith(self._body_path) for name in self.keys)

    @property
    def _body_path(self) -> str:
        side = self.side
        return "" if side is None else f"wall.{self.problem.walls[side].name}.body."

    @property
    def _mass_key(self) -> str:
        return self._body_path + ("inertia" if self.problem.rotating else "mass")

    def _known(self, name: str) -> bool:
        if self._body_path and name in (self._mass_key, self._body_path + "damping", self._body_path + "area"):
            return True
        if name in _FLUID or name in _RUN or name == "gap.count":
            return True
        if name.startswith("gap."):
            return name[4:] in self.base.gap.sizes
        return any(self._touches(which, name) and self._buildable(which) for which in range(3))

    def _path(self, which: int) -> str | None:
        """The dotted key of one drive: 0, 1 the walls, 2 the pressure; None where nothing is given."""
        if which == 2:
            kind = self.base.pressure.kind
            return f"pressure.{kind}" if kind in _DRIVEN else None
        if which == self.side:
            path = self._body_path + ("torque" if self.problem.rotating else "force")
            return path if any(key == path or key.startswith(path + ".") for key in self._typed) else None
        wall = self.base.walls[which]
        return None if wall is None or wall.speed is None else f"wall.{wall.name}.speed"

    @cached_property
    def _typed(self) -> set[str]:
        return {one.key for one in self.base.inputs()}

    def _touches(self, which: int, name: str) -> bool:
        path = self._path(which)
        return path is not None and (name == path or name.startswith(path + "."))

    def _varies(self, which: int) -> bool:
        return any(self._touches(which, name) for name in self.keys)

    def _tree(self, which: int) -> Any:
        here: Any = self.base.tree
        for part in (self._path(which) or "").split("."):
            here = here[part]
        return here

    def _kind(self, which: int) -> Kind | None:
        tree = self._tree(which)
        return KINDS[tree["kind"]] if isinstance(tree, Mapping) else None

    def _buildable(self, which: int) -> bool:
        kind = self._kind(which)
        path = self._path(which)
        if kind is None:
            return all(name == path for name in self.keys if self._touches(which, name))
        fields = {f"{path}.{field.name}" for field in kind.fields}
        return kind.name in BUILDERS and all(name in fields for name in self.keys if self._touches(which, name))

    def _fixed(self, which: int) -> bool:
        """Whether a drive that does not vary is one that all rows can share."""
        return self._varies(which) or self._shared(which) is not None

    def _shared(self, which: int) -> DriveRows | None:
        if which not in self._share:
            if which < 2:
                body = self.problem.walls[which].body
                drive = self.problem.speeds[which] if body is None else body.load
            else:
                given = self.base.pressure.drive
                drive = constant(0.0) if given is None or self._path(2) is None else given
            self._share[which] = shared(drive)
        return self._share[which]

    @cached_property
    def _share(self) -> dict[int, DriveRows | None]:
        return {}

    @property
    def pieces(self) -> int:
        """Pieces that the drives of a row have at most, together."""
        shared = [self._shared(which) for which in range(3) if not self._varies(which)]
        return 5 * (3 - len(shared)) + sum(one.starts.shape[1] for one in shared if one is not None)

    @property
    def radii_vary(self) -> bool:
        """Whether the sizes of an annulus differ from row to row."""
        sizes = [name for name in self.keys if name.startswith("gap.") and name not in ("gap.count", "gap.length")]
        return bool(sizes) and self.problem.metric > 0 and self.problem.walls[0].kind != "axis"

    def number(self, name: str, values: Values, rows: int) -> np.ndarray | None:
        """A key's value (n,) in SI: the rows' own, else the base case's; None where neither says."""
        if name in self.keys:
            return np.asarray(values[name], dtype=float)
        stated = self.stated.get(name)
        return None if stated is None else np.full(rows, float(stated))

    def refused(self, values: Values, rows: int) -> np.ndarray:
        """Rows (n,) with a number that the case room would not take."""
        bad = np.zeros(rows, bool)
        for name, key in self.keys.items():
            number = np.asarray(values[name], dtype=float)
            bad |= ~np.isfinite(number)
            if key.dimension in DIMENSIONS:
                one = DIMENSIONS[key.dimension]
                size = np.abs(number)
                bad |= (size > one.largest) | ((size < one.smallest) & (size > 0.0))
            if name.startswith(("gap.", "fluid.", "run.")):
                bad |= ~(number > 0.0)
            if name in (self._mass_key, self._body_path + "area"):
                bad |= ~(number > 0.0)
            if name == self._body_path + "damping":
                bad |= ~(number >= 0.0)
            if name == "run.settle_within":
                bad |= ~(number < 1.0)
        return bad

    def fluid(self, values: Values, rows: int) -> tuple[np.ndarray, np.ndarray]:
        """(density, dynamic viscosity), (n,) each."""
        density = self.number("fluid.density", values, rows)
        assert density is not None
        kinematic = self.number("fluid.kinematic_viscosity", values, rows)
        if kinematic is not None:
            return density, kinematic * density
        viscosity = self.number("fluid.viscosity", values, rows)
        return density, np.full(rows, self.problem.viscosity) if viscosity is None else viscosity

    def geometry(self, values: Values, rows: int) -> Geometry:
        """All rows' ends and areas."""
        sizes = {name: self.number(f"gap.{name}", values, rows) for name in self.base.gap.sizes}
        known: dict[str, Any] = {name: size for name, size in sizes.items() if size is not None}
        shape = self.base.gap.shape
        varying = any(name.startswith("gap.") for name in self.keys)
        if not varying:
            ends = self.base.gap.ends
            ends = replace(ends, **{k: np.full(rows, getattr(ends, k)) for k in ("inner", "outer", "gap")})
        elif shape.word == "annulus":
            ends = replace(self.base.gap.ends, **_annulus(known))
        else:
            ends = shape.ends(known)
        inner, outer, gap = (np.broadcast_to(np.asarray(x, float), (rows,)) for x in (ends.inner, ends.outer, ends.gap))
        with np.errstate(invalid="ignore"):
            bad = ~((inner >= 0.0) & (inner < outer) & (gap > 0.0))
        radii = tuple(np.broadcast_to(np.asarray(r, float), (rows,)) for r in shape.radii(ends))
        areas = list(shape.areas(ends, known))
        if self.side is not None:
            areas[self.side] = self._body_area(values, rows, areas[self.side])
        return Geometry(
            inner, outer, gap, (areas[0], areas[1]), shape.section(ends, known), (radii[0], radii[1]),
            known.get("length"), bad,
        )  # fmt: skip

    def _body_area(self, values: Values, rows: int, wetted: Any) -> np.ndarray:
        """What of one gap acts on the body, m^2: as stated, else the wetted area."""
        stated = self.number(self._body_path + "area", values, rows)
        return np.broadcast_to(np.asarray(wetted, float), (rows,)) if stated is None else stated

    def bodies(self, values: Values, geometry: Geometry, count: np.ndarray, rows: int) -> Bodies | None:
        """The rows' bodies, None without."""
        side = self.side
        if side is None:
            return None
        body = self.problem.walls[side].body
        assert body is not None
        mass = self.number(self._mass_key, values, rows)
        damping = self.number(self._body_path + "damping", values, rows)
        density, viscosity = self.fluid(values, rows)
        area = geometry.areas[side]
        assert area is not None
        lever = geometry.radii[side] if self.problem.rotating else 1.0
        radius = (geometry.inner, geometry.outer)[side] / geometry.gap
        return bodies_of(
            self.problem, side, np.full(rows, body.mass) if mass is None else mass,
            np.full(rows, body.damping) if damping is None else damping, area * count * lever, geometry.gap, radius,
            density, viscosity,
        )  # fmt: skip

    def drive(self, which: int, values: Values, geometry: Geometry, rows: int) -> DriveRows:
        """One input's rows: wall speeds in m/s or rad/s, the pressure drop per length in Pa/m."""
        found = self._varied(which, values, rows) if self._varies(which) else self._shared(which)
        assert found is not None
        if which == 2 and self.base.pressure.kind == "drop":
            assert geometry.length is not None
            found = found.scaled(1.0 / geometry.length)
        if which == 2 and self.base.pressure.kind == "flow_rate":
            count = self.number("gap.count", values, rows)
            section = np.broadcast_to(np.asarray(geometry.section, float), (rows,))
            found = found.scaled(1.0 / (section * (float(self.problem.count) if count is None else count)))
        return found

    def _varied(self, which: int, values: Values, rows: int) -> DriveRows:
        path, kind = self._path(which), self._kind(which)
        assert path is not None
        if kind is None:
            number = self.number(path, values, rows)
            assert number is not None
            bad = ~np.isfinite(number)
            return replace(held(np.where(bad, 0.0, number)), bad=bad)
        numbers = {}
        for field in kind.fields:
            number = self.number(f"{path}.{field.name}", values, rows)
            numbers[field.name] = np.full(rows, float(field.default)) if number is None else number
        return varied(kind, numbers)


def _annulus(sizes: Mapping[str, np.ndarray]) -> dict[str, np.ndarray]:
    """Ends from two of inner size, outer size and clearance, as in ``gap.shapes.annulus``."""
    def radius(one: str, other: str) -> np.ndarray | None:
        if one in sizes:
            return sizes[one] / 2
        return sizes.get(other)

    inner = radius("inner_diameter", "inner_radius")
    outer = radius("outer_diameter", "outer_radius")
    clear = radius("diametral_clearance", "radial_clearance")
    if clear is None:
        assert inner is not None
        assert outer is not None
        return {"inner": inner, "outer": outer, "gap": outer - inner}
    if outer is None:
        assert inner is not None
        return {"inner": inner, "outer": inner + clear, "gap": clear}
    return {"inner": outer - clear, "outer": outer, "gap": clear}

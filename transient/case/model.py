"""A case: what the user states, checked and in SI, ready to become a problem."""

from __future__ import annotations

from collections.abc import Mapping
from math import sin
from pathlib import Path as FilePath
from typing import Any

from transient.case.gap import read_fluid, read_gap
from transient.case.inputs import BodyInput, FluidInput, GapInput, PressureInput, RunInput, WallInput
from transient.case.keys import TITLE
from transient.case.override import as_changes, put
from transient.case.reading import Input, Reading
from transient.case.run import read_pressure, read_run, read_start
from transient.case.source import CaseError, Source
from transient.case.walls import read_walls
from transient.case.write import to_toml
from transient.drive.pieces import Drive, DriveError, common_period, constant, total
from transient.fluid import LAWS
from transient.gap.problem import Body, Law, Problem, Wall
from transient.units import typed

GRAVITY = 9.80665  # m/s^2, standard gravity of ISO 80000-3 (value from memory)
TABLES = ("title", "gap", "fluid", "wall", "pressure", "start", "run")


class Case:
    """A validated case; not to be changed, ``replace`` gives a new one.

    ``Case(tree)`` takes a dict with the keys of a case file and raises ``CaseError``.  ``gap``, ``fluid``, ``walls``
    (in the order of the ends, None for an axis), ``pressure``, ``start`` and ``run`` are what it says, in SI.
    """

    def __init__(self, tree: Mapping[str, Any], source: Source | None = None):
        if not isinstance(tree, Mapping):
            raise CaseError(f"{typed(tree)} is no case; a dict with the keys of a case file is needed")
        reading = Reading(dict(tree), source or Source())
        self.source = reading.source
        self.tree = reading.tree
        root = reading.section((), (*TABLES,), reading.tree)
        self.title: str = root.read(TITLE) or FilePath(self.source.file).stem or "Untitled case"
        self.gap: GapInput = read_gap(reading)
        reading.rotating = self.gap.shape.rotating
        self.fluid: FluidInput = read_fluid(reading)
        self.start: str = read_start(reading)
        reading.steady = self.start == "steady"
        self.walls: tuple[WallInput | None, WallInput | None] = read_walls(reading, self.gap)
        self.pressure: PressureInput = read_pressure(reading, self.gap)
        self.run: RunInput = read_run(reading)
        reading.refuse_what_comes_later()
        self._refuse_endless(reading)
        self._inputs = tuple(reading.inputs)
        self._resolved = {"title": self.title, **{k: v for k, v in reading.resolved.items() if k != "title"}}

    def inputs(self) -> tuple[Input, ...]:
        """Each input as typed, with its SI value and unit, in the order of the file's sections."""
        return self._inputs

    def text(self) -> str:
        """The whole case as TOML text that reads back to the same case, table files turned into lists."""
        return to_toml(self._resolved)

    def replace(self, changes: Mapping[str, Any] | None = None, **more: Any) -> Case:
        """The case with keys set: ``replace({"gap.height": "0.5 mm"})`` or ``replace(gap__height="0.5 mm")``.

        Raises ``CaseError``.
        """
        wanted = as_changes({**(changes or {}), **more})
        # Rows already read need no second reading, unless the change is about the file they came from.
        about_tables = any(path[-1] in ("file", "column", "time_column", "kind") for path, _ in wanted)
        tree, _ = put(self.tree if about_tables else self._resolved, wanted)
        return Case(tree, Source(self.source.file, self.source.folder))

    def problem(self) -> Problem:
        """The case as plain numbers for the march and the series."""
        gap, run = self.gap, self.run
        return Problem(
            shape=gap.shape.name,
            metric=gap.shape.metric,
            inner=gap.ends.inner,
            outer=gap.ends.outer,
            density=self.fluid.density,
            law=Law(LAWS[self.fluid.law].code, self.fluid.parameters),
            walls=(self._wall(0), self._wall(1)),
            speeds=(self._speed(0), self._speed(1)),
            gradient=self._gradient(),
            flow=self._flow(),
            start=self.start,
            duration=run.duration,
            settle_within=run.settle_within,
            accuracy=run.accuracy,
            length=gap.length,
            section=gap.section,
            count=gap.count,
            profiles=run.profiles,
            profile_times=run.profile_times,
        )

    def _wall(self, end: int) -> Wall:
        wall = self.walls[end]
        if wall is None:
            return Wall(self.gap.shape.walls[end], "axis")
        kind = "shear_free" if wall.shear_free else "moving"
        area = self.gap.areas[end] if wall.body is None else wall.body.area
        body = None if wall.body is None else self._body(wall.body, end)
        return Wall(wall.name, kind, wall.slip_length, area, self.gap.radii[end], body)

    def _body(self, body: BodyInput, end: int) -> Body:
        """The body with its weight along +x among its loads, and all gaps' stress acting on it."""
        lever = self.gap.radii[end] if self.gap.shape.rotating else 1.0
        weight = body.mass * GRAVITY * sin(body.incline)
        return Body(
            mass=body.mass,
            load=body.load if weight == 0.0 else total([body.load, constant(weight)]),
            grip=body.area * self.gap.count * lever,
            damping=body.damping,
            stiffness=body.stiffness,
            curve=((), ()) if body.curve is None else (body.curve.speeds, body.curve.values),
            held_beyond=body.curve is None or body.curve.beyond == "hold",
            sliding=body.dry_friction,
            breakaway=body.breakaway_friction,
            initial_speed=body.initial_speed,
            initial_displacement=body.initial_displacement,
            displaced=body.displaces or 0.0,
        )

    def _speed(self, end: int) -> Drive:
        wall = self.walls[end]
        if wall is None or (wall.speed is None and wall.displacement is None):
            return constant(0.0)
        return wall.speed if wall.displacement is None else wall.displacement.derivative()

    def _flow(self) -> Drive | None:
        """The prescribed mean velocity, None where the pressure is prescribed."""
        pressure, gap = self.pressure, self.gap
        if pressure.kind == "sealed":
            return constant(0.0)
        if pressure.drive is None or pressure.kind not in ("flow_rate", "mean_velocity"):
            return None
        if pressure.kind == "mean_velocity":
            return pressure.drive
        assert gap.section is not None
        return pressure.drive.scaled(1.0 / (gap.section * gap.count))

    def _gradient(self) -> Drive:
        if self.pressure.kind == "drop_per_length" and self.pressure.drive is not None:
            return self.pressure.drive
        if self.pressure.kind == "drop" and self.pressure.drive is not None and self.gap.length is not None:
            return self.pressure.drive.scaled(1.0 / self.gap.length)
        return constant(0.0)

    def drives(self) -> tuple[Drive, ...]:
        """Every history of the case."""
        walls = [wall for wall in self.walls if wall is not None]
        found = [drive for wall in walls for drive in (wall.speed, wall.displacement)]
        found += [wall.body.load for wall in walls if wall.body is not None]
        return tuple(drive for drive in (*found, self.pressure.drive) if drive is not None)

    def _refuse_endless(self, reading: Reading) -> None:
        """An automatic duration needs a drive that ends in something."""
        if self.run.duration is not None:
            self._refuse_too_many_cycles(reading, self.run.duration)
            return
        ends = [drive.eventual for drive in self.drives()]
        if any(end.drive is None for end in ends) or not common_period([end.period for end in ends])[1]:
            raise reading.source.refuse(
                ("run", "duration"),
                '"auto" needs a drive that ends in a steady or periodic state; a time is needed, such as "2 s"',
            )

    def _refuse_too_many_cycles(self, reading: Reading, duration: float) -> None:
        """A run of millions of cycles would be solved for days."""
        try:
            for drive in self.drives():
                drive.breaks(duration)
        except DriveError as error:
            raise reading.source.refuse(("run", "duration"), str(error)) from None

    def __eq__(self, other: object) -> bool:
        return isinstance(other, Case) and self._resolved == other._resolved

    def __hash__(self) -> int:
        return hash(self.text())

    def __reduce__(self) -> tuple[Any, ...]:
        return Case, (self._resolved, Source(self.source.file))

    def __repr__(self) -> str:
        return f"Case({self.title!r}, {self.gap.shape.name})"


__all__ = ["Case", "CaseError"]

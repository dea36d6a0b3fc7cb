"""[pressure], [start] and [run]: what drives the flow along the gap, from which state, and how it is to be solved."""

from __future__ import annotations

from transient.case.inputs import GapInput, PressureInput, RunInput
from transient.case.keys import PRESSURE, RUN, START
from transient.case.reading import Reading, Section
from transient.case.walls import history
from transient.units import show


def read_start(reading: Reading) -> str:
    """ "rest" or "steady"; raises ``CaseError``."""
    return reading.section(("start",), [START[0].name]).read(START[0])


def read_pressure(reading: Reading, gap: GapInput) -> PressureInput:
    """What drives the flow along the gap; raises ``CaseError``."""
    section = reading.section(("pressure",), [key.name for key in PRESSURE])
    keys = {key.name: key for key in PRESSURE}
    given = [name for name in section.given(keys) if section.tree[name] is not False]
    if given and gap.shape.rotating:
        raise section.refuse(given[0], "no pressure drives a rotating gap; leave [pressure] out")
    if len(given) > 1:
        raise section.refuse(given[1], f"is given beside {given[0]}; one of {', '.join(keys)} is needed")
    if section.read(keys["sealed"]):
        return PressureInput("sealed")
    if not given or given[0] == "sealed":
        return PressureInput()
    name = given[0]
    _refuse_without_size(section, gap, name)
    return PressureInput(name, history(reading, (*section.path, name), section.tree[name], keys[name].dimension))


def _refuse_without_size(section: Section, gap: GapInput, name: str) -> None:
    if name == "drop" and gap.length is None:
        raise section.refuse(name, 'needs gap.length; add it, such as length = "60 mm" in [gap]')
    if name == "flow_rate" and gap.section is None:
        raise section.refuse(name, 'needs gap.width; add it, such as width = "25 mm" in [gap]')


def read_run(reading: Reading) -> RunInput:
    """How to solve it; raises ``CaseError``."""
    section = reading.section(("run",), [key.name for key in RUN])
    values = {key.name: section.read(key) for key in RUN}
    duration = None if values["duration"] == "auto" else values["duration"]
    times = values["profile_times"]
    if times is not None:
        if "profiles" in section:
            raise section.refuse("profile_times", "is given beside profiles; one of them is needed")
        times = tuple(sorted(set(times)))
        if duration is not None and times[-1] > duration:
            late = show(times[-1], "time")
            raise section.refuse("profile_times", f"{late} lies after the end of the run, {show(duration, 'time')}")
    return RunInput(duration, values["settle_within"], values["accuracy"], values["profiles"], times)

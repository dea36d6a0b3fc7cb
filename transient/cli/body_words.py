"""What the printed summary says about bodies on walls."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from transient.cli.numbers import entry, listed, percent, plain, stated


def describe_bodies(bodies: dict[str, Any], within: float, rotating: bool) -> list[str]:
    """Lines about every body: how fast, since when, how far, and what happens when its drive ends."""
    units = ("rad/s", "rad", "rad/s^2") if rotating else ("m/s", "m", "m/s^2")
    lines: list[str] = []
    for wall, body in bodies.items():
        text = "; ".join(_sentences(body, within, *units))
        lines += entry("" if lines else "Body", f"on {wall}: {text}")
    return lines


def _sentences(body: dict[str, Any], within: float, speed: str, way: str, acceleration: str) -> Iterator[str]:
    if body["terminal_speed"] is not None:
        text = f"ends at {plain(body['terminal_speed'], speed)}"
        if body["speed_settling_time"] is not None:
            after = stated(body["speed_settling_time"], body["speed_settling_error"], "s")
            text += f", within {percent(within)} after {after}"
        yield text
    yield f"largest speed {plain(body['peak_speed'], speed)} at {plain(body['peak_speed_time'], 's')}"
    if body["peak_acceleration"] is not None:
        at = plain(body["peak_acceleration_time"], "s")
        yield f"largest acceleration {plain(body['peak_acceleration'], acceleration)} at {at}"
    yield f"at the end {plain(body['final_position'], way)} from its zero"
    coast = body["coast_down"]
    if coast is not None and coast["time"] is not None:
        yield (
            f"coasts from {plain(coast['speed'], speed)} for {plain(coast['time'], 's')} "
            f"and {plain(coast['distance'], way)}"
        )
    still = [f"{plain(a, 's')} {'on' if b is None else 'to ' + plain(b, 's')}" for a, b in body["standstills"]]
    if still:
        yield f"held by dry friction from {listed(still)}"

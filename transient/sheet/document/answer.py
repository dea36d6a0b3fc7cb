"""The answer in one box: settling, largest and final wall stress, loads, with their errors."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

from transient.result.said import percent
from transient.sheet.document.blocks import Answer, Block, Words
from transient.sheet.document.facts import Facts, brief, said

Row = tuple[str, str, str]

VERDICTS = {
    "good": ("Solved; every check passed.", "good"),
    "caution": ("Solved, with cautions: read them below.", "caution"),
    "outside": ("OUTSIDE what the model describes: not to be relied on.", "bad"),
    "failed": ("A SELF-CHECK FAILED: not to be relied on.", "bad"),
}
FLAT = 0.02
ERRORS = {"exact": "against the exact series", "estimate": "from refinement"}


def answer(facts: Facts) -> tuple[Block, ...]:
    """The box, and what its signs and errors mean."""
    words, mark = VERDICTS.get(str(facts.summary.get("verdict")), ("", ""))
    accuracy = facts.summary.get("accuracy") or {}
    if accuracy and not accuracy["met"]:
        words += f" The accuracy of {percent(accuracy['asked'])} was not reached ({accuracy['worst']})."
        mark = mark if mark == "bad" else "caution"
    rows = (*_settling(facts), *_stresses(facts), *_bodies(facts), *_flow(facts))
    return Answer(words, mark, rows), Words(" ".join(_remarks(facts)))


def _settling(facts: Facts) -> Iterator[Row]:
    part = facts.summary.get("settling")
    if not part:
        return
    within = percent(part["within"])
    if part.get("time") is None:
        yield "Settling time", "not reached", f"not within {within} of a lasting state in this run"
        return
    end = "periodic state" if facts.periodic else "steady state"
    yield "Settling time", said(part["time"], part.get("error"), "s"), f"velocity within {within} of its {end}"
    more = [] if part.get("flow") is None else [f"flow {brief(part['flow'], 's')}"]
    more += [f"stress on {w} {brief(at, 's')}" for w, at in (part.get("stress") or {}).items() if at is not None]
    if more:
        yield "", "", "; ".join(more)


def _stresses(facts: Facts) -> Iterator[Row]:
    for name, wall in facts.walls.items():
        if wall.get("unbounded"):
            yield f"Largest stress, {name}", "unbounded", _law(wall)
        else:
            peak = said(wall.get("peak_stress"), wall.get("peak_stress_error"), "Pa")
            yield f"Largest stress, {name}", peak, _when(wall, facts)
            yield from _loads(facts, name, wall)
        if not facts.periodic:
            final = said(wall.get("final_stress"), wall.get("final_stress_error"), "Pa")
            speed = brief(_calm(wall.get("final_speed")), facts.speed_unit)
            yield f"Final stress, {name}", final, f"wall speed {speed}"


def _when(wall: dict[str, Any], facts: Facts) -> str:
    when, error = wall.get("peak_time"), wall.get("peak_time_error")
    flat = when is not None and error is not None and error > FLAT * abs(when)  # a plateau has no instant of its own
    text = f"at {brief(when, 's')}" + (", on a plateau" if flat else "")
    over = wall.get("overshoot") or 0.0
    if 0.01 < over < 1e3 and not facts.periodic:
        text += f"; {1.0 + over:.3g} times the final one"
    return text


def _loads(facts: Facts, name: str, wall: dict[str, Any]) -> Iterator[Row]:
    """Largest force or torque, unfactored and, where a factor was asked for, factored."""
    load, peak = wall.get(f"peak_{facts.load_word}"), wall.get("peak_stress")
    error = wall.get("peak_stress_error")
    share = abs(load / peak) if load and peak else None
    bound = None if share is None or error is None else error * share
    factor = facts.factor
    if load is not None:
        label = f"Largest {facts.load_word}, {name}"
        yield label, said(load, bound, facts.load_unit), "all gaps together, unfactored" if factor else "all gaps"
        if factor:
            scaled = None if bound is None else factor * bound
            yield f"  factored × {factor:g}", said(factor * load, scaled, facts.load_unit), "as asked for this sheet"
    elif factor and peak is not None:
        scaled = None if error is None else factor * error
        yield f"  factored × {factor:g}", said(factor * peak, scaled, "Pa"), "as asked for this sheet"


def _law(wall: dict[str, Any]) -> str:
    """The law by which an infinite stress falls."""
    coefficient, exponent = wall.get("unbounded_coefficient"), wall.get("unbounded_exponent") or 0.5
    at = brief(wall.get("peak_time") or 0.0, "s")
    if coefficient is None:
        return f"infinite at {at}, where the wall's speed jumps"
    law = "K/√t" if exponent == 0.5 else f"K/t^{exponent:.3g}"
    after = brief(coefficient / 1e-3**exponent, "Pa")
    return f"the wall's speed jumps at {at}: {law} with K = {coefficient:.4g} Pa·s^{exponent:.3g}, {after} after 1 ms"


def _bodies(facts: Facts) -> Iterator[Row]:
    unit = facts.speed_unit
    place = "rad" if facts.rotating else "m"
    for name, body in (facts.summary.get("bodies") or {}).items():
        if body.get("terminal_speed") is not None:
            after = body.get("speed_settling_time")
            settled = "" if after is None else f"reached after {said(after, body.get('speed_settling_error'), 's')}"
            yield f"Terminal speed, {name}", brief(body["terminal_speed"], unit), settled
        peak = said(body.get("peak_speed"), body.get("peak_speed_error"), unit)
        yield f"Largest speed, {name}", peak, f"at {brief(body.get('peak_speed_time'), 's')}"
        coast = body.get("coast_down")
        if coast and coast.get("time") is not None:
            way = said(coast["distance"], coast.get("distance_error"), place)
            yield f"Coasts, {name}", way, f"in {said(coast['time'], coast.get('time_error'), 's')}"


def _flow(facts: Facts) -> Iterator[Row]:
    flow = facts.summary.get("flow") or {}
    if flow.get("peak_mean_velocity"):
        final = _calm(flow.get("final_mean_velocity"), flow["peak_mean_velocity"])
        largest = said(flow["peak_mean_velocity"], flow.get("peak_mean_velocity_error"), "m/s")
        yield "Largest mean velocity", largest, f"in the end {brief(final, 'm/s')}"
    if flow.get("peak_flow_rate"):
        volume = flow.get("volume_delivered")
        remark = "" if volume is None else f"{brief(volume, 'm^3')} delivered in the run"
        yield "Largest flow rate", brief(flow["peak_flow_rate"], "m^3/s"), remark
    pressure = facts.summary.get("pressure") or {}
    if pressure.get("peak_drop_per_length"):
        largest = said(pressure["peak_drop_per_length"], pressure.get("peak_drop_per_length_error"), "Pa/m")
        yield "Largest pressure drop", largest, f"per length, at {brief(pressure.get('peak_time'), 's')}"
    heat = facts.summary.get("heat") or {}
    if heat.get("peak_rise") is not None:
        yield "Largest rise of temperature", f"{heat['peak_rise']:.3g} K", f"{heat['peak_temperature']:.5g} K at most"


def _calm(value: float | None, size: float = 1.0) -> float | None:
    """What is left of a decay, as zero."""
    return 0.0 if value is not None and abs(value) < 1e-9 * abs(size) else value


def _remarks(facts: Facts) -> Iterator[str]:
    yield "A stress is the traction of the liquid on the wall, positive " + (
        "in the sense of positive rotation." if facts.rotating else "along +x."
    )
    kinds = {wall.get("error_kind") for wall in facts.walls.values()} - {None}
    told = " and ".join(ERRORS[kind] for kind in sorted(kinds) if kind in ERRORS)
    yield f"± is the numerical error alone{f', {told}' if told else ''}."
    if facts.factor:
        yield f"Factored values are the others times {facts.factor:g}; nothing else on this sheet is factored."
    else:
        yield "No safety factor is included."

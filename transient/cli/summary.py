"""The summary for people: what a designer would read aloud, in ten seconds and 80 columns."""

from __future__ import annotations

from pathlib import Path
from typing import TYPE_CHECKING, Any

from transient.cli.body_words import describe_bodies
from transient.cli.numbers import LABEL, columns, entry, listed, percent, plain, stated

if TYPE_CHECKING:
    from transient.result.result import Result, Variable

VERDICTS = {
    "good": "good",
    "caution": "good, with a caution",
    "outside": "outside what this model describes: do not rely on these numbers",
    "failed": "a self-check failed: do not rely on these numbers",
}


def describe(result: Result, path: Path) -> str:
    """The printed summary of a finished run, lines of at most 80 columns."""
    summary = result.summary
    speeds = result.variables["wall_speed"]
    blocks = [
        [result.title or path.stem],
        _settling(summary["settling"]),
        [*_walls(summary["walls"], speeds), *_remarks(summary)],
        describe_bodies(summary.get("bodies") or {}, summary["settling"]["within"], speeds.units == "rad/s"),
        [*_flow(summary), *_pressure(summary), *_hand_formula(summary)],
        [*_trust(summary), *entry("File", f"{path}   ({_effort(summary)})")],
    ]
    return "\n\n".join("\n".join(block) for block in blocks if block)


def _settling(part: dict[str, Any]) -> list[str]:
    within = percent(part["within"])
    if part.get("time") is None:
        return entry("Settled", f"not within {within} in this run, since {_unsettled(part)}")
    end = "steady state"
    if part.get("regime") == "periodic":
        end = f"periodic state (period {plain(part['period'], 's')})"
    time = stated(part["time"], part.get("error"), "s")
    lines = entry("Settled", f"after {time}: velocity within {within} of its {end}")
    told = [] if part.get("flow") is None else [f"flow after {plain(part['flow'], 's')}"]
    walls = [f"on {w} after {plain(at, 's')}" for w, at in (part.get("stress") or {}).items() if at is not None]
    if walls:
        told.append(f"wall stress {listed(walls)}")
    return lines + (entry("", "; ".join(told)) if told else [])


def _unsettled(part: dict[str, Any]) -> str:
    if part.get("regime") == "none":
        return "the drive ends in no steady or periodic state"
    return "the run ends before that; give it a longer duration"


def _walls(walls: dict[str, Any], speeds: Variable) -> list[str]:
    # What is left of a speed that has come back to zero is round-off of the largest.
    nothing = 1e-12 * float(abs(speeds.data).max(initial=0.0))
    rows = [["Wall", "largest stress", "at", "in the end", "speed then"]]
    for name, wall in walls.items():
        peak = "unbounded" if wall.get("unbounded") else _stated(wall.get("peak_stress"), wall.get("peak_stress_error"))
        rows.append(
            [
                name,
                peak,
                _plain(wall.get("peak_time"), "s"),
                _stated(wall.get("final_stress"), wall.get("final_stress_error")),
                plain(wall["final_speed"] if abs(wall["final_speed"]) > nothing else 0.0, speeds.units),
            ]
        )
    for row in rows:
        row[0] = row[0].ljust(LABEL - 3)
    return list(columns(rows))


def _stated(value: float | None, error: float | None) -> str:
    return "-" if value is None else stated(value, error, "Pa")


def _plain(value: float | None, unit: str) -> str:
    return "-" if value is None else plain(value, unit)


def _remarks(summary: dict[str, Any]) -> list[str]:
    """What the wall table cannot hold: infinite starts, peaks far above the end, forces."""
    walls = summary["walls"].items()
    lines: list[str] = []
    for name, wall in walls:
        if wall.get("unbounded"):
            lines += entry("", _unbounded(name, wall))
    above = [f"{1.0 + wall['overshoot']:.3g} times on {name}" for name, wall in walls if _overshoots(wall)]
    if above and summary["settling"].get("regime") == "steady":
        lines += entry("", f"largest over final stress: {listed(above)}")
    for key, unit in (("force", "N"), ("torque", "N m")):
        peaks = [f"{plain(wall[f'peak_{key}'], unit)} on {name}" for name, wall in walls if wall.get(f"peak_{key}")]
        if peaks:
            lines += entry("", f"largest {key} {listed(peaks)}")
    return lines


def _overshoots(wall: dict[str, Any]) -> bool:
    """Whether the peak stands out; beyond a thousand times the final value counts as zero."""
    return 0.01 < (wall.get("overshoot") or 0.0) < 1e3


def _unbounded(name: str, wall: dict[str, Any]) -> str:
    """The law of an infinite start, with one number to picture it."""
    coefficient, exponent = wall["unbounded_coefficient"], wall.get("unbounded_exponent", 0.5)
    at = plain(wall.get("peak_time") or 0.0, "s")
    law = "K / sqrt(t)" if exponent == 0.5 else f"K / t^{exponent:.3g}"
    example = plain(coefficient / 1e-3**exponent, "Pa")
    return (
        f"{name}: a jump at {at} makes the stress infinite there. It falls as {law} with "
        f"K = {coefficient:.4g} Pa s^{exponent:.3g}, t from the jump on: {example} after 1 ms"
    )


def _flow(summary: dict[str, Any]) -> list[str]:
    flow = summary.get("flow") or {}
    if flow.get("final_mean_velocity") is None:
        return []
    text = f"mean velocity {plain(flow['final_mean_velocity'], 'm/s')} in the end"
    largest = plain(flow["peak_mean_velocity"], "m/s")
    if largest not in text:
        text += f", largest {largest}"
    if flow.get("peak_flow_rate") is not None:
        text += f"; largest flow rate {plain(flow['peak_flow_rate'], 'm^3/s')}"
    if flow.get("volume_delivered") is not None:
        text += f"; {plain(flow['volume_delivered'], 'm^3')} delivered in the run"
    return entry("Flow", text)


def _pressure(summary: dict[str, Any]) -> list[str]:
    part = summary.get("pressure") or {}
    final = stated(part["final_drop_per_length"], part.get("final_drop_per_length_error"), "Pa/m")
    if part.get("unbounded"):
        at = plain(part["peak_time"], "s")
        return entry("Pressure", f"drop per length {final} in the end, after an impulse at {at}")
    peak = part.get("peak_drop_per_length")
    if not peak:
        return []
    largest = stated(peak, part.get("peak_drop_per_length_error"), "Pa/m")
    return entry("Pressure", f"drop per length {final} in the end, largest {largest}")


def _hand_formula(summary: dict[str, Any]) -> list[str]:
    part = summary.get("quasi_steady")
    if not part:
        return []
    stresses = (part.get("peak_stress") or {}).items()
    peaks = [f"{plain(peak, 'Pa')} on {wall}" for wall, peak in stresses if peak is not None]
    text = f"{listed(peaks)} at most, as if the flow were steady at every instant. " if peaks else ""
    text += "Enough here" if part.get("enough") else "Not enough here"
    if part.get("note"):
        text += f": {part['note']}"
    return entry("By hand", text)


def _trust(summary: dict[str, Any]) -> list[str]:
    checks = summary.get("checks") or []
    passed = sum(check["status"] == "pass" for check in checks)
    text = f"{VERDICTS.get(summary['verdict'], summary['verdict'])} ({passed} of {len(checks)} checks passed)"
    text += _accuracy(summary.get("accuracy") or {})
    lines = entry("Trust", text)
    for check in sorted(checks, key=lambda check: check["status"] != "fail"):
        if check["status"] != "pass":
            lines += entry("", f"{_word(check)} ({check['name']}): {check['note']}")
    return lines


def _word(check: dict[str, Any]) -> str:
    if check["status"] == "caution":
        return "caution"
    return "OUTSIDE" if check["kind"] == "validity" else "FAILED"


def _accuracy(part: dict[str, Any]) -> str:
    if part.get("asked") is None:
        return ""
    if part.get("met"):
        return f"; all numbers within the {percent(part['asked'])} asked"
    return f"; accuracy asked {percent(part['asked'])}, reached {percent(part['reached'])} ({part['worst']})"


def _effort(summary: dict[str, Any]) -> str:
    part = summary["numerics"]
    return f"{part['points']} points, {part['steps']} steps, {plain(part['seconds'], 's')}"

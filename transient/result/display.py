"""How a result shows itself in a session or a notebook: a few lines, from whatever numbers its summary holds."""

from __future__ import annotations

from html import escape
from typing import TYPE_CHECKING, Any

from transient.result.scale import quantity

if TYPE_CHECKING:
    from transient.result.result import Result


# Below this share of the wall's peak a stress counts as zero.
ZERO = 1e-6


def plain(result: Result) -> str:
    """Heading, the headline numbers, and the sizes of the dimensions."""
    lines = [heading(result), *(f"  {label}: {text}" for label, text in rows(result))]
    return "\n".join(lines)


def html(result: Result) -> str:
    """The same as a small table; every text is escaped."""
    body = "".join(
        f"<tr><th style='text-align:left'>{escape(label)}</th><td style='text-align:left'>{escape(text)}</td></tr>"
        for label, text in rows(result)
    )
    return f"<table><caption style='text-align:left'><b>{escape(heading(result))}</b></caption>{body}</table>"


def heading(result: Result) -> str:
    """Title, shape and verdict in one line."""
    facts = [str(result.summary[key]) for key in ("shape", "verdict") if result.summary.get(key)]
    return f"Result {result.title!r}" + (f" ({', '.join(facts)})" if facts else "")


def rows(result: Result) -> list[tuple[str, str]]:
    """Label and text of every line below the heading."""
    out = []
    settling = result.summary.get("settling")
    if settling:
        out.append(("settling", _settling(settling)))
    speed_unit = result.variables["wall_speed"].units if "wall_speed" in result.variables else "m/s"
    for name, wall in (result.summary.get("walls") or {}).items():
        out.append((name, _wall(wall, speed_unit)))
    flow = result.summary.get("flow") or {}
    if flow.get("final_mean_velocity") is not None:
        out.append(("final mean velocity", quantity(flow["final_mean_velocity"], "m/s")))
    sizes = {v.dims[0]: len(v.data) for name, v in result.variables.items() if v.dims == (name,)}
    if sizes:
        out.append(("sizes", ", ".join(f"{dim} {size}" for dim, size in sizes.items())))
    return out


def _settling(part: dict[str, Any]) -> str:
    within = f"within {100 * part.get('within', 0):g} %"
    if part.get("time") is None:
        return f"not {within} in this run" if not part.get("reached") else f"{within}: no time stated"
    return f"{within} after {quantity(part['time'], 's')}{_error(part.get('error'), 's')}"


def _wall(part: dict[str, Any], speed_unit: str) -> str:
    if part.get("unbounded"):
        peak = "stress unbounded"
    elif part.get("peak_stress") is None:
        peak = "no peak stress"
    else:
        peak = f"peak stress {quantity(part['peak_stress'], 'Pa')}{_error(part.get('peak_stress_error'), 'Pa')}"
    if part.get("peak_time") is not None:
        peak += f" at {quantity(part['peak_time'], 's')}"
    if part.get("final_stress") is not None:
        final = part["final_stress"]
        # What is left of the decay in a run that ends at rest is zero to everyone.
        peak += f", final {quantity(0.0 if abs(final) < ZERO * abs(part.get('peak_stress') or 0.0) else final, 'Pa')}"
    if part.get("final_speed") is not None:
        peak += f" at {quantity(part['final_speed'], speed_unit)}"
    return peak


def _error(value: float | None, unit: str) -> str:
    return "" if value is None else f" ± {quantity(value, unit, 2)}"

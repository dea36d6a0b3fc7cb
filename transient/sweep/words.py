"""How a table shows itself in a session: a few lines from its summary."""

from __future__ import annotations

from typing import Any

from transient.result.scale import quantity
from transient.units import show


def heading(summary: dict[str, Any]) -> str:
    """Title and what became of the cases."""
    return f"Sweep {summary['title']!r}: {counted(summary)}"


def counted(summary: dict[str, Any]) -> str:
    """"100 cases: 98 solved, 2 refused"."""
    parts = [f"{count:,} {name}" for name, count in summary["status"].items() if count or name == "solved"]
    return f"{summary['cases']:,} case{'' if summary['cases'] == 1 else 's'}: {', '.join(parts)}"


def lines(summary: dict[str, Any]) -> list[str]:
    """What varies, and the reach of each headline number."""
    out = [f"{key}: {reach(one)}" for key, one in summary["varied"].items()]
    for name, one in summary["headlines"].items():
        out.append(f"{name}: {quantity(one['least'], one['unit'])} to {quantity(one['greatest'], one['unit'])}")
    return out


def reach(one: dict[str, Any]) -> str:
    """What a varied key takes: "0.4 mm to 1.2 mm (40 values)", "normal 25 mm, 0.05 mm", "2 choices"."""
    if "choices" in one:
        return f"{one['choices']} choices"
    for kind in ("normal", "uniform", "triangular"):
        if kind in one:
            shown = [show(value, one["dimension"]) for value in one[kind]]
            return f"normal, {shown[0]} ± {shown[1]}" if kind == "normal" else f"{kind}, {' to '.join(shown)}"
    if "least" in one and one["least"] == one["greatest"]:
        return value(one["least"], one)
    return f"{value(one['least'], one)} to {value(one['greatest'], one)} ({one['count']} values)"


def value(number: Any, one: dict[str, Any]) -> str:
    """One value of a varied key, in a unit that suits it."""
    if isinstance(number, str):
        return number
    if isinstance(number, dict):
        return str(number.get("kind", "a table"))
    return show(number, one["dimension"]) if one.get("dimension") else f"{number:g}"

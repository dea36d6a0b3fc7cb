"""Histories in a few words, as they were typed."""

from __future__ import annotations

from typing import Any

# Keys in the order of a sentence; others follow as typed.
_ORDER = (
    "from", "to", "amplitude", "mean", "over", "rise", "hold", "fall", "time_constant", "acceleration", "jerk",
    "frequency", "period", "phase", "at",
)  # fmt: skip
_NAMES = {"smooth_ramp": "smooth ramp", "s_curve": "jerk-limited change", "half_sine": "half sine"}
_QUIET = ("kind", "part", "parts", "every", "times", "values", "unit", "time_unit", "file", "interpolation")


def drive_words(history: Any) -> str:
    """A history of a case's tree in words, such as ``ramp (to 0.30 m/s, over 50 ms)``."""
    if not isinstance(history, dict):
        return f"{history} from t = 0 on"
    kind = str(history.get("kind", ""))
    if kind == "sum":
        parts = [drive_words(part) for part in history.get("parts", [])]
        return " plus ".join(parts) if len(parts) <= 3 else f"sum of {len(parts)} histories"
    if kind == "repeat":
        times = f", {history['times']} times" if "times" in history else ""
        return f"every {history.get('every')}{times}: {drive_words(history.get('part'))}"
    if kind == "table":
        rows = history.get("times")
        count = f" of {len(rows)} rows" if isinstance(rows, list) else ""
        return f"{'smooth ' if history.get('interpolation') == 'smooth' else ''}table{count}"
    keys = [key for key in _ORDER if key in history]
    keys += [key for key in history if key not in keys and key not in _QUIET]
    told = ", ".join(f"{key.replace('_', ' ')} {history[key]}" for key in keys)
    return f"{_NAMES.get(kind, kind)} ({told})" if told else _NAMES.get(kind, kind)


def shortened(text: str, most: int = 60) -> str:
    """``text`` cut at a word where it is longer than ``most``."""
    if len(text) <= most:
        return text
    return text[: most - 1].rsplit(" ", 1)[0].rstrip(",:(") + " …"

"""What a sweep says when it is finished, on one screen."""

from __future__ import annotations

from pathlib import Path
from typing import Any

from transient.cli.numbers import WIDTH, columns, entry, listed
from transient.result.scale import quantity
from transient.sweep.words import counted, reach, value

MOST_SHOWN = 6  # headline numbers on the screen; all are in the file and in --json
MOST_NAMED = 3  # influences of a number
LEAST_SHARE = 0.005
SHOWN_VERDICTS = {"caution": "with a caution", "outside": "outside the model", "failed": "failed a self-check"}


def describe(said: dict[str, Any], target: Path, effort: tuple[float, int] | None) -> str:
    """The closing words, about 24 lines of 80 columns."""
    shown = _shown(said["headlines"])
    blocks = [
        [said["title"], *_cases(said)],
        _spread(shown, said),
        _worst(shown, said),
        _influences(shown),
        entry("File", f"{target}{_effort(effort)}"),
    ]
    return "\n\n".join("\n".join(block) for block in blocks if block)


def _shown(headlines: dict[str, Any]) -> dict[str, Any]:
    """The numbers that vary, walls at rest with little stress last; at most MOST_SHOWN."""
    moving = {name: one for name, one in headlines.items() if one["greatest"] - one["least"] > 1e-9 * _size(one)}
    names = [name for name in moving if not name.startswith("final_")] or list(moving) or list(headlines)
    return {name: headlines[name] for name in names[:MOST_SHOWN]}


def _size(one: dict[str, Any]) -> float:
    return max(abs(one["least"]), abs(one["greatest"]))


def _name(name: str) -> str:
    return name.replace("unbounded_coefficient", "K").replace("_", " ")


def _cases(said: dict[str, Any]) -> list[str]:
    text = counted(said)
    marked = [f"{said['verdicts'][key]:,} {word}" for key, word in SHOWN_VERDICTS.items() if said["verdicts"][key]]
    if marked:
        text += f" ({listed(marked)})"
    out = entry("Cases", text)
    for one in [*said["messages"], *said["cautions"][:1]]:
        out += entry("", f"{one['cases']:,} such as case {one['first']}: {one['message']}")
    label = "Varied"
    for key, one in said["varied"].items():
        out += entry(label, f"{key}  {reach(one)}")
        label = ""
    if said["samples"]:
        out += entry("", f"{said['samples']:,} samples at each combination, seed {said['seed']}")
    return out


def _spread(shown: dict[str, Any], said: dict[str, Any]) -> list[str]:
    """Least to greatest; with samples also where 5, 50 and 95 of 100 cases stay below."""
    if not shown:
        return []
    scattered = said["samples"] is not None
    middle = ["5 %", "median", "95 %"] if scattered else ["median"]
    cells = [["Number", "least", *middle, "greatest", "error"]]
    for name, one in shown.items():
        inner = [one["percentiles"][q] for q in ("5", "50", "95")] if scattered else [one["median"]]
        numbers = [quantity(number, one["unit"]) for number in (one["least"], *inner, one["greatest"])]
        cells.append([_name(name), *numbers, "" if one["error"] is None else quantity(one["error"], one["unit"], 2)])
    lines = list(columns(cells, gap=2))
    return lines if max(map(len, lines)) <= WIDTH else list(columns(cells, gap=1))


def _worst(shown: dict[str, Any], said: dict[str, Any]) -> list[str]:
    """Of each number the case where it is largest, those with the same case together."""
    cases: dict[int, list[str]] = {}
    for name, one in shown.items():
        cases.setdefault(one["worst"]["case"], []).append(name)
    out = []
    for case, names in cases.items():
        worst = shown[names[0]]["worst"]
        inputs = ", ".join(f"{key} {value(v, said['varied'][key])}" for key, v in worst["inputs"].items())
        numbers = [f"{_name(name)} {quantity(shown[name]['worst']['value'], shown[name]['unit'])}" for name in names]
        out += entry("" if out else "Largest", f"{listed(numbers)} in case {case}: {inputs}")
    return out


def _influences(shown: dict[str, Any]) -> list[str]:
    """Which inputs matter for each number, the strongest first."""
    told: dict[str, list[str]] = {}
    for name, one in shown.items():
        found = [s for s in one["sensitivities"] if s["share"] >= LEAST_SHARE][:MOST_NAMED]
        if len(one["sensitivities"]) > 1 and found:
            ranked = ", ".join(f"{s['key']} {100 * s['share']:.0f} %{_direction(s['slope'])}" for s in found)
            told.setdefault(ranked, []).append(_name(name))
    out: list[str] = []
    for ranked, names in told.items():
        out += entry("" if out else "Matters", f"{listed(names)}: {ranked}")
    return out


def _direction(slope: float | None) -> str:
    if slope is None or abs(slope) < 0.1:
        return ""
    return " (+)" if slope > 0 else " (-)"


def _effort(effort: tuple[float, int] | None) -> str:
    if effort is None or effort[1] == 0:
        return ""
    seconds, solved = effort
    return f"   ({solved:,} cases in {quantity(seconds, 's', 3)}, {quantity(seconds / solved, 's', 3)} each)"

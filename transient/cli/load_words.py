"""A wall's load for people: what an analyst needs first, in ten seconds and 80 columns."""

from __future__ import annotations

import math
from pathlib import Path

import numpy as np

from transient.cli.numbers import LABEL, columns, entry, percent, stated
from transient.cli.summary import VERDICTS
from transient.loads.measures import Measures
from transient.loads.write import REVIEW
from transient.result.scale import quantity

MOST_CYCLES = 8
# Cycles and harmonics below this share of the largest one are not printed one by one.
FAINT = 1e-3
MOST_HARMONICS = 8
# Between a number and its unit, where no line may end; printed as a blank.
_BOUND = "\u00a0"


def describe(measures: Measures, path: Path) -> str:
    """The printed form, lines of at most 80 columns."""
    load = measures.load
    blocks = [
        [load.title or path.stem, f"{load.quantity} of the fluid on the {load.wall} wall, positive along +x"],
        [*_largest(measures), *_impulse(measures), *_table(measures)],
        _spectrum(measures),
        _cycles(measures),
        _harmonics(measures),
        [*_trust(measures), *entry("Review", " ".join([REVIEW[0], _factor_told(measures)]))],
    ]
    return "\n\n".join("\n".join(block) for block in blocks if block).replace(_BOUND, " ")


def _amount(measures: Measures, value: float, over_time: bool = False) -> str:
    text = quantity(value, measures.load.unit.replace("*", " "))
    return _bound(f"{text} s" if over_time else text)


def _seconds(value: float) -> str:
    return _bound(quantity(value, "s"))


def _bound(text: str) -> str:
    return text.replace(" ", _BOUND)


def _largest(measures: Measures) -> list[str]:
    load, factor = measures.load, measures.wanted.factor
    if load.peak is None:
        return _infinite(measures)
    value = _bound(stated(load.peak, load.peak_error, load.unit.replace("*", " ")))
    text = f"{value} at {_seconds(load.peak_time)}"
    if factor is None:
        return entry("Largest", text)
    factored = f"{_amount(measures, factor * load.peak)}   (factored)"
    return [*entry("Largest", f"{text}   (unfactored)"), *entry(f"x {factor:g}", factored)]


def _infinite(measures: Measures) -> list[str]:
    """The law of each infinite instant, and what the table does about it."""
    lines: list[str] = []
    load, table = measures.load, measures.table
    for instant in load.history.infinite[:3]:
        unit = load.unit.replace("*", " ")
        power = "sqrt(t)" if instant.exponent == 0.5 else f"t^{instant.exponent:.3g}"
        text = (
            f"infinite at {_seconds(instant.time)}, then {instant.coefficient:.4g} {unit} / {power}, t in s "
            "since: it has no largest value, whatever the step"
        )
        lines += entry("Largest" if not lines else "", text)
    more = len(load.history.infinite) - 3
    if more > 0:
        lines += entry("", f"and at {more} further instants")
    row = table.averaged[0]
    text = f"there the table's row carries {_amount(measures, float(table.value[row]))}, which keeps the impulse"
    return lines + entry("", f"{text}; a finer step makes it larger")


def _impulse(measures: Measures) -> list[str]:
    load, table, factor = measures.load, measures.table, measures.wanted.factor
    whole = load.history.impulse
    text = _amount(measures, whole, over_time=True)
    if factor is not None:
        text += f" unfactored, {_amount(measures, factor * whole, over_time=True)} factored"
    apart = _amount(measures, table.impulse_error, over_time=True)
    share = f" ({percent(abs(table.impulse_error / whole))})" if whole else ""
    text += f"; the table's differs by {apart}{share}"
    if abs(table.outside) > 0.1 * abs(table.impulse_error):
        ends = _amount(measures, -table.outside, over_time=True)
        text += f", of which {ends} lies before its first or after its last row"
    return entry("Impulse", text)


def _table(measures: Measures) -> list[str]:
    load, table = measures.load, measures.table
    rows = "1 row" if len(table.time) == 1 else f"{len(table.time)} rows"
    text = f"{rows} every {_seconds(table.step)}"
    aim = "the infinite instant" if load.peak is None else "the largest load"
    if table.shift > 0.0:
        text += f", the first {_seconds(table.shift)} after the start so that {aim} is a row"
    size = float(np.abs(load.history.value).max())
    share = f" ({percent(table.departure / size)} of the largest)" if load.peak and size else ""
    if table.departure > 0.0:
        text += f"; between rows the history departs from it by up to {_amount(measures, table.departure)}{share}"
    return [*entry("Table", text), *entry("Extrema", _extrema(measures))]


def _extrema(measures: Measures) -> str:
    values = [value for _, value, _ in measures.extrema if value is not None]
    count = sum(kind in ("maximum", "minimum", "infinite") for *_, kind in measures.extrema)
    turns = "1 turn" if count == 1 else f"{count} turns"
    low, high = _amount(measures, min(values, default=0.0)), _amount(measures, max(values, default=0.0))
    finite = "what is finite lies" if measures.load.peak is None else "all"
    return f"{turns} of the load between start and end; {finite} between {low} and {high}"


def _spectrum(measures: Measures) -> list[str]:
    found = measures.spectrum
    if found is None:
        return []
    low, high = _hertz(found.frequency[0]), _hertz(found.frequency[-1])
    band = f"natural frequencies from {low} to {high}" if low != high else f"natural frequency {low}"
    band += f", damping ratio {found.damping:g}"
    if found.factor is None:
        why = "the load is infinite at an instant" if measures.load.peak is None else "there is no load"
        return entry("Response", f"no dynamic load factor, since {why} ({band})")
    top = int(np.argmax(found.factor))
    text = f"dynamic load factor at most {found.factor[top]:.4g}, at {_hertz(found.frequency[top])}"
    if low != high:
        text += f"; {found.factor[0]:.4g} at {low}, {found.factor[-1]:.4g} at {high}"
    return entry("Response", f"{text} ({band})")


def _hertz(value: float) -> str:
    value = float(f"{value:.4g}")
    return _bound(f"{value / 1e3:.4g} kHz" if value >= 1e3 else f"{value:.4g} Hz")


def _cycles(measures: Measures) -> list[str]:
    repeat, found = measures.wanted.repeat, measures.cycles
    if repeat is None:
        return []
    runs = "one run" if repeat == 1 else f"{repeat} runs end to end"
    if found is None:
        return entry("Cycles", "not counted, since the load is infinite at an instant and the range is without bound")
    head = entry("Cycles", f"rainflow count (ASTM E1049) of {runs}, unfactored, largest first")
    rows = [["", "range", "mean", "count"]]
    shown = [cycle for cycle in found if cycle[0] > FAINT * found[0][0]][:MOST_CYCLES]
    rows += [["", _amount(measures, extent), _amount(measures, mean), f"{count:g}"] for extent, mean, count in shown]
    rows[0][0] = " " * (LABEL - 3)
    lines = [*head, *columns(rows)]
    rest = sum(count for *_, count in found[len(shown) :])
    if rest:
        lines += entry("", f"and {rest:g} smaller ones")
    return lines if found else entry("Cycles", f"none in {runs}: the load does not turn")


def _harmonics(measures: Measures) -> list[str]:
    found = measures.harmonics
    if found is None:
        return []
    text = f"over the last period, {_seconds(found.period)}: mean {_amount(measures, found.mean)} + sum of "
    lines = entry("Harmonics", text + "amplitude sin(2 pi f t + phase), unfactored")
    rows = [[" " * (LABEL - 3), "f", "amplitude", "phase"]]
    clear = np.flatnonzero(found.amplitude > FAINT * found.amplitude.max(initial=0.0))[:MOST_HARMONICS]
    for i in clear:
        degrees = math.degrees(found.phase[i])
        rows.append(["", _hertz(found.frequency[i]), _amount(measures, found.amplitude[i]), f"{degrees:.1f} deg"])
    return [*lines, *columns(rows)]


def _trust(measures: Measures) -> list[str]:
    verdict = measures.load.verdict
    return [] if verdict is None else entry("Trust", f"the run's own verdict: {VERDICTS.get(verdict, verdict)}")


def _factor_told(measures: Measures) -> str:
    factor = measures.wanted.factor
    if factor is None:
        return "No safety factor is included."
    return f"The factor {factor:g} was asked for; every other number is unfactored."

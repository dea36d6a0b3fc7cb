"""Load tables as text: CSV with header and units, and two plain columns; read alike under every system language."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from pathlib import Path

import numpy as np

from transient.loads.measures import Measures
from transient.result.whole import whole

REVIEW = (
    "Loads for a structural check need review under the local codes by a licensed practitioner.",
    "No safety factor is included unless stated.",
)


def write_files(measures: Measures, source: str, csv: Path | None, plain: Path | None) -> list[Path]:
    """Writes the load table to ``csv``, with the extrema (and spectrum, cycles, harmonics where wanted) beside it,
    and to ``plain`` in two columns; the paths written, in order.

    Each file appears whole or not at all.  Raises ResultError where one cannot be written.
    """
    written: list[Path] = []
    if csv is not None:
        written += [csv, *companions(measures, csv)]
        _write(csv, _table_csv(measures, source))
        for path, name in companions(measures, csv).items():
            _write(path, _COMPANIONS[name](measures, source))
    if plain is not None:
        _write(plain, _table_plain(measures, source))
        written.append(plain)
    return written


def companions(measures: Measures, csv: Path) -> dict[Path, str]:
    """The files that go with the table ``csv``, and what each holds."""
    names = {
        "extrema": True,
        "spectrum": measures.spectrum is not None and measures.spectrum.factor is not None,
        "cycles": measures.cycles is not None,
        "harmonics": measures.harmonics is not None,
    }
    return {csv.with_name(f"{csv.stem}_{name}{csv.suffix or '.csv'}"): name for name, there in names.items() if there}


def _write(path: Path, lines: Iterable[str]) -> None:
    with whole(path) as draft, open(draft, "w", encoding="utf-8", newline="") as file:
        file.write("\n".join(lines) + "\n")


def _table_csv(measures: Measures, source: str) -> list[str]:
    """Comments, header, rows; with a factor a third column, factored."""
    value = measures.table.value
    columns = [measures.table.time, *_both(measures, value)]
    rows = zip(*(column.tolist() for column in columns), strict=True)
    return [*_comments(measures, source), _header(measures), *(",".join(map(repr, row)) for row in rows)]


def _table_plain(measures: Measures, source: str) -> list[str]:
    """Comments, then time and unfactored load, parted by a blank."""
    factor = measures.wanted.factor
    told = "unfactored" if factor is None else f"unfactored; multiply by {factor!r} for the factored load"
    head = f"# time [s] and {_title(measures)}, {told}"
    rows = zip(measures.table.time.tolist(), measures.table.value.tolist(), strict=True)
    return [*_comments(measures, source), head, *(f"{time!r} {value!r}" for time, value in rows)]


def _extrema_csv(measures: Measures, source: str) -> list[str]:
    comments = [f"# extrema of the {_what(measures)}", f"# from {_one_line(source)}"]
    rows = []
    for time, value, kind in measures.extrema:
        numbers = [""] * len(_factors(measures)) if value is None else [repr(f * value) for f in _factors(measures)]
        rows.append(",".join([repr(time), *numbers, kind]))
    return [*comments, f"{_header(measures)},kind", *rows]


def _spectrum_csv(measures: Measures, source: str) -> list[str]:
    spectrum = measures.spectrum
    assert spectrum is not None
    assert spectrum.factor is not None
    comments = [
        f"# dynamic load factor of the {_what(measures)}, damping ratio {spectrum.damping!r}",
        f"# from {_one_line(source)}",
    ]
    rows = zip(spectrum.frequency.tolist(), spectrum.factor.tolist(), strict=True)
    return [*comments, "frequency [Hz],dynamic load factor [1]", *(f"{f!r},{d!r}" for f, d in rows)]


def _cycles_csv(measures: Measures, source: str) -> list[str]:
    unit = measures.load.unit
    comments = [
        f"# rainflow count (ASTM E1049) of the {_what(measures)}, unfactored, run {measures.wanted.repeat} times",
        f"# from {_one_line(source)}",
    ]
    rows = [",".join(map(repr, map(float, cycle))) for cycle in measures.cycles or []]
    return [*comments, f"range [{unit}],mean [{unit}],count [1]", *rows]


def _harmonics_csv(measures: Measures, source: str) -> list[str]:
    found, unit = measures.harmonics, measures.load.unit
    assert found is not None
    comments = [
        f"# harmonics of the {_what(measures)}, unfactored: mean {found.mean!r} {unit} + sum of "
        "amplitude sin(2 pi frequency t + phase)",
        f"# from {_one_line(source)}",
    ]
    rows = zip(found.frequency.tolist(), found.amplitude.tolist(), found.phase.tolist(), strict=True)
    return [*comments, f"frequency [Hz],amplitude [{unit}],phase [rad]", *(",".join(map(repr, row)) for row in rows)]


_COMPANIONS = {
    "extrema": _extrema_csv,
    "spectrum": _spectrum_csv,
    "cycles": _cycles_csv,
    "harmonics": _harmonics_csv,
}


def _comments(measures: Measures, source: str) -> list[str]:
    """What a reader of the table alone must know, each line behind ``#``."""
    load, table = measures.load, measures.table
    unit = load.unit
    said = [
        load.title,
        f"from {source}",
        f"{_what(measures)}, by the fluid, positive along +x (the direction of positive rotation)",
        f"every {table.step!r} s; the first row lies {table.shift!r} s after the start of the run, so that the time "
        f"{load.peak_time!r} s of the {'infinite' if load.peak is None else 'largest'} load is a row",
    ]
    if load.peak is None:
        for instant in load.history.infinite:
            said.append(
                f"infinite at {instant.time!r} s, then {instant.coefficient!r} {unit} / (time in s since)^"
                f"{instant.exponent!r}"
            )
        for row in table.averaged:
            said.append(
                f"the row at {float(table.time[row])!r} s carries {float(table.value[row])!r} {unit}, which keeps the "
                "impulse; it depends on the step and is no largest load"
            )
    else:
        error = "" if load.peak_error is None else f", error of the run at most {load.peak_error!r} {unit}"
        said.append(f"largest {load.peak!r} {unit} at {load.peak_time!r} s{error}")
    said.append(
        f"impulse of the history {load.history.impulse!r} {load.impulse_unit}, of straight lines between these rows "
        f"{table.impulse!r} {load.impulse_unit}"
    )
    said.append(f"between the rows the history departs from straight lines by up to {table.departure!r} {unit}")
    if load.verdict is not None:
        said.append(f"verdict of the run on itself: {load.verdict}")
    said += REVIEW
    return [f"# {_one_line(text)}" for text in said if text]


def _header(measures: Measures) -> str:
    titles = [_title(measures)]
    if measures.wanted.factor is not None:
        load = measures.load
        titles.append(f"{load.variable} {load.wall} x {measures.wanted.factor!r} [{load.unit}]")
    return ",".join(["time [s]", *titles])


def _title(measures: Measures) -> str:
    return f"{measures.load.variable} {measures.load.wall} [{measures.load.unit}]"


def _what(measures: Measures) -> str:
    return f"{measures.load.quantity} on the {measures.load.wall} wall [{measures.load.unit}]"


def _factors(measures: Measures) -> Sequence[float]:
    return (1.0,) if measures.wanted.factor is None else (1.0, measures.wanted.factor)


def _both(measures: Measures, value: np.ndarray) -> list[np.ndarray]:
    """``value`` (m,) unfactored and, where a factor was asked for, factored."""
    return [factor * value for factor in _factors(measures)]


def _one_line(text: str) -> str:
    return " ".join(text.split())

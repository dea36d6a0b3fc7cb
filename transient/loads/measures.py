"""All that was asked about a wall's load, computed together, and its form as JSON."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

from transient.loads.cycles import cycles
from transient.loads.extrema import extrema
from transient.loads.harmonics import Harmonics, harmonics_of
from transient.loads.load import Load
from transient.loads.spectrum import Spectrum, frequencies, spectrum_of
from transient.loads.table import LoadTable, table_of


@dataclass(frozen=True)
class Wanted:
    """What to compute: ``step`` s of the table; ``factor`` on the load, or None; ``band`` (low, high) Hz of the
    spectrum with its ``damping`` ratio, or None; ``repeat`` of the duty cycle counted, or None; ``harmonics``.
    """

    step: float
    factor: float | None = None
    band: tuple[float, float] | None = None
    damping: float = 0.0
    repeat: int | None = None
    harmonics: bool = False


@dataclass(frozen=True, eq=False)
class Measures:
    """A load with its table and extrema, and what else was wanted; ``cycles`` None where the load is infinite."""

    load: Load
    wanted: Wanted
    table: LoadTable
    extrema: list[tuple[float, float | None, str]]
    spectrum: Spectrum | None
    cycles: list[tuple[float, float, float]] | None
    harmonics: Harmonics | None


def measure(load: Load, wanted: Wanted) -> Measures:
    """Raises ResultError for a table of too many rows and for harmonics that do not exist."""
    spectrum = counted = harmonics = None
    if wanted.band is not None:
        spectrum = spectrum_of(load, frequencies(*wanted.band), wanted.damping)
    if wanted.repeat is not None and load.peak is not None:
        counted = cycles(load.history.value, wanted.repeat)
    if wanted.harmonics:
        harmonics = harmonics_of(load)
    return Measures(
        load, wanted, table_of(load, wanted.step), extrema(load.history), spectrum, counted, harmonics
    )


def as_json(measures: Measures) -> dict[str, Any]:
    """SI numbers under the contract's names and some more; unfactored but for what stands under "factored"."""
    load, wanted, table = measures.load, measures.wanted, measures.table
    out: dict[str, Any] = {
        "title": load.title,
        "wall": load.wall,
        "quantity": load.quantity,
        "unit": load.unit,
        "verdict": load.verdict,
        "peak": load.peak,
        "peak_error": load.peak_error,
        "peak_time": load.peak_time,
        "unbounded": load.peak is None,
        "before": load.before,
        "impulse": load.history.impulse,
        "impulse_error": table.impulse_error,
        "impulse_outside": table.outside,
        "rows": len(table.time),
        "step": table.step,
        "shift": table.shift,
        "largest_departure": table.departure,
        "averaged_rows": list(table.averaged),
        "extrema": [list(entry) for entry in measures.extrema],
        "factor": wanted.factor,
        "factored": _factored(load, wanted.factor),
    }
    if load.peak is None:
        instants = load.history.infinite
        out["infinite"] = [
            {"time": one.time, "coefficient": one.coefficient, "exponent": one.exponent} for one in instants
        ]
    return out | _asked(measures)


def _factored(load: Load, factor: float | None) -> dict[str, float | None] | None:
    if factor is None:
        return None
    return {"peak": None if load.peak is None else factor * load.peak, "impulse": factor * load.history.impulse}


def _asked(measures: Measures) -> dict[str, Any]:
    """The parts that are there only where they were asked for."""
    out: dict[str, Any] = {}
    spectrum, harmonics = measures.spectrum, measures.harmonics
    if spectrum is not None:
        factor = [None] * len(spectrum.frequency) if spectrum.factor is None else spectrum.factor.tolist()
        out["spectrum"] = {
            "frequency": spectrum.frequency.tolist(), "factor": factor, "damping_ratio": spectrum.damping,
        }  # fmt: skip
    if measures.wanted.repeat is not None:
        out["repeat"] = measures.wanted.repeat
        out["cycles"] = None if measures.cycles is None else [list(cycle) for cycle in measures.cycles]
    if harmonics is not None:
        out["harmonics"] = {
            "period": harmonics.period,
            "mean": harmonics.mean,
            "frequency": harmonics.frequency.tolist(),
            "amplitude": harmonics.amplitude.tolist(),
            "phase": harmonics.phase.tolist(),
        }
    return out

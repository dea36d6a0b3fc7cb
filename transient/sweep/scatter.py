"""[scatter]: random samples of toleranced keys, the same on every machine and for any number of workers."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import cached_property
from typing import Any

import numpy as np

from transient.sweep.facts import Facts
from transient.sweep.keys import Varied
from transient.sweep.stated import DRAWN, Stated, table_of
from transient.units import DIMENSIONS, QuantityError, quantity, si_unit, typed

EXAMPLE = '{ normal = ["25 mm", "0.05 mm"] }'
POINTS = ("sobol", "random")
MOST_SAMPLES = 10**9
# A Sobol point may be 0 exactly, where a normal distribution has no value.
SMALLEST = 2.0**-53
_STEP, _MIX = np.uint64(0x9E3779B97F4A7C15), (np.uint64(0xBF58476D1CE4E5B9), np.uint64(0x94D049BB133111EB))


def _normal(u: np.ndarray, mean: float, deviation: float) -> np.ndarray:
    """Inverse of the normal distribution function."""
    from scipy.special import ndtri

    return mean + deviation * ndtri(u)


def _uniform(u: np.ndarray, low: float, high: float) -> np.ndarray:
    return low + (high - low) * u


def _triangular(u: np.ndarray, low: float, mode: float, high: float) -> np.ndarray:
    """Inverse of the triangular distribution function."""
    turn = (mode - low) / (high - low)
    rising = low + np.sqrt(u * (high - low) * (mode - low))
    return np.where(u < turn, rising, high - np.sqrt((1.0 - u) * (high - low) * (high - mode)))


@dataclass(frozen=True)
class Distribution:
    """``inverse(u, *parameters)`` maps (0, 1) to values; ``names`` of its parameters, as said to a user."""

    inverse: Callable[..., np.ndarray]
    names: tuple[str, ...]


DISTRIBUTIONS = {
    "normal": Distribution(_normal, ("mean", "standard deviation")),
    "uniform": Distribution(_uniform, ("least", "greatest")),
    "triangular": Distribution(_triangular, ("least", "most likely", "greatest")),
}


@dataclass(frozen=True)
class Tolerance:
    """How one key scatters, as typed: the ``kind`` of distribution and its parameters."""

    kind: str
    stated: tuple[Any, ...]

    @property
    def candidates(self) -> tuple[Any, ...]:
        """Values as typed, from which the case tells what kind of key it is: never the standard deviation."""
        return self.stated[:1] if self.kind == "normal" else self.stated


@dataclass(frozen=True, eq=False)
class Scatter:
    """``samples`` points in ``points`` ("sobol", "random"), from ``seed``; ``drawn`` (kind, SI parameters) per key."""

    samples: int
    seed: int
    points: str
    keys: tuple[Varied, ...]
    drawn: tuple[tuple[str, tuple[float, ...]], ...]

    @cached_property
    def _sobol(self) -> np.ndarray:
        """Scrambled Sobol points (samples, keys) of the unit cube."""
        from scipy.stats import qmc

        # Whole powers of two keep the sequence balanced; what is not asked for is left out.
        exponent = max(self.samples - 1, 0).bit_length()
        points = qmc.Sobol(len(self.keys), scramble=True, rng=np.random.default_rng(self.seed))
        return points.random_base2(exponent)[: self.samples]

    def values(self, rows: np.ndarray) -> tuple[np.ndarray, ...]:
        """The samples of each key in the given rows (n,) of the sweep, in SI: of these and the seed alone.

        Each combination of [vary] has the Sobol points turned round by a shift of its own (Cranley & Patterson 1976):
        what scatters is then as much spread over the combinations as within each.
        """
        combination, sample = np.divmod(rows, self.samples)
        out = []
        for i, (kind, parameters) in enumerate(self.drawn):
            if self.points == "random":
                unit = _hashed(rows, self.seed, i)
            else:
                shift = np.where(combination > 0, _hashed(combination, self.seed, i), 0.0)
                unit = np.mod(self._sobol[sample, i] + shift, 1.0)
            out.append(DISTRIBUTIONS[kind].inverse(np.clip(unit, SMALLEST, 1.0 - SMALLEST), *parameters))
        return tuple(out)


def _hashed(numbers: np.ndarray, seed: int, stream: int) -> np.ndarray:
    """Random numbers in [0, 1) that belong to whole ``numbers`` (n,), independent between streams.

    SplitMix64 (Steele, Lea & Flood 2014; constants from memory), whose n-th number needs none of those before.
    """
    start = _mixed(_mixed(np.array([seed], np.uint64) + _STEP) + np.array([stream + 1], np.uint64) * _STEP)
    return (_mixed(start + (numbers.astype(np.uint64) + np.uint64(1)) * _STEP) >> np.uint64(11)) * 2.0**-53


def _mixed(z: np.ndarray) -> np.ndarray:
    z = (z ^ (z >> np.uint64(30))) * _MIX[0]
    z = (z ^ (z >> np.uint64(27))) * _MIX[1]
    return z ^ (z >> np.uint64(31))


def read_tolerance(stated: Stated, key: str, spec: Any) -> Tolerance:
    """How a key scatters, from its specification; raises ``CaseError``."""
    table = table_of(stated, key, spec, DRAWN, EXAMPLE)
    kind, given = next(iter(table.items()))
    if len(table) > 1:
        raise stated.refuse(key, f"has {' and '.join(table)}; one of them is needed")
    names = DISTRIBUTIONS[kind].names
    if not isinstance(given, list | tuple) or len(given) != len(names):
        need = f"[{', '.join(names)}] is needed, such as {EXAMPLE}"
        raise stated.refuse(key, f"{typed(given)} does not fit; {need}", kind)
    return Tolerance(kind, tuple(given))


def read_settings(stated: Stated) -> tuple[int, int, str]:
    """(samples, seed, points); raises ``CaseError``."""
    source, given = stated.source, stated.settings
    samples, seed, points = given.get("samples", 0), given.get("seed", 0), given.get("points", "sobol")
    for name, value, least in (("samples", samples, 1), ("seed", seed, 0)):
        if isinstance(value, bool) or not isinstance(value, int) or not least <= value <= MOST_SAMPLES:
            need = f"a whole number from {least} is needed, such as {name} = {500 if name == 'samples' else 7}"
            if name not in given:
                raise source.refuse(("scatter",), f"{name} is missing; {need}")
            raise source.fault(("scatter", name), value, "does not fit", need)
    if points not in POINTS:
        raise source.fault(("scatter", "points"), points, "is not known here", '"sobol" or "random" is needed')
    return samples, seed, points


def scatter(stated: Stated, given: dict[str, Tolerance], facts: dict[str, Facts]) -> Scatter | None:
    """The samples of all toleranced keys, None where there are none; raises ``CaseError``."""
    if not given:
        if stated.settings:
            need = f'one is needed, such as "gap.width" = {EXAMPLE}'
            raise stated.source.refuse(("scatter",), f"names no key that scatters; {need}")
        return None
    samples, seed, points = read_settings(stated)
    keys, drawn = [], []
    for key, tolerance in given.items():
        dimension = facts[key].dimension
        if facts[key].kind != "quantity":
            raise stated.refuse(key, "is no quantity that could scatter; list its values in [vary]")
        keys.append(Varied(key, "quantity", dimension, si_unit(dimension)))
        drawn.append((tolerance.kind, _parameters(stated, key, tolerance, dimension)))
    return Scatter(samples, seed, points, tuple(keys), tuple(drawn))


def _parameters(stated: Stated, key: str, tolerance: Tolerance, dimension: str) -> tuple[float, ...]:
    out = []
    for i, (name, value) in enumerate(zip(DISTRIBUTIONS[tolerance.kind].names, tolerance.stated, strict=True)):
        own = dimension
        if name == "standard deviation" and f"{dimension}_difference" in DIMENSIONS:
            own = f"{dimension}_difference"
        try:
            out.append(quantity(value, own))
        except QuantityError as error:
            raise stated.refuse(key, f"{name}: {error}", tolerance.kind, i) from None
    if tolerance.kind == "normal" and out[1] <= 0.0:
        fault = f"{typed(tolerance.stated[1])} is no standard deviation; one above zero is needed"
        raise stated.refuse(key, fault, "normal")
    if tolerance.kind != "normal" and not (out == sorted(out) and out[0] < out[-1]):
        order = ", ".join(DISTRIBUTIONS[tolerance.kind].names)
        raise stated.refuse(key, f"its values do not rise; [{order}] is needed", tolerance.kind)
    return tuple(out)

"""What the drive ends in, how long a run of its own accord should last, and the flow's way there."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from transient.drive.pieces import Drive, common_period
from transient.gap.problem import PRESSURE, Inputs, Problem, join
from transient.gap.system import System, assemble
from transient.march.coupled import dense, settled_slopes, slowest

SAME = 1e-11  # of the terms: changes below this are round-off
COARSE_CELLS = 24  # enough for the slowest decay rate to a percent


@dataclass(frozen=True, eq=False)
class Outlook:
    """What to expect of a problem.

    ``kind`` "steady", "periodic" or "none"; ``drives`` the eventual ones, continued back to t = 0 (None with "none");
    ``period`` s or None; ``since`` s: the drives equal them from then on (inf where only approached);
    ``last_break`` s of those that end in a constant; ``slowest`` s, time constant of the approach to the regime
    (of fluid and drive together); ``until`` s, the run's end.
    """

    kind: str
    drives: tuple[Drive, Drive, Drive] | None
    period: float | None
    since: float
    last_break: float
    slowest: float
    until: float


def outlook(problem: Problem) -> Outlook:
    """Look ahead; raises ``ValueError`` where the duration is "auto" and the drive ends in no regime."""
    ends = [drive.eventual for drive in problem.drives]
    fluid = slowest_decay(problem)
    repeats = any(end.period is not None for end in ends)
    if repeats and not problem.linear:
        # the periodic end of such a case is not worked out: it is run as given, and settling is not said
        return _endless(problem, fluid)
    if any(end.drive is None for end in ends):
        return _endless(problem, fluid)
    period, common = common_period([end.period for end in ends])
    if not common:
        return _endless(problem, fluid)
    since = max(end.since for end in ends)
    last, lag = 0.0, 0.0
    for drive in problem.drives:
        found = last_features(drive)
        last, lag = max(last, found[0]), max(lag, found[1])
    held = np.isfinite(fluid)
    slowest = max(fluid, lag) if held else max(problem.diffusion_time, lag)
    total = (fluid if held else problem.diffusion_time) + lag
    kind = ("steady" if period is None else "periodic") if held else "none"
    least = 0.1 * min(problem.settle_within, problem.accuracy, 0.01)
    margin = np.log(4.0 / least) * total
    if problem.duration is not None:
        until = problem.duration
    elif period is None:
        until = last + max(margin, 0.1 * last)
    else:
        start = last if np.isinf(since) else since
        until = start + period * max(3.0, np.ceil(margin / period) + 2.0)
    drives = tuple(end.drive for end in ends)
    return Outlook(kind, drives if held else None, period, since, last, slowest, until)


def _endless(problem: Problem, fluid: float) -> Outlook:
    if problem.duration is None:
        raise ValueError("the drive ends in neither a steady nor a periodic state: a duration is needed")
    slowest = fluid if np.isfinite(fluid) else problem.diffusion_time
    return Outlook("none", None, None, np.inf, 0.0, slowest, problem.duration)


def last_features(drive: Drive) -> tuple[float, float]:
    """(time of the last break of what does not repeat for ever, slowest time constant after it), s."""
    last, lag = 0.0, 0.0
    for track in drive.tracks:
        if np.isfinite(track.every):
            if np.isfinite(track.times):
                last = max(last, track.every * track.times)
            continue
        pieces = track.pieces
        last = max(last, float(pieces.starts[-1]))
        decays = -pieces.rate[-1].real[(np.abs(pieces.coeff[-1]) > 0) & (pieces.rate[-1].real < 0)]
        if len(decays):
            lag = max(lag, float(1.0 / decays.min()))
    return last, lag


def slowest_decay(problem: Problem) -> float:
    """Time constant of the fluid's slowest mode, s; infinite where no wall holds it."""
    curved = problem.metric > 0 and problem.walls[0].kind != "axis"
    layers = (min(1.0, 0.5 * problem.inner / problem.gap), 1.0) if curved else (1.0, 1.0)
    system = assemble(problem, COARSE_CELLS, layers)
    if problem.closed:
        return slowest(dense(problem, system, settled_slopes(problem, system)))
    diagonal, off = symmetric(system)
    rates = np.linalg.eigvalsh(np.diag(diagonal) + np.diag(off, 1) + np.diag(off, -1))
    return float(1.0 / rates[0]) if rates[0] > 1e-9 * rates[-1] else np.inf


def symmetric(system: System) -> tuple[np.ndarray, np.ndarray]:
    """Diagonal (n,) and off-diagonal (n-1,) of the discrete gap's decay operator, scaled by sqrt(storage), 1/s."""
    below = np.concatenate([system.end_conductance[:1], system.conductance])
    above = np.concatenate([system.conductance, system.end_conductance[1:]])
    root = np.sqrt(system.storage)
    return (below + above) / system.storage, -system.conductance / (root[1:] * root[:-1])


def periodic_inputs(ahead: Outlook) -> Inputs:
    """One period of the eventual drives; before it they had the values at its end."""
    assert ahead.drives is not None
    assert ahead.period is not None
    once = join(ahead.drives, ahead.period, still=False)
    last = np.array([len(once.starts) - 1]), np.array([ahead.period - once.starts[-1]])
    before = np.array([float(once.row(i).at(*last)[0]) for i in range(3)])
    return Inputs(once.starts, once.poly, once.coeff, once.rate, before)


def deviation_breaks(actual: Inputs, once: Inputs, period: float) -> np.ndarray:
    """(3, 4) changes at t = 0 of the deviation's value, slope, bend and twist: ``actual`` inputs, held until then, less
    the periodic ones (``once``), which have been going on.  What the two have in common does not change."""
    begin = np.zeros(1, int), np.zeros(1)
    last = np.array([len(once.starts) - 1]), np.array([period - once.starts[-1]])
    out = np.zeros((3, 4))
    for i in range(3):
        for order in range(4):
            now, regime, gone = (
                float(of.row(i).at(*when, order)[0]) for of, when in ((actual, begin), (once, begin), (once, last))
            )
            was = float(actual.before[i]) if order == 0 else 0.0
            change = (now - was) - (regime - gone)
            size = max(float(of.row(i).size(order).max()) for of in (actual, once))
            out[i, order] = change if abs(change) > SAME * size else 0.0
    return out


def deviation_inputs(problem: Problem, ahead: Outlook, until: float) -> Inputs:
    """The drives minus what they end in, over [0, until)."""
    assert ahead.drives is not None
    away = tuple(drive.minus(end) for drive, end in zip(problem.drives, ahead.drives, strict=True))
    return at_once(join(away, until, still=False))


def at_once(inputs: Inputs) -> Inputs:
    """The same inputs as if they had had their first values before t = 0: no jump there."""
    zero = np.zeros(1, int), np.zeros(1)
    before = np.array([float(inputs.row(i).at(*zero)[0]) for i in range(3)])
    return Inputs(inputs.starts, inputs.poly, inputs.coeff, inputs.rate, before)


def rates_of(system: System, velocity: np.ndarray, inputs: Inputs) -> np.ndarray:
    """dw/dt (n,) of given velocities under the inputs' values before t = 0."""
    low, high, push = inputs.before[0], inputs.before[1], inputs.before[PRESSURE]
    across = np.concatenate([[low], velocity, [high]])
    conductance = np.concatenate([system.end_conductance[:1], system.conductance, system.end_conductance[1:]])
    flux = conductance * np.diff(across)
    return (np.diff(flux) + system.volume * push) / system.storage


def periodic_state(system: System, after_one: np.ndarray, period: float) -> np.ndarray:
    """Velocities (n,) at t = 0 of the periodic state, from those that one period makes out of rest.

    u = (1 - exp(-A period))^-1 u_1, in the discrete gap's own modes.
    """
    from scipy.linalg import eigh_tridiagonal  # only periodic drives need it, and its import takes a while

    rates, modes = eigh_tridiagonal(*symmetric(system))
    root = np.sqrt(system.storage)
    amplitude = modes.T @ (root * after_one)
    return (modes @ (amplitude / -np.expm1(-rates * period))) / root

"""Numerical error and input uncertainty, apart: what the solver adds, and what nobody can solve away."""

from __future__ import annotations

from transient.result.result import Result
from transient.result.said import percent
from transient.sheet.document.blocks import Block, Table, Words
from transient.sheet.document.facts import Facts, brief, said, share

KINDS = {"exact": "exact series", "estimate": "refinement"}


def numerical(facts: Facts) -> tuple[Block, ...]:
    """Stated errors as shares of their values, beside the accuracy asked for."""
    rows = tuple(_rows(facts))
    asked = (facts.summary.get("accuracy") or {}).get("asked")
    words = "Bounds of the difference to the exact solution of the stated equations"
    words += f"; {percent(asked)} was asked for." if asked else "."
    words += " A final stress is judged against at least a hundredth of its wall's peak."
    if not rows:
        return (Words("This result states no errors."),)
    head = ("number", "value ± error", "share of it", "judged by")
    return Words(words), Table(head, rows, numbers=(1, 2), wide=3)


def _rows(facts: Facts) -> list[tuple[str, str, str, str]]:
    settling = facts.summary.get("settling") or {}
    found = [("settling time", settling.get("time"), settling.get("error"), "s", settling.get("error_kind"))]
    for name, wall in facts.walls.items():
        kind = wall.get("error_kind")
        found.append((f"peak stress, {name}", wall.get("peak_stress"), wall.get("peak_stress_error"), "Pa", kind))
        if not facts.periodic:
            final = wall.get("final_stress")
            found.append((f"final stress, {name}", final, wall.get("final_stress_error"), "Pa", kind))
    flow = facts.summary.get("flow") or {}
    mean = flow.get("peak_mean_velocity")
    found.append(
        ("largest mean velocity", mean, flow.get("peak_mean_velocity_error"), "m/s", flow.get("error_kind"))
    )
    for name, body in (facts.summary.get("bodies") or {}).items():
        speed, error = body.get("peak_speed"), body.get("peak_speed_error")
        found.append((f"peak speed, {name}", speed, error, facts.speed_unit, body.get("error_kind")))
    return [
        (what, said(value, error, unit), share(error / abs(value)) if value else "–", KINDS.get(str(kind), ""))
        for what, value, error, unit, kind in found
        if value is not None and error is not None
    ]


def inputs_uncertain(facts: Facts) -> tuple[Block, ...]:
    """What uncertain inputs do, apart from the solver's error: by a sweep over the tolerances where there is one, else
    between which limits each number moves."""
    if facts.sweep is not None:
        return _by_sweep(facts, facts.sweep)
    if facts.case is None:
        return (Words("Not stated: this version does not read the case."),)
    words = (
        "Not part of ±. The case states no tolerances, and what they do comes on top, usually far above the numerical "
        "error. For orientation, what one per cent more of an input does, between the limits of a sudden and of a slow "
        "drive (similarity of the equation, worked out for this sheet; no source). The true figure of this very case "
        "comes from solving it again with the input changed, or over a whole tolerance by a sweep with [scatter]."
    )
    return Words(words), Table(("1 % more", "settling time", "wall stress"), tuple(_sensitivities(facts)), wide=-1)


def _by_sweep(facts: Facts, sweep: Result) -> tuple[Block, ...]:
    """How far each number reaches in a sweep of the same case, and what drives that."""
    rows, drivers = [], []
    for name, part in (sweep.summary.get("headlines") or {}).items():
        levels = part.get("percentiles") or {}
        chosen = [levels.get("5", part["least"]), part["median"], levels.get("95", part["greatest"])]
        rows.append((name.replace("_", " "), *(brief(value, part["unit"]) for value in chosen)))
        found = [one for one in part.get("sensitivities") or [] if one["share"] >= 0.05]
        if found:
            told = ", ".join(f"{one['key']} {100 * one['share']:.0f} %" for one in found[:4])
            drivers.append((name.replace("_", " "), told))
    samples = sweep.summary.get("samples")
    ends = ("5 %", "95 %") if samples else ("least", "greatest")
    words = Words(
        f"Not part of ±. From {sweep.summary.get('cases')} cases of the same case with its inputs varied "
        f"({facts.sweep_name}); they hold every combination of its steps"
        f"{f' with {samples} random samples at each' if samples else ''}."
    )
    blocks: list[Block] = [words, Table(("number", ends[0], "median", ends[1]), tuple(rows), numbers=(1, 2, 3))]
    if drivers:
        blocks.append(Table(("number", "share of the variance by input"), tuple(drivers), wide=1))
    return tuple(blocks)


def _sensitivities(facts: Facts) -> list[tuple[str, str, str]]:
    """Signs and limits: a film's stress goes with mu U/h when slow and sqrt(mu rho / t) U when sudden; a pressure's
    with G h; settling with h^2 rho/mu after the drive has ended and not at all before."""
    case = facts.case
    assert case is not None
    pressed = case.pressure.kind in ("drop", "drop_per_length")
    moving = any(w is not None and (w.speed or w.displacement) for w in case.walls)
    bodies = any(w is not None and w.body is not None for w in case.walls)
    gap = "radius" if case.gap.shape.axis else "gap"
    rows = []
    if moving and not bodies:
        rows.append(("wall speed", "none", "+1 % of its part"))
    if pressed:
        rows.append(("pressure drop", "none", "+1 % of its part"))
    if bodies:
        rows.append(("loads on bodies", "none where all are linear", "+1 % of their part"))
    thin = {(True, False): "−1 to 0 %", (False, True): "0 to +1 %"}.get((moving, pressed), "−1 to +1 %")
    thick = {(True, False): "+0.5 to +1 %", (False, True): "0 to +0.5 %"}.get((moving, pressed), "0 to +1 %")
    if bodies:
        rows.append((gap, "−2 to +2 %, by the body", "−1 to +1 %"))
        rows.append(("viscosity", "−1 to +1 %, by the body", "0 to +1 %"))
        return rows
    rows.append((gap, "0 to +2 %", thin))
    rows.append(("viscosity", "−1 to 0 %", thick))
    heavy = {(True, False): "0 to +0.5 %", (False, True): "−0.5 to 0 %"}.get((moving, pressed), "−0.5 to +0.5 %")
    rows.append(("density", "0 to +1 %", heavy))
    return rows

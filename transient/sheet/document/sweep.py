"""The sheet of a sweep: what varies, how far the headline numbers reach, the worst corner, and what matters."""

from __future__ import annotations

import json
from typing import Any

from transient.case.write import to_toml
from transient.result.result import ResultError
from transient.result.said import percent
from transient.sheet.document.blocks import Answer, Block, Listing, Picture, Points, Section, Sheet, Table, Words
from transient.sheet.document.checks import REVIEW
from transient.sheet.document.facts import Facts, brief, printed, said, share
from transient.sheet.document.inputs import following, inputs
from transient.sheet.document.model import model
from transient.sheet.document.pictures import TITLE
from transient.sheet.document.record import quoted, record_rows, signing
from transient.sheet.figures import draw
from transient.sheet.sweeps.columns import stepped
from transient.units import show

MOST_NUMBERS = 3  # headline numbers with a map and a spread of their own
VERDICTS = {"outside": "outside what the model describes", "failed": "a self-check failed", "caution": "with cautions"}


def compose_sweep(facts: Facts) -> Sheet:
    """The sections of a sweep's sheet in the order in which they are read."""
    sections = (
        Section("Purpose", _purpose(facts)),
        Section("Answer", (_answer(facts), _signs())),
        Section("Worst corner", _worst(facts)),
        Section("What varies", (_varied(facts), *_base(facts))),
        Section("Spread", _spread(facts)),
        Section("Which inputs matter", _ranking(facts)),
        Section("Equations and assumptions", model(facts)),
        Section("Checks, case by case", _checks(facts)),
        Section("Numerical error", _numerical(facts)),
        Section("Input uncertainty", _uncertain(facts)),
        Section("Figures", _pictures(facts)),
        Section("Cautions", _cautions(facts)),
        Section("Record", _record(facts)),
        Section("Signed", signing(facts)),
    )
    created = str(facts.result.attributes.get("created") or "")
    head = (
        ("sweep", facts.name),
        ("solved", created.replace("T", " ").removesuffix("Z") + " UTC" * created.endswith("Z")),
        ("program", str(facts.result.attributes.get("program") or "transient")),
    )
    return Sheet(facts.result.title or facts.stem, head, tuple(s for s in sections if s.blocks))


def _purpose(facts: Facts) -> tuple[Block, ...]:
    keys = list(facts.summary.get("varied") or {})
    words = (
        "How far settling time and wall stress reach when the inputs below vary, which case is the worst, and which "
        f"inputs matter: {facts.summary.get('cases', 0)} cases over {', '.join(keys)}."
    )
    return (*((Words(facts.note),) if facts.note else ()), Words(words))


def _headlines(facts: Facts) -> dict[str, Any]:
    return facts.summary.get("headlines") or {}


def _answer(facts: Facts) -> Answer:
    """The value of largest magnitude of every headline number, unfactored and factored."""
    rows: list[tuple[str, str, str]] = []
    for name, part in _headlines(facts).items():
        worst = part["worst"]
        least, greatest = (brief(part[end], part["unit"]) for end in ("least", "greatest"))
        remark = f"case {worst['case']}; between {least} and {greatest}"
        rows.append((_name(name), said(worst["value"], part.get("error"), part["unit"]), remark))
        if facts.factor and ("force" in name or "torque" in name):
            value = brief(facts.factor * worst["value"], part["unit"])
            rows.append((f"  factored × {facts.factor:g}", value, "as asked for this sheet"))
    return Answer(*_verdict(facts), tuple(rows))


def _verdict(facts: Facts) -> tuple[str, str]:
    """How many cases were solved and may be relied on, and the mark of that."""
    status, verdicts = facts.summary.get("status") or {}, facts.summary.get("verdicts") or {}
    words = [f"{status.get('solved', 0)} of {facts.summary.get('cases', 0)} cases solved"]
    words += [f"{status[name]} {name}" for name in ("refused", "failed") if status.get(name)]
    words += [f"{verdicts[name]} {text}" for name, text in VERDICTS.items() if verdicts.get(name)]
    bad = bool(verdicts.get("outside") or verdicts.get("failed") or status.get("failed"))
    careful = bool(status.get("refused") or verdicts.get("caution"))
    return "; ".join(words) + ".", "bad" if bad else "caution" if careful else "good"


def _signs() -> Words:
    return Words(
        "Each value is the one of largest magnitude over all cases. A stress is the traction of the liquid on the "
        "wall, positive along +x. ± is the largest numerical error of that number in any case."
    )


def _name(name: str) -> str:
    """A column in words, such as ``peak stress, upper``."""
    for start in ("peak_stress", "peak_force", "peak_torque", "final_stress"):
        if name.startswith(f"{start}_"):
            return f"{start.replace('_', ' ')}, {name.removeprefix(f'{start}_')}".capitalize()
    return name.replace("_", " ").capitalize()


def _said(facts: Facts, key: str, value: Any) -> str:
    """A varied key's value with a unit that suits it."""
    part = (facts.summary.get("varied") or {}).get(key) or {}
    if isinstance(value, int | float) and part.get("dimension"):
        return printed(show(float(value), part["dimension"]))
    return printed(f"{value:.6g}") if isinstance(value, float) else str(value)


def _worst(facts: Facts) -> tuple[Block, ...]:
    """The inputs of the worst case of every number, and how to run one of them."""
    keys = list(facts.summary.get("varied") or {})
    cases: dict[int, tuple[list[str], dict[str, Any]]] = {}
    for name, part in _headlines(facts).items():
        worst = part["worst"]
        cases.setdefault(worst["case"], ([], worst["inputs"]))[0].append(_name(name))
    if not cases:
        return (Words("No case was solved."),)
    rows = tuple(
        (str(case), ", ".join(names), *(_said(facts, key, found.get(key)) for key in keys))
        for case, (names, found) in cases.items()
    )
    table = Table(("case", "largest there", *keys), rows, numbers=(0, *range(2, 2 + len(keys))), wide=1)
    _, found = next(iter(cases.values()))
    sets = " ".join(f"--set {quoted(f'{key}={_set(facts, key, value)}')}" for key, value in found.items())
    words = Words(f"The first of them by itself, with the base case below saved as {facts.stem}_case.toml:")
    return table, words, Listing(f"transient run {quoted(f'{facts.stem}_case.toml')} {sets}")


def _set(facts: Facts, key: str, value: Any) -> str:
    """A value as ``--set`` takes it: SI, with its unit, exactly."""
    unit = ((facts.summary.get("varied") or {}).get(key) or {}).get("unit")
    if isinstance(value, float) and unit not in (None, "1", ""):
        return f"{value!r} {unit}"
    return str(value)


def _varied(facts: Facts) -> Table:
    rows = []
    for key, part in (facts.summary.get("varied") or {}).items():
        kind = next((k for k in ("normal", "uniform", "triangular") if k in part), None)
        if kind is not None:
            told = " to ".join(_said(facts, key, float(v)) for v in part[kind])
            told = told.replace(" to ", " ± ") if kind == "normal" else told
            rows.append((key, f"{kind}, drawn at random", told, str(facts.summary.get("samples") or "")))
        elif "choices" in part:
            rows.append((key, "choices", "", str(part["count"])))
        else:
            ends = f"{_said(facts, key, part['least'])} to {_said(facts, key, part['greatest'])}"
            rows.append((key, "steps", ends, str(part["count"])))
    return Table(("input", "how", "range", "values"), tuple(rows), numbers=(3,), wide=2)


def _base(facts: Facts) -> tuple[Block, ...]:
    return Words("All other inputs are those of the base case:"), *inputs(facts), *following(facts)


def _spread(facts: Facts) -> tuple[Block, ...]:
    """Least, percentiles, greatest of every number."""
    rows = []
    for name, part in _headlines(facts).items():
        unit, levels = part["unit"], part.get("percentiles") or {}
        chosen = [part["least"], levels.get("5"), part["median"], levels.get("95"), part["greatest"]]
        rows.append((_name(name), *(brief(value, unit) for value in chosen)))
    head = ("number", "least", "5 %", "median", "95 %", "greatest")
    return (Table(head, tuple(rows), numbers=(1, 2, 3, 4, 5)),) if rows else ()


def _ranking(facts: Facts) -> tuple[Block, ...]:
    rows = []
    for name, part in _headlines(facts).items():
        found = [one for one in part.get("sensitivities") or [] if one["share"] >= 0.005]
        told = "; ".join(f"{one['key']} {100 * one['share']:.0f} %{_sign(one.get('slope'))}" for one in found)
        linear = "–" if part.get("linear") is None else percent(part["linear"])
        if told:
            rows.append((_name(name), told, linear))
    if not rows:
        return ()
    words = Words(
        "Share of the variance that each input explains alone (first-order index; Sobol 1993); (+): the number's "
        "magnitude grows with it, (−): it falls. The last column is what straight lines explain together."
    )
    return words, Table(("number", "share of the variance", "linear"), tuple(rows), numbers=(2,), wide=1)


def _sign(slope: float | None) -> str:
    return "" if slope is None else " (+)" if slope > 0.0 else " (−)"


def _checks(facts: Facts) -> tuple[Block, ...]:
    """How many cases passed, and the most frequent messages of those that did not."""
    rows = []
    for kind, word in (("messages", "not solved"), ("cautions", "solved, with a remark")):
        for one in facts.summary.get(kind) or []:
            rows.append((word, str(one["cases"]), str(one["first"]), one["message"]))
    words = Words("Every case passed the checks of the model's limits and of the solver itself.")
    if not rows:
        return (words if _verdict(facts)[1] == "good" else Words("See the answer above."),)
    return (Table(("", "cases", "first", "message"), tuple(rows), numbers=(1, 2), wide=3),)


def _numerical(facts: Facts) -> tuple[Block, ...]:
    rows = []
    for name, part in _headlines(facts).items():
        if part.get("error") is not None:
            size = abs(part["worst"]["value"])
            rows.append((_name(name), brief(part["error"], part["unit"]), share(part["error"] / size) if size else "–"))
    words = Words("Largest stated error of each number over all cases, and as a share of its largest value.")
    return (words, Table(("number", "error", "share"), tuple(rows), numbers=(1, 2))) if rows else ()


def _uncertain(facts: Facts) -> tuple[Block, ...]:
    """What tolerances do, apart from the numerical error."""
    samples = facts.summary.get("samples")
    if not samples:
        words = "No tolerances are stated: all inputs vary in steps, and the spread above is that of the steps."
        return (Words(words),)
    rows = []
    for name, part in _headlines(facts).items():
        worst = part.get("combination") or {"percentiles": part.get("percentiles") or {}, "inputs": {}}
        levels = worst["percentiles"]
        at = ", ".join(f"{key} {_said(facts, key, value)}" for key, value in worst["inputs"].items()) or "all cases"
        rows.append((_name(name), *(brief(levels.get(q), part["unit"]) for q in ("5", "50", "95")), at))
    words = Words(
        f"What the tolerances alone do, by {samples} random samples (seed {facts.summary.get('seed')}) at the "
        "combination of steps where they reach farthest. Percentiles of few samples are themselves uncertain."
    )
    head = ("number", "5 %", "median", "95 %", "at")
    return words, Table(head, tuple(rows), numbers=(1, 2, 3), wide=4)


def _pictures(facts: Facts) -> tuple[Block, ...]:
    """Map and spread of the numbers that matter most, and the ranking."""
    chosen = [name for name in _headlines(facts) if name.startswith(("settling_time", "peak_stress"))][:MOST_NUMBERS]
    wanted: list[tuple[str, str, dict[str, Any]]] = []
    for name in chosen:
        if len(stepped(facts.result)) > 1:
            caption = f"Map: {_name(name).lower()} over the first two inputs with steps."
            wanted.append(("map", caption, {"quantity": name}))
        wanted.append(("spread", f"Spread: {_name(name).lower()}.", {"quantity": name}))
    wanted.append(("ranking", "Which inputs matter.", {}))
    found = []
    for figure, caption, options in wanted:
        try:
            drawn = draw(facts.result, figure, **options)
        except ResultError:
            continue
        found.append(Picture("-".join([figure, *options.values()]), caption, drawn, TITLE))
    return tuple(found)


def _cautions(facts: Facts) -> tuple[Block, ...]:
    own = []
    if _verdict(facts)[1] == "bad":
        own.append("Some cases lie outside what the model describes or failed: their numbers are not to be relied on.")
    if any("unbounded" in name for name in facts.result.variables) and _unbounded(facts):
        own.append("In some cases a wall's speed jumps: its stress is infinite there, and they have no peak.")
    factor = "No safety factor is included in any number."
    if facts.factor:
        factor = f"Only values named as factored are multiplied, by {facts.factor:g}; all others are unfactored."
    return (Points((*own, *REVIEW, factor)),)


def _unbounded(facts: Facts) -> bool:
    import numpy as np

    columns = [v.data for name, v in facts.result.variables.items() if name.startswith("unbounded_coefficient")]
    return any(bool(np.isfinite(column).any()) for column in columns)


def _record(facts: Facts) -> tuple[Block, ...]:
    base, sweep = f"{facts.stem}_case.toml", f"{facts.stem}.toml"
    command = f"transient sweep {quoted(sweep)}\ntransient sheet {quoted(f'outputs/{facts.stem}.h5')}"
    blocks: list[Block] = [
        Table(("record", ""), record_rows(facts), wide=1),
        Words(f"To run it again, save the base case below as {base}, the sweep as {sweep}, and give:"),
        Listing(command + (f" --factor {facts.factor:g}" if facts.factor else "")),
        Words("The base case in full:"),
        Listing(facts.result.case_text.strip("\n")),
    ]
    stated = _stated(facts, base)
    if stated:
        blocks += [Words("The sweep:"), Listing(stated)]
    return tuple(blocks)


def _stated(facts: Facts, base: str) -> str:
    """The sweep file's text; empty where the file does not tell."""
    try:
        tree = json.loads(str(facts.result.attributes.get("sweep") or ""))
    except ValueError:
        return ""
    tables = {name: tree[name] for name in ("vary", "rows", "scatter", "keep") if tree.get(name)}
    title = {"title": facts.result.title} if facts.result.title else {}
    return to_toml({**title, "case": base, **tables}).strip("\n")

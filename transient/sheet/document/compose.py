"""The whole sheet of a single run, section by section."""

from __future__ import annotations

from transient.sheet.document.answer import answer
from transient.sheet.document.blocks import Block, Section, Sheet, Words
from transient.sheet.document.checks import cautions, numerics, validity
from transient.sheet.document.errors import inputs_uncertain, numerical
from transient.sheet.document.facts import Facts
from transient.sheet.document.hand import hand
from transient.sheet.document.inputs import following, inputs
from transient.sheet.document.model import model
from transient.sheet.document.pictures import pictures, sketch
from transient.sheet.document.record import record, signing
from transient.sheet.document.sweep import compose_sweep

SHAPES = {
    "plates": "between two plates", "pipe": "in a pipe", "annulus": "in an annulus", "disc": "between discs",
    "cone": "between cones", "cone_plate": "between a cone and a plate",
}  # fmt: skip


def compose(facts: Facts) -> Sheet:
    """The sections of a run's sheet, or of a sweep's, in the order in which they are read."""
    if "case" in facts.result.variables:
        return compose_sweep(facts)
    sections = (
        Section("Purpose", purpose(facts)),
        Section("Answer", answer(facts)),
        Section("The gap", sketch(facts)),
        Section("Inputs", (*inputs(facts), *following(facts))),
        Section("Equations and assumptions", model(facts)),
        Section("Does the model apply?", validity(facts)),
        Section("Numerical error", (*numerical(facts), *numerics(facts))),
        Section("Input uncertainty", inputs_uncertain(facts)),
        Section("Hand formulas beside it", hand(facts)),
        Section("Figures", pictures(facts)),
        Section("Cautions", cautions(facts)),
        Section("Record", record(facts)),
        Section("Signed", signing(facts)),
    )
    return Sheet(facts.result.title or facts.stem, _head(facts), tuple(s for s in sections if s.blocks))


def purpose(facts: Facts) -> tuple[Block, ...]:
    """What is asked, in words, and a user's own note."""
    where = SHAPES.get(str(facts.summary.get("shape")), "in a gap")
    if facts.rotating and facts.summary.get("shape") == "annulus":
        where = "between a turning and a coaxial wall"
    words = (
        f"How long the liquid {where} takes to settle after the drive stated below, and how large the stress on the "
        "walls becomes meanwhile, and when."
    )
    note = (Words(facts.note),) if facts.note else ()
    return (*note, Words(words))


def _head(facts: Facts) -> tuple[tuple[str, str], ...]:
    created = str(facts.result.attributes.get("created") or "")
    return (
        ("result", facts.name),
        ("solved", created.replace("T", " ").removesuffix("Z") + (" UTC" if created.endswith("Z") else "")),
        ("program", str(facts.result.attributes.get("program") or "transient")),
    )

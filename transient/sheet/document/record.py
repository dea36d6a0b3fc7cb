"""What a checker needs to do it again: program, versions, the case in full, the command; and blanks to sign."""

from __future__ import annotations

import platform
from datetime import UTC, datetime
from importlib.metadata import PackageNotFoundError, version

from transient.sheet.document.blocks import Blanks, Block, Listing, Table, Words
from transient.sheet.document.facts import Facts

PACKAGES = ("numpy", "scipy", "numba", "h5py", "matplotlib")


def record(facts: Facts) -> tuple[Block, ...]:
    """Program and versions, command, case file."""
    stem = facts.stem
    options = f" --factor {facts.factor:g}" if facts.factor else ""
    options += f" --sweep {quoted(f'outputs/{facts.sweep_name}')}" if facts.sweep is not None else ""
    return (
        Table(("record", ""), record_rows(facts), wide=1),
        Words(f"To run it again, save the case below as {stem}.toml and give:"),
        Listing(f"transient run {quoted(f'{stem}.toml')}\ntransient sheet {quoted(f'outputs/{stem}.h5')}{options}"),
        Words("The case in full (tables from files are written out):"),
        Listing(facts.result.case_text.strip("\n")),
    )


def record_rows(facts: Facts) -> tuple[tuple[str, str], ...]:
    """What solved the result and wrote the sheet."""
    return (
        ("solved by", str(facts.result.attributes.get("program") or "transient")),
        ("solved on", str(facts.result.attributes.get("created") or "not stated")),
        ("result file", facts.name),
        ("sheet by", f"transient {_version('transient')}, Python {platform.python_version()}, " + _packages()),
        ("sheet written on", datetime.now(UTC).strftime("%Y-%m-%d")),
    )


def signing(facts: Facts) -> tuple[Block, ...]:
    """Blanks for originator and checker."""
    return (Blanks(("originator", "checker"), ("name", "date", "signature")),)


def _packages() -> str:
    return ", ".join(f"{name} {_version(name)}" for name in PACKAGES)


def _version(name: str) -> str:
    try:
        return version(name)
    except PackageNotFoundError:
        return "(not installed)"


def quoted(text: str) -> str:
    """A word as a shell takes it."""
    return f"'{text}'" if any(sign in text for sign in ' "()&;$') else text

"""What a checker needs to do it again: program, versions, the case in full, the command; and blanks to sign."""

from __future__ import annotations

import platform
from importlib.metadata import PackageNotFoundError, version

from transient.sheet.document.blocks import Blanks, Block, Listing, Table, Words
from transient.sheet.document.facts import Facts

PACKAGES = ("numpy", "scipy", "numba", "h5py", "matplotlib")


def record(facts: Facts) -> tuple[Block, ...]:
    """Program and versions, command, case file."""
    stem = facts.stem
    factor = f" --factor {facts.factor:g}" if facts.factor else ""
    rows = (
        ("solved by", str(facts.result.attributes.get("program") or "transient")),
        ("solved on", str(facts.result.attributes.get("created") or "not stated")),
        ("result file", facts.name),
        ("sheet by", f"transient {_version('transient')}, Python {platform.python_version()}, " + _packages()),
    )
    return (
        Table(("record", ""), rows, wide=1),
        Words(f"To run it again, save the case below as {stem}.toml and give:"),
        Listing(f"transient run {_quoted(f'{stem}.toml')}\ntransient sheet {_quoted(f'outputs/{stem}.h5')}{factor}"),
        Words("The case in full (tables from files are written out):"),
        Listing(facts.result.case_text.strip("\n")),
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


def _quoted(text: str) -> str:
    return f'"{text}"' if any(sign in text for sign in " '()&;$") else text

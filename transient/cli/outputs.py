"""Where ``transient run`` writes: decided and tried before anything is solved."""

from __future__ import annotations

from pathlib import Path

from transient.cli.words import Stop
from transient.result.place import unwritable


def result_paths(cases: list[str], folder: Path) -> list[Path]:
    """The result file of each case file, in order.  Raises Stop (status 2) where one could not be written."""
    paths = [folder / f"{Path(case).stem}.h5" for case in cases]
    _no_two_alike(cases, paths)
    _writable(folder)
    for path in paths:
        if path.is_dir():
            raise Stop(f"{path}: is a folder where the result would go; name another folder with --out")
    return paths


def _no_two_alike(cases: list[str], paths: list[Path]) -> None:
    first: dict[Path, str] = {}
    for case, path in zip(cases, paths, strict=True):
        if path in first:
            raise Stop(f"{first[path]} and {case} would both write {path}; run them apart, each with its own --out")
        first[path] = case


def _writable(folder: Path) -> None:
    reason = unwritable(folder)
    if reason is not None:
        raise Stop(f"{folder}: {reason}; name another with --out")

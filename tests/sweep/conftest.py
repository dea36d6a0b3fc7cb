"""Sweep files in a folder of their own, and command lines called in this process."""

from __future__ import annotations

import sys
from collections.abc import Callable
from pathlib import Path

import pytest

sys.path.insert(0, str(Path(__file__).parent))

from two_plates import CASE


@pytest.fixture
def sweep_file(tmp_path: Path) -> Callable[..., Path]:
    """``sweep_file("[vary]...", rows.csv="...")``: a sweep file beside ``case.toml``, and further files."""

    def made(text: str, head: str = 'case = "case.toml"\n', case: str = CASE, **files: str) -> Path:
        (tmp_path / "case.toml").write_text(case, encoding="utf-8")
        for name, content in files.items():
            (tmp_path / name.replace("__", ".")).write_text(content, encoding="utf-8")
        path = tmp_path / "many.toml"
        path.write_text(head + text, encoding="utf-8")
        return path

    return made


@pytest.fixture
def call(capsys: pytest.CaptureFixture[str]) -> Callable[..., tuple[int, str, str]]:
    """``call("sweep", "a.toml")``: (status, standard output, standard error)."""
    from transient.cli import main

    def once(*arguments: object) -> tuple[int, str, str]:
        capsys.readouterr()
        status = main([str(argument) for argument in arguments])
        said = capsys.readouterr()
        lines = [line for line in said.err.splitlines(keepends=True) if not line.startswith("first run: ")]
        return status, said.out, "".join(lines)

    return once

"""The house: what stands at its root, which rooms it has, what may import what, and how light its door is."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import pytest

import transient

ROOT = Path(__file__).resolve().parents[1]
AGREED = {"README.md", "DEVELOPERS.md", "pyproject.toml", "transient", "cases", "tests", "outputs"}
ROOMS = {"cli", "sweep", "sheet", "trust", "case", "march", "series", "gap", "fluid", "drive", "result", "units"}


def tracked() -> list[str]:
    """Every file that git knows."""
    command = ["git", "-C", str(ROOT), "ls-files"]
    found = subprocess.run(command, capture_output=True, text=True, check=False)
    if found.returncode:
        pytest.skip("not a git checkout")
    return found.stdout.split("\n")[:-1]


def test_the_root_holds_what_was_agreed():
    top = {name.split("/")[0] for name in tracked()}
    assert {name for name in top if not name.startswith(".")} <= AGREED
    assert {".ci", ".gitignore"} <= top
    assert [name for name in tracked() if name.startswith("outputs/")] == ["outputs/.gitkeep"]


def test_every_room_is_there_and_says_what_it_is_for():
    package = ROOT / "transient"
    assert {path.name for path in package.iterdir() if path.is_dir()} >= ROOMS
    for path in package.rglob("*.py"):
        text = path.read_text(encoding="utf-8")
        assert not text or text.startswith('"""'), f"{path.name} does not say what it is for"


def test_files_stay_short():
    """Common practice, no source: what fits on a few screens can be read."""
    for folder in ("transient", "tests"):
        for path in (ROOT / folder).rglob("*.py"):
            assert len(path.read_text(encoding="utf-8").splitlines()) <= 500, path.name


def test_rooms_import_downward_only():
    """The contracts of pyproject.toml, by import-linter."""
    code = "from importlinter.cli import lint_imports_command; lint_imports_command()"
    done = subprocess.run([sys.executable, "-c", code], cwd=ROOT, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stdout[-1500:]
    assert "0 broken" in done.stdout


def loaded(code: str) -> set[str]:
    """Top-level packages that a fresh interpreter has imported after ``code``."""
    command = [sys.executable, "-c", f"{code}\nimport sys\nprint(*{{name.split('.')[0] for name in sys.modules}})"]
    done = subprocess.run(command, cwd=ROOT, capture_output=True, text=True, check=True)
    return set(done.stdout.split())


PUBLIC = [
    "Case", "CaseError", "Result", "ResultError", "SolveError", "Table", "draw", "overlay", "read_case", "read_result",
    "run", "sweep", "write_result", "write_sheet",
]  # fmt: skip


def test_public_names_are_pinned():
    assert transient.__all__ == PUBLIC
    for name in [*PUBLIC, "__version__"]:
        assert getattr(transient, name) is not None
    with pytest.raises(AttributeError, match="no attribute 'solve_it'"):
        transient.solve_it  # noqa: B018


def test_the_door_is_light():
    heavy = {"matplotlib", "dask", "xarray", "h5netcdf", "pandas", "jinja2", "rainflow"}
    assert not loaded("import transient") & heavy


def test_solving_a_case_needs_no_figures_and_no_file_format():
    code = "import transient.answer"
    assert not loaded(code) & {"matplotlib", "dask", "xarray", "h5netcdf", "pandas", "typer", "rich"}


def test_the_core_is_plain_arrays():
    code = "import transient.march.levels, transient.series.solution, transient.result.headline"
    assert not loaded(code) & {"pint", "pydantic", "typer", "rich", "h5py", "matplotlib", "tomllib"}

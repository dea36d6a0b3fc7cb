"""The README keeps its promises: its commands exist, its cases are there, and .ci/run runs what it says."""

from __future__ import annotations

import re
import shutil
import subprocess
from pathlib import Path

import pytest

from transient.cli import COMMANDS

HOUSE = Path(__file__).resolve().parents[2]
README = (HOUSE / "README.md").read_text(encoding="utf-8")


def section(heading: str) -> str:
    """The README's text below ``heading``, up to the next one."""
    return re.search(rf"^## {heading}\n(.*?)(?=^## |\Z)", README, re.M | re.S).group(1)


def fenced(text: str) -> list[str]:
    """The contents of all fenced blocks."""
    return re.findall(r"^```\w*\n(.*?)^```", text, re.M | re.S)


def test_two_set_up_commands_of_one_line_each():
    (run,), (tests,) = fenced(section("Set up and run")), fenced(section("Run the tests"))
    for command in (run, tests):
        assert command.count("\n") == 1
        assert command.startswith("python3 -m venv .venv && ")
    assert run.rstrip().endswith("transient run cases/flow_cell.toml")
    for tool in ("[test]", "ruff check", "lint-imports", "pytest"):
        assert tool in tests


def test_every_command_and_no_other_is_described():
    described = set(re.findall(r"`transient (\w+)", section("Commands")))
    assert described == {command.__name__ for command in COMMANDS}


def test_every_case_is_described():
    named = set(re.findall(r"`(\w+\.toml)`", section("The case file")))
    assert named >= {path.name for path in (HOUSE / "cases").glob("*.toml")}
    for name in named:
        assert (HOUSE / "cases" / name).is_file()


def test_the_case_shown_is_the_case_that_runs():
    from tomllib import loads

    shown = loads(fenced(section("The case file"))[0])
    assert shown == loads((HOUSE / "cases" / "flow_cell.toml").read_text(encoding="utf-8"))


def test_the_output_shown_is_what_is_printed(call, tmp_path):
    shown = fenced(section("What you get"))[0].split()
    printed = call("run", HOUSE / "cases" / "flow_cell.toml", "--out", tmp_path).out.split()
    shown, printed = shown[: shown.index("File")], printed[: printed.index("File")]
    assert len(shown) == len(printed)
    for before, here, there in zip(["", *shown], shown, printed, strict=False):
        try:
            number = float(here)
        except ValueError:
            assert here == there
            continue
        # The last digit of a stated error may differ from one processor to the next.
        assert float(there) == pytest.approx(number, rel=1e-3) or before == "±"


def checkout(folder: Path, command: str) -> Path:
    """A small repository whose README has ``command`` as its test command."""
    readme = f"# A thing\n\n## Run the tests\n\n```sh\n{command}\n```\n\n```sh\nexit 7\n```\n"
    (folder / ".ci").mkdir(parents=True)
    shutil.copy(HOUSE / ".ci" / "run", folder / ".ci" / "run")
    (folder / "README.md").write_text(readme, encoding="utf-8")
    identity = ["-c", "user.name=nobody", "-c", "user.email=nobody@example.invalid"]
    for words in (["init", "-q"], ["add", "-A"], [*identity, "commit", "-q", "-m", "A thing"]):
        subprocess.run(["git", *words], cwd=folder, check=True)
    return folder


@pytest.mark.skipif(shutil.which("git") is None or shutil.which("bash") is None, reason="needs git and bash")
@pytest.mark.parametrize(
    ("command", "passes", "last"),
    [
        ("python3 -c 'import sys; assert sys.version_info >= (3, 11)' && echo '5 passed in 0.10s'", True, "ci: passed"),
        ("echo '1 failed, 4 passed in 0.10s'; exit 1", False, "ci: the test command ended with status 1"),
        ("echo '1 failed, 4 passed in 0.10s'; exit 0", False, "ci: not all tests passed"),
        ("echo 'no tests ran in 0.01s'; exit 0", False, "ci: not all tests passed"),
        ("echo all fine", False, "ci: no test was run"),
        ("", False, 'ci: the README has no command under "Run the tests"'),
    ],
)
def test_ci_takes_the_command_from_the_readme_and_believes_only_passed_tests(tmp_path, command, passes, last):
    folder = checkout(tmp_path / "checkout", command)
    ended = subprocess.run(["bash", str(folder / ".ci" / "run")], capture_output=True, text=True, check=False)
    assert (ended.returncode == 0) is passes
    assert (ended.stdout + ended.stderr).rstrip().endswith(last)
    if command:
        assert f"ci: {command}\n" in ended.stdout

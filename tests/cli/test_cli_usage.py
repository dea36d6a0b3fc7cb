"""Command lines that are wrong, and what is common to all commands."""

from __future__ import annotations

import os
import signal
import subprocess
import sys
from importlib.metadata import version

import pytest

import transient.cli.words
from transient.cli import COMMANDS

NAMES = [command.__name__ for command in COMMANDS]


def test_help_lists_every_command_and_none_that_is_missing(call):
    said = call("--help")
    assert said.status == 0
    listed = said.out.split("Commands:")[1].split()
    assert [word for word in listed if word in NAMES] == NAMES
    assert not {"fluid"} & set(listed)


def test_without_a_command_the_help_is_printed(call):
    assert call().out == call("--help").out


@pytest.mark.parametrize("command", [[], *([name] for name in NAMES)])
def test_version_everywhere(call, command):
    said = call(*command, "--version")
    assert (said.status, said.out, said.err) == (0, f"transient {version('transient')}\n", "")


@pytest.mark.parametrize("name", ["fluid", "rum"])
def test_a_command_of_another_version_is_refused_in_one_line(call, name):
    said = call(name, "x.toml")
    assert said.status == 2
    assert said.out == ""
    assert said.err == f'transient: this version has no command "{name}"; it has {", ".join(NAMES)}\n'


@pytest.mark.parametrize(
    ("arguments", "message"),
    [
        (["run"], "transient: Missing argument 'CASE.toml' (see transient --help)\n"),
        (["run", "--out"], "transient: Option '--out' requires an argument (see transient --help)\n"),
        (["sheet", "a.h5", "--factor", "0"], "--factor 0: a number above zero without unit is needed, such as 1.5\n"),
        (["sheet", "a.h5", "--out", "a.doc"], "--out a.doc: a sheet ends in .html, such as a.html\n"),
        (
            ["run", "a.toml", "--set", "gap.height"],
            '--set gap.height: a key and a value are needed, such as --set gap.height="0.5 mm"\n',
        ),
        (
            ["figure", "a.h5", "flow", "--out", "a.jpg"],
            "--out a.jpg: a figure ends in .png, .svg or .pdf, such as a.png\n",
        ),
    ],
)
def test_usage_errors_are_one_line(call, arguments, message):
    said = call(*arguments)
    assert (said.status, said.out, said.err) == (2, "", message)


def test_an_unknown_option_is_named(call):
    said = call("run", "a.toml", "--qiet")
    assert said.status == 2
    assert "--qiet" in said.err
    assert said.err.count("\n") == 1


def test_an_error_of_the_program_itself_is_one_line_and_no_traceback(call, monkeypatch):
    def broken(text: str) -> None:
        raise ZeroDivisionError("planted\nin two lines")

    monkeypatch.delenv("TRANSIENT_DEBUG", raising=False)
    monkeypatch.setattr(transient.cli.words, "say", broken)
    said = call("--version")
    assert said.status == 1
    assert said.err.startswith("transient met an error of its own (ZeroDivisionError: planted in two lines)")
    assert said.err.count("\n") == 1
    monkeypatch.setenv("TRANSIENT_DEBUG", "1")
    with pytest.raises(ZeroDivisionError):
        call("--version")


def test_an_interrupt_ends_with_130(call, monkeypatch):
    def interrupted(text: str) -> None:
        raise KeyboardInterrupt

    monkeypatch.setattr(transient.cli.words, "say", interrupted)
    said = call("--version")
    assert (said.status, said.out, said.err) == (130, "", "interrupted\n")


@pytest.mark.skipif(not hasattr(signal, "SIGPIPE"), reason="this system has no such signal")
def test_a_reader_that_has_seen_enough_ends_it_quietly():
    reading, writing = os.pipe()
    os.close(reading)
    ended = subprocess.run(
        [sys.executable, "-m", "transient", "--help"], stdout=writing, stderr=subprocess.PIPE, check=False
    )
    os.close(writing)
    assert ended.stderr == b""
    assert ended.returncode == -signal.SIGPIPE


def test_a_terminal_without_the_signs_gets_them_spelled():
    assert transient.cli.words._spelled("5 ± 1 cm³", "ascii") == "5 +- 1 cm^3"
    assert transient.cli.words._spelled("5 ± 1 cm³", "utf-8") == "5 ± 1 cm³"
    assert transient.cli.words._spelled("Prüfstand", "ascii") == "Pr?fstand"

"""A kill at any instant, an interrupt, a full disk: what was finished stays, and going on ends in the same bits."""

from __future__ import annotations

import os
import resource
import signal
import subprocess
import sys
import time
from contextlib import suppress
from pathlib import Path

import pytest
import quick
from test_sweep_rows import same

import transient as tr
from transient.cli import main
from transient.sweep import pieces
from transient.sweep.output import folder_of, opened
from transient.sweep.plan import read_plan

# Histories make every row one that is solved alone, in chunks of sixteen.
MANY = """
[vary]
"wall.upper.speed.over" = { from = "10 ms", to = "100 ms", count = 48 }
[keep]
histories = true
"""


@pytest.fixture
def started(sweep_file, tmp_path):
    """``started()``: a sweep over 48 cases in a process of its own, once its first chunks are finished."""
    file = sweep_file(MANY)
    out = tmp_path / "out.h5"
    running = []

    def start(**more) -> tuple[subprocess.Popen, Path, Path]:
        command = [sys.executable, "-m", "transient", "sweep", str(file), "--out", str(out), "--workers", "2"]
        process = subprocess.Popen(
            command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, start_new_session=True, **more
        )
        running.append(process)
        return process, file, out

    yield start
    for process in running:
        with suppress(ProcessLookupError):  # workers that outlived a killed parent among them
            os.killpg(process.pid, signal.SIGKILL)
        process.communicate()


def wait_for_chunks(out: Path, number: int) -> list[str]:
    """The names of the finished chunks, once there are so many."""
    for _ in range(2000):
        found = sorted(path.name for path in folder_of(out).glob("*.piece"))
        if len(found) >= number:
            return found
        time.sleep(0.02)
    raise AssertionError("no chunk was finished")


def alive(group: int) -> bool:
    """Whether a process of the group still runs."""
    for place in Path("/proc").glob("[0-9]*/stat"):
        try:
            fields = place.read_text().rpartition(")")[2].split()
        except OSError:
            continue
        if int(fields[2]) == group and fields[0] != "Z":
            return True
    return False


def test_after_a_kill_the_finished_chunks_are_there_and_the_result_is_the_same(started, tmp_path):
    process, file, out = started()
    wait_for_chunks(out, 1)
    process.kill()  # the parent alone: its workers must not outlive it for long
    process.wait()
    kept = wait_for_chunks(out, 1)
    assert not out.exists()
    for _ in range(100):
        if not alive(process.pid):
            break
        time.sleep(0.1)
    assert not alive(process.pid)
    before = {name: (folder_of(out) / name).stat().st_mtime_ns for name in kept}
    plan = read_plan(str(file))
    with opened(plan, out, resume=True, overwrite=False) as store:
        missing = store.missing()
    assert sorted([*missing, *(int(name[:7]) for name in kept)]) == list(range(plan.chunks))
    assert before == {name: (folder_of(out) / name).stat().st_mtime_ns for name in kept}
    assert main(["sweep", str(file), "--out", str(out), "--resume", "--quiet"]) == 0
    assert main(["sweep", str(file), "--out", str(tmp_path / "whole.h5"), "--workers", "1", "--quiet"]) == 0
    same(tr.read_result(out), tr.read_result(tmp_path / "whole.h5"))
    assert not folder_of(out).exists()


def test_an_interrupt_ends_with_130_and_says_what_is_kept(started):
    process, _, out = started()
    wait_for_chunks(out, 1)
    os.killpg(process.pid, signal.SIGINT)
    said, complaint = process.communicate(timeout=20)
    assert process.returncode == 130
    assert said == ""
    last = complaint.splitlines()[-1]
    assert last.startswith("interrupted; ")
    assert last.endswith(" of 48 cases are finished and kept; --resume goes on with the rest")
    assert "Traceback" not in complaint
    assert not alive(process.pid)
    assert not out.exists()


def test_a_full_disk_loses_nothing_that_was_finished(sweep_file, call, tmp_path, monkeypatch):
    quick.use(monkeypatch)
    file = sweep_file('[vary]\n"gap.height" = { from = "1 m", to = "64 m", count = 64 }\n')
    out = tmp_path / "out.h5"
    # The system's own refusal: no file may grow beyond so many bytes, which one chunk's does.
    size = len(read_plan(str(file)).frame.columns) * 8 * 16 - 100
    before = resource.getrlimit(resource.RLIMIT_FSIZE)
    signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
    resource.setrlimit(resource.RLIMIT_FSIZE, (size, before[1]))
    try:
        status, said, complaint = call("sweep", file, "--out", out, "--workers", "1")
    finally:
        resource.setrlimit(resource.RLIMIT_FSIZE, before)
    assert (status, said) == (1, "")
    assert complaint == f"{out}: File too large; 0 of 64 cases are finished and kept; --resume goes on with the rest\n"
    assert sorted(path.name for path in folder_of(out).iterdir()) == ["lock", "sweep.json"]
    assert call("sweep", file, "--out", out, "--workers", "1", "--resume")[0] == 0
    assert tr.read_result(out).settling_time.tolist() == [float(n) for n in range(1, 65)]


def test_a_disk_that_fills_while_the_result_is_put_together(sweep_file, call, tmp_path, monkeypatch):
    from transient.sweep import file as files

    quick.use(monkeypatch)
    sweep = sweep_file('[vary]\n"gap.height" = { from = "1 m", to = "64 m", count = 64 }\n')

    def full(*_):
        raise OSError(28, "No space left on device")

    with monkeypatch.context() as patch:
        patch.setattr(files, "_write_histories", full)
        status, _, complaint = call("sweep", sweep, "--out", tmp_path / "out.h5", "--workers", "1")
    assert status == 1
    assert "no space left on device; 64 of 64 cases are finished and kept; --resume" in complaint
    assert not (tmp_path / "out.h5").exists()
    assert call("sweep", sweep, "--out", tmp_path / "out.h5", "--resume")[0] == 0
    assert len(tr.read_result(tmp_path / "out.h5")) == 64


def test_a_chunk_is_whole_or_absent(sweep_file, tmp_path, monkeypatch):
    plan = read_plan(str(sweep_file(MANY)))
    store = pieces.Folder(plan, tmp_path / "parts")
    with store:
        store.begin()
    (tmp_path / "parts" / "0000003.piece").write_bytes(b"\x93NUMPY cut short")
    (tmp_path / "parts" / "0000004.draft").write_bytes(b"under way")
    (tmp_path / "parts" / "0000005.piece").write_bytes(b"")
    assert store.missing() == list(range(plan.chunks))


HEIGHTS = '[vary]\n"gap.height" = { from = "1 m", to = "40 m", count = 40 }\n'


@pytest.fixture
def interrupted(sweep_file, tmp_path, monkeypatch):
    """A quick sweep stopped after its first chunk: its file and its output."""
    from transient.sweep.run import solve

    quick.use(monkeypatch)
    file = sweep_file(HEIGHTS)
    plan = read_plan(str(file))
    store = opened(plan, tmp_path / "out.h5", resume=False, overwrite=False)

    class Enough(Exception):
        pass

    def one(cases: int) -> None:
        raise Enough

    from transient.sweep.places import here

    monkeypatch.setattr("transient.sweep.plan.ALONE", (16, 256))
    with pytest.raises(Enough), store:
        solve(plan, store, here, one)
    return file, tmp_path / "out.h5"


@pytest.mark.parametrize(
    ("change", "named"),
    [
        (lambda text: text.replace('"40 m"', '"41 m"'), 'gap.height.to was "40 m", is "41 m"'),
        (
            lambda text: text.replace('"gap.height"', '"gap.length"'),
            'gap.height was {"from": "1 m", "to": "40 m", "count": 40}, is not given; gap.length was not given, is',
        ),
        (
            lambda text: text + '[scatter]\nsamples = 2\n"gap.width" = { uniform = ["1 m", "2 m"] }\n',
            "samples was not given, is 2; gap.width was not given",
        ),
        (lambda text: text + "[keep]\nhistories = true\n", "histories was false, is true"),
    ],
)  # fmt: skip
def test_going_on_with_another_sweep_is_refused_and_names_what_changed(interrupted, call, change, named):
    file, out = interrupted
    file.write_text(change(file.read_text()))
    status, said, complaint = call("sweep", file, "--out", out, "--resume")
    assert (status, said) == (2, "")
    assert complaint.startswith(f"{folder_of(out)}: was begun with another sweep: ")
    assert named in complaint
    assert complaint.count("\n") == 1


def test_going_on_with_another_case_is_refused_and_names_what_changed(interrupted, call):
    file, out = interrupted
    case = file.parent / "case.toml"
    case.write_text(case.read_text().replace("998", "997"))
    complaint = call("sweep", file, "--out", out, "--resume")[2]
    assert 'case.fluid.density was "998 kg/m^3", is "997 kg/m^3"; put it back to go on, or begin anew' in complaint


def test_comments_and_layout_of_the_file_are_no_change(interrupted, call):
    file, out = interrupted
    file.write_text("# a remark\n" + file.read_text().replace(" = {", "={"))
    assert call("sweep", file, "--out", out, "--resume")[0] == 0


def test_what_is_there_is_neither_lost_nor_mixed(interrupted, call):
    file, out = interrupted
    parts = folder_of(out)
    refusal = (2, "", f"{parts}: holds an unfinished sweep; --resume goes on with it, --overwrite begins anew\n")
    assert call("sweep", file, "--out", out) == refusal
    assert call("sweep", file, "--out", out, "--resume")[0] == 0
    data = out.read_bytes()
    refusal = (2, "", f"{out}: is there already; --resume goes on with it, --overwrite begins anew\n")
    assert call("sweep", file, "--out", out) == refusal
    status, said, complaint = call("sweep", file, "--out", out, "--resume")
    assert (status, complaint) == (0, f"{out}: is complete already\n")
    assert "40 cases: 40 solved" in said
    assert out.read_bytes() == data
    assert call("sweep", file, "--out", out, "--overwrite")[0] == 0
    out.write_text("something else")
    complaint = call("sweep", file, "--out", out, "--resume")[2]
    assert complaint == f"{out}: is not the result of a sweep; name another with --out, or add --overwrite\n"


def test_two_sweeps_into_one_file_are_one_too_many(interrupted, call):
    file, out = interrupted
    holds = f"import fcntl; f = open({str(folder_of(out) / pieces.LOCK)!r}, 'w'); fcntl.lockf(f, fcntl.LOCK_EX)"
    other = subprocess.Popen(
        [sys.executable, "-c", f"{holds}; print('held', flush=True); input()"],
        stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True,
    )  # fmt: skip
    assert other.stdout.readline() == "held\n"
    status, _, complaint = call("sweep", file, "--out", out, "--resume")
    other.communicate("\n")
    assert status == 2
    assert complaint == f"{folder_of(out)}: another sweep is writing there; wait for it, or name another --out\n"
    assert call("sweep", file, "--out", out, "--resume")[0] == 0

"""A sweep on a dask.distributed scheduler: processes of this machine, reached over loopback."""

from __future__ import annotations

import os
import signal
import socket
import subprocess
import sys
import threading
import time

import pytest
from test_sweep_rows import same

import transient as tr
from transient.case.model import CaseError

# Third parties' warnings are theirs; ours still end a test.
pytestmark = pytest.mark.filterwarnings("ignore:::(distributed|dask|tornado)")
distributed = pytest.importorskip("distributed")

TREE = {
    "title": "Two plates",
    "gap": {"shape": "plates", "height": "0.8 mm"},
    "fluid": {"density": "998 kg/m^3", "viscosity": "1.002 mPa*s"},
    "wall": {"upper": {"speed": {"kind": "ramp", "to": "0.3 m/s", "over": "50 ms"}}},
    "run": {"accuracy": "1 %"},
}
VARY = {"gap.height": {"from": "0.4 mm", "to": "1.2 mm", "count": 20}, "run.duration": ["auto"]}


def free_port() -> int:
    """A port that nobody listens to."""
    with socket.socket() as probe:
        probe.bind(("127.0.0.1", 0))
        return probe.getsockname()[1]


@pytest.fixture(scope="module")
def address():
    """A scheduler and two workers, started as the README says."""
    port = free_port()
    where = f"tcp://127.0.0.1:{port}"
    quiet = {"stdout": subprocess.DEVNULL, "stderr": subprocess.DEVNULL, "start_new_session": True}
    env = {**os.environ, "OMP_NUM_THREADS": "1"}
    commands = [
        ["scheduler", "--host", "127.0.0.1", "--port", str(port), "--no-dashboard"],
        ["worker", where, "--nworkers", "2", "--nthreads", "1", "--no-dashboard"],
    ]
    started = [
        subprocess.Popen([sys.executable, "-m", "dask", *command], env=env, **quiet) for command in commands
    ]
    for _ in range(400):
        with socket.socket() as probe:
            if probe.connect_ex(("127.0.0.1", port)) == 0:
                break
        time.sleep(0.05)
    yield where
    for process in started:
        os.killpg(process.pid, signal.SIGKILL)
        process.wait()


def test_the_rows_are_those_of_this_machine_to_the_last_bit(address):
    case = tr.Case(TREE)
    same(tr.sweep(case, VARY, cluster=address), tr.sweep(case, VARY, workers=2))


def test_a_worker_that_dies_is_survived(address):
    case = tr.Case(TREE)
    client = distributed.Client(address, set_as_default=False)
    victim = next(iter(client.run(os.getpid).values()))
    threading.Timer(0.2, os.kill, (victim, signal.SIGKILL)).start()
    many = {"gap.height": {"from": "0.4 mm", "to": "1.2 mm", "count": 48}}
    table = tr.sweep(case, many, cluster=address, histories=True)
    assert victim not in client.run(os.getpid).values()
    client.close()
    assert (table.status == "solved").all()
    same(table, tr.sweep(case, many, workers=2, histories=True))


def test_the_command_takes_an_address(address, sweep_file, call, tmp_path):
    file = sweep_file('[vary]\n"gap.height" = ["0.4 mm", "-1 mm"]\n')
    status, out, err = call("sweep", file, "--cluster", address, "--out", tmp_path / "out.h5")
    assert (status, err) == (0, "")
    assert "2 cases: 1 solved, 1 refused" in out


@pytest.mark.parametrize(
    ("where", "reason"),
    [
        ("tcp://127.0.0.1:{}", "Connection refused"),
        ("127.0.0.1", "missing port number in address '127.0.0.1'"),
        ("pigeon://127.0.0.1:8786", "unknown address scheme 'pigeon'"),
    ],
)
def test_a_cluster_that_is_not_there_is_one_line_and_nothing_is_begun(sweep_file, call, tmp_path, where, reason):
    file = sweep_file('[vary]\n"gap.height" = ["0.4 mm", "0.5 mm"]\n')
    where = where.format(free_port())
    status, out, err = call("sweep", file, "--cluster", where, "--out", tmp_path / "out.h5")
    assert (status, out) == (2, "")
    assert err.startswith(f"--cluster {where}: cannot be reached ({reason}")
    assert err.endswith("is its scheduler running?\n")
    assert err.count("\n") == 1
    assert not (tmp_path / "out.h5.parts").exists()


def test_a_worker_with_another_version_is_refused():
    from transient.sweep.cluster import task

    with pytest.raises(OSError, match=r"a worker has transient .*, this is transient 99; the same version is needed"):
        task("transient 99", None, None, {})


def test_without_the_package_the_way_to_it_is_said(monkeypatch):
    monkeypatch.setitem(sys.modules, "distributed", None)
    with pytest.raises(CaseError, match=r'needs the package dask.distributed: pip install "transient\[cluster\]"'):
        tr.sweep(tr.Case(TREE), VARY, cluster="tcp://127.0.0.1:1")

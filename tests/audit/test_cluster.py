"""The audit on a cluster: a real scheduler and real workers, each a process of its own.

They listen on this machine alone. Where the extra `audit` is missing these tests are skipped.
"""

import os
import shutil
import signal
import socket
import subprocess
import sys
import time
import zipfile
from pathlib import Path

import pytest

import railguard
from railguard.audit.build import identity
from railguard.audit.cluster import Cluster
from railguard.audit.wire import Plan
from tests.audit.conftest import STARTED, Audited
from tests.audit.designs import BARE, CLIPPED, LIBRARY, SOUND, UNKNOWN, put
from tests.audit.test_archives import zipped

pytest.importorskip("distributed", reason="the extra `audit` is not installed")
pytest.importorskip("fsspec", reason="the extra `audit` is not installed")

PACKAGE = Path(railguard.__file__).parent
KINDS = (SOUND, CLIPPED, BARE, UNKNOWN, LIBRARY)


class Counting:
    """A watcher that keeps the path of every outcome it is told of."""

    def __init__(self):
        self.done = []

    def expects(self, files, *, final):
        """Take how many files there are."""

    def did(self, outcome, path):
        """Keep the path."""
        self.done.append(path)


def free_port():
    """Return a port nobody listens at."""
    with socket.socket() as one:
        one.bind(("127.0.0.1", 0))
        return one.getsockname()[1]


class Running:
    """A scheduler and its workers."""

    def __init__(self, folder):
        self.folder = folder
        self.port = free_port()
        self.address = f"tcp://127.0.0.1:{self.port}"
        self.started = []
        self.scheduler = self.start_scheduler()

    def start_scheduler(self):
        """Start the scheduler at its port, and wait for it."""
        run = self._start(
            "scheduler", "--host", "127.0.0.1", "--port", str(self.port), "--no-dashboard"
        )
        deadline = time.monotonic() + 60
        while time.monotonic() < deadline:
            with socket.socket() as one:
                if one.connect_ex(("127.0.0.1", self.port)) == 0:
                    return run
            time.sleep(0.1)
        raise AssertionError("the scheduler did not start")

    def worker(self, **environment):
        """Start a worker with one thread."""
        return self._start(
            "worker", self.address, "--nthreads", "1", "--no-dashboard", "--memory-limit", "0",
            "--no-nanny", "--host", "127.0.0.1", **environment,
        )  # fmt: skip

    def _start(self, *words, **environment):
        log = (self.folder / f"{len(self.started)}.log").open("wb")
        run = subprocess.Popen(
            [sys.executable, "-m", "dask", *words],
            cwd=self.folder, stdout=log, stderr=subprocess.STDOUT,
            env={**os.environ, **environment}, start_new_session=True,
        )  # fmt: skip
        log.close()
        self.started.append(run)
        return run

    def end(self):
        """End whatever still runs of what was started here."""
        for run in reversed(self.started):
            if run.poll() is None:
                os.killpg(run.pid, signal.SIGKILL)
            run.wait()


@pytest.fixture
def cluster(tmp_path):
    """A scheduler; a test starts its workers."""
    folder = tmp_path / "cluster"
    folder.mkdir()
    running = Running(folder)
    yield running
    running.end()


@pytest.fixture
def share(tmp_path):
    """Designs of several kinds, an archive, and a file nobody can read."""
    names = {f"lot{k % 5}/design{k:03}.cir": KINDS[k % 5] for k in range(150)}
    names["bench.cir"] = 'bench\n.include "lot1/design001.cir"\n.tran 1u 1m\n.end\n'
    names["picture.cir"] = "\x00\x01" * 100
    folder = put(tmp_path / "share", **names)
    inside = {f"{k}.cir": KINDS[k % 4].encode() for k in range(40)}
    (folder / "old.zip").write_bytes(zipped(inside))
    return folder


def command(root, base, *more):
    """Start an audit."""
    words = [sys.executable, "-m", "railguard", "audit", str(root), "--to", str(base), *more]
    STARTED.append(subprocess.Popen(words, stderr=subprocess.PIPE, start_new_session=True))
    return STARTED[-1]


def finished(run):
    """Wait for an audit; return its status and what it said."""
    said = run.communicate(timeout=120)[1].decode()
    return run.returncode, said


def export(base):
    """Return the JSON report of an audit."""
    return Audited(base).text("--as", "json")


def wait_for(base, files):
    """Wait until an audit has committed so many files."""
    deadline = time.monotonic() + 120
    while time.monotonic() < deadline:
        try:
            if Audited(base).query("SELECT COUNT(*) FROM file")[0][0] >= files:
                return
        except Exception:  # noqa: BLE001 - the file may be in the making
            pass
        time.sleep(0.05)
    raise AssertionError("the audit does not go on")


def test_a_lost_worker_changes_nothing(cluster, share, tmp_path):
    """One of two is killed during the run; the export is that of one machine, to the byte."""
    status, _ = finished(command(share, tmp_path / "alone.sqlite", "--workers", "1"))
    assert status == 0
    first, _ = cluster.worker(), cluster.worker()
    run = command(share, tmp_path / "cluster.sqlite", "--cluster", cluster.address)
    wait_for(tmp_path / "cluster.sqlite", 20)
    assert run.poll() is None, "it was over before the kill"
    first.kill()
    status, said = finished(run)
    assert status == 0, said
    assert export(tmp_path / "cluster.sqlite") == export(tmp_path / "alone.sqlite")


def test_a_slow_worker_changes_nothing(cluster, share, tmp_path):
    """One of two stands still in the middle of its batches and goes on seconds later."""
    status, _ = finished(command(share, tmp_path / "alone.sqlite", "--workers", "1"))
    assert status == 0
    slow, _ = cluster.worker(), cluster.worker()
    run = command(share, tmp_path / "cluster.sqlite", "--cluster", cluster.address)
    wait_for(tmp_path / "cluster.sqlite", 20)
    slow.send_signal(signal.SIGSTOP)
    try:
        time.sleep(4)
    finally:
        slow.send_signal(signal.SIGCONT)
    status, said = finished(run)
    assert status == 0, said
    assert export(tmp_path / "cluster.sqlite") == export(tmp_path / "alone.sqlite")


def test_a_worker_that_never_answers_again_changes_nothing(cluster, tmp_path, monkeypatch):
    """One of two stands still for good: its batches are overdue, and the other one does them."""
    from railguard.audit.run import audit, collect
    from railguard.audit.store import Store

    folder = put(tmp_path / "share", **{f"{k}.cir": KINDS[k % 5] for k in range(30)})
    plan = Plan(
        roots=(str(folder),), labels=("",), settings="", hold_at=None, trust=False,
        day="2027-01-31", build=identity(),
    )  # fmt: skip
    with Store(tmp_path / "alone.sqlite") as store:
        audit(plan, store, 1, (), Counting())
    slow, _ = cluster.worker(), cluster.worker()
    monkeypatch.setattr("railguard.audit.cluster.BATCH", 2)
    watcher = Counting()
    sent = []
    send = Cluster._send

    def noted(self, tasks):
        sent.append(tasks)
        send(self, tasks)

    monkeypatch.setattr(Cluster, "_send", noted)
    with (
        Store(tmp_path / "cluster.sqlite") as store,
        Cluster(plan, cluster.address, overdue=5.0) as connected,
    ):
        connected._client.wait_for_workers(2, timeout=60)
        slow.send_signal(signal.SIGSTOP)
        collect(plan, store, connected, (), watcher)
    assert len(sent) > len({id(tasks) for tasks in sent})  # some were sent to both
    assert sorted(watcher.done) == sorted({*watcher.done})
    assert len(watcher.done) == 30
    assert export(tmp_path / "cluster.sqlite") == export(tmp_path / "alone.sqlite")


def test_a_scheduler_that_restarts(cluster, share, tmp_path):
    """It is waited for; and where the audit is killed meanwhile, the same command goes on."""
    base = tmp_path / "cluster.sqlite"
    cluster.worker()
    run = command(share, base, "--cluster", cluster.address)
    wait_for(base, 20)
    cluster.scheduler.kill()
    cluster.scheduler.wait()
    cluster.scheduler = cluster.start_scheduler()
    cluster.worker()
    status, said = finished(run)
    assert status == 0, said
    finished(command(share, tmp_path / "alone.sqlite", "--workers", "1"))
    assert export(base) == export(tmp_path / "alone.sqlite")


def test_another_railguard_is_refused(cluster, share, tmp_path):
    """A worker whose code differs in one line must not take part."""
    copy = tmp_path / "other"
    shutil.copytree(PACKAGE, copy / "railguard")
    if (PACKAGE.parent / "grammar").is_dir():
        shutil.copytree(PACKAGE.parent / "grammar", copy / "grammar")
    with (copy / "railguard" / "units.py").open("a") as file:
        file.write("# another one\n")
    cluster.worker(PYTHONPATH=str(copy))
    status, said = finished(command(share, tmp_path / "c.sqlite", "--cluster", cluster.address))
    assert status == 2
    assert "their results cannot be mixed" in said
    assert "Install the same railguard" in said


def test_a_worker_that_does_not_see_the_root_is_refused(cluster, tmp_path):
    """Rather than recording every file as missing."""
    from railguard.audit.cluster import Cluster, ClusterError
    from tests.audit.test_pool import plan_of

    cluster.worker()
    with pytest.raises(ClusterError, match="does not see"):
        Cluster(plan_of(tmp_path / "nowhere"), cluster.address)


def test_nobody_there(tmp_path, share):
    """The address and the remedy are named."""
    from railguard.audit import cluster as module

    port = free_port()
    plan = _plan(share)
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(module, "CONNECT_SECONDS", 1.0)
        with pytest.raises(module.ClusterError, match=f"No scheduler answers at .*{port}"):
            module.Cluster(plan, f"tcp://127.0.0.1:{port}")


def _plan(share):
    from tests.audit.test_pool import plan_of

    return plan_of(share)


def test_work_in_flight_is_bounded(cluster, share):
    """However many files wait, no more are taken than a few batches."""
    from railguard.audit.cluster import AHEAD, BATCH, Cluster
    from railguard.audit.wire import Task

    cluster.worker()
    taken, back, most = 0, 0, 0

    def take():
        nonlocal taken
        if taken == 400:
            return None
        taken += 1
        return Task(0, f"lot{(taken % 5)}/missing{taken}.cir")

    with Cluster(_plan(share), cluster.address) as connection:
        for outcome in connection.results(take):
            back += outcome is not None
            most = max(most, taken - back)
    assert back == 400
    assert BATCH <= most <= (AHEAD + 1) * BATCH


def test_a_file_that_ends_its_process_leaves_the_worker_alone(cluster, tmp_path):
    """The budget holds on a cluster as on one machine, and the reason is the same."""
    from railguard.audit.cluster import Cluster
    from tests.audit.test_pool import long_deck, plan_of, run, states

    put(tmp_path / "share", **{"a.cir": SOUND, "b.cir": long_deck(100_000), "c.cir": SOUND})
    cluster.worker()
    with Cluster(plan_of(tmp_path / "share", seconds=1), cluster.address) as connection:
        found = run(connection, tmp_path / "share")
    assert states(found) == {"a.cir": "design", "b.cir": "stopped", "c.cir": "design"}
    assert "more than the 1 s of processor time" in found["b.cir"].why


def test_a_zip_by_its_url(tmp_path, share):
    """What fsspec opens is read like a folder, on one machine too."""
    with zipfile.ZipFile(tmp_path / "share.zip", "w") as archive:
        for path in sorted(share.rglob("*.*")):
            archive.write(path, path.relative_to(share).as_posix())
    url = f"zip://::{tmp_path / 'share.zip'}"
    assert finished(command(share, tmp_path / "a.sqlite", "--workers", "1"))[0] == 0
    status, said = finished(command(url, tmp_path / "b.sqlite", "--workers", "1"))
    assert status == 0, said
    assert export(tmp_path / "a.sqlite") == export(tmp_path / "b.sqlite")


def test_a_bucket(cluster, share, tmp_path, monkeypatch):
    """Workers read from an S3-compatible store by themselves; the export is the same."""
    pytest.importorskip("s3fs", reason="s3fs is not installed")
    moto = pytest.importorskip("moto.server", reason="moto's server is not installed")
    server = moto.ThreadedMotoServer(ip_address="127.0.0.1", port=free_port(), verbose=False)
    server.start()
    try:
        host, port = server.get_host_and_port()
        for name, value in {
            "AWS_ACCESS_KEY_ID": "test",
            "AWS_SECRET_ACCESS_KEY": "test",
            "AWS_DEFAULT_REGION": "us-east-1",
            "FSSPEC_S3_ENDPOINT_URL": f"http://{host}:{port}",
        }.items():
            monkeypatch.setenv(name, value)
        _fill(share)
        cluster.worker()
        assert finished(command(share, tmp_path / "a.sqlite", "--workers", "1"))[0] == 0
        status, said = finished(
            command("s3://gauges/boards", tmp_path / "b.sqlite", "--cluster", cluster.address)
        )
        assert status == 0, said
    finally:
        server.stop()
    assert export(tmp_path / "a.sqlite") == export(tmp_path / "b.sqlite")


def _fill(share):
    """Copy a folder into the bucket, from a process of its own."""
    lines = (
        "import fsspec, sys",
        "files = fsspec.filesystem('s3')",
        "files.mkdir('gauges')",
        "files.put(sys.argv[1] + '/', 'gauges/boards/', recursive=True)",
    )
    subprocess.run([sys.executable, "-c", "\n".join(lines), str(share)], check=True, timeout=120)

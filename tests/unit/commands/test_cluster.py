"""Runs on Dask workers as real processes: the same product as threads make, whoever dies on the way."""

import json
import random
import signal
import time
from contextlib import suppress
from pathlib import Path

import pytest

import tracer

pytest.importorskip("distributed")

RUN_FILE = (
    Path(__file__).with_name("ball.toml").read_text(encoding="utf-8").replace("batches = 60", "batches = 40")
)
LOAD = "import distributed, distributed.scheduler, distributed.worker"
SCHEDULER = """
import asyncio, json
from distributed import Scheduler

async def serve():
    async with Scheduler(host="127.0.0.1", port=0, dashboard=False) as scheduler:
        with open("scheduler.json.part", "w") as file:
            json.dump({"address": scheduler.address}, file)
        import os
        os.rename("scheduler.json.part", "scheduler.json")
        await scheduler.finished()

asyncio.run(serve())
"""
WORKER = """
import asyncio
from distributed import Worker

async def serve():
    async with Worker(scheduler_file="scheduler.json", nthreads=1, dashboard=False) as worker:
        await worker.finished()

asyncio.run(serve())
"""
STRANGER = """
from tracer.engine.executors import dask_cluster
ours = dask_cluster.fingerprint()
dask_cluster.fingerprint = lambda: ours._replace(numba="0.1")
"""


@pytest.fixture
def folder(tmp_path):
    (tmp_path / "ball.toml").write_text(RUN_FILE, encoding="utf-8")
    return tmp_path


@pytest.fixture(scope="module")
def checksum(tmp_path_factory) -> str:
    """Return the checksum that one thread makes."""
    path = tmp_path_factory.mktemp("whole") / "ball.toml"
    path.write_text(RUN_FILE, encoding="utf-8")
    return str(tracer.run(tracer.load_run(path), workers=1).attrs["data_checksum"])


@pytest.fixture
def cluster(start, folder):
    """Return a function that starts a scheduler, if there is none yet, and workers; all end with the test."""
    started = []

    def begin(workers: int, code: str = ""):
        if not started:
            started.append(start(code=SCHEDULER, before=LOAD))
            started[0].wait_until((folder / "scheduler.json").exists)
        made = [start(code=code + WORKER, before=LOAD) for _ in range(workers)]
        started.extend(made)
        return made

    begin.scheduler = lambda: started[0]
    yield begin
    for process in started:
        with suppress(ProcessLookupError):
            process.signal(signal.SIGKILL)
        process.wait()


def product_checksum(folder: Path) -> str:
    with tracer.open_product(folder / "ball.nc") as ds:
        return str(ds.attrs["data_checksum"])


def events(folder: Path) -> list[dict]:
    path = folder / "log.jsonl"
    return [json.loads(line) for line in path.read_text().splitlines()] if path.exists() else []


RUN = ("run", "ball.toml", "--log", "log.jsonl", "--cluster")


def test_two_of_three_tcp_workers_are_killed_and_the_product_is_the_same(start, folder, cluster, checksum):
    chance = random.Random(6)
    workers = cluster(3)
    process = start((*RUN, "scheduler.json"))
    for victim, folded in ((0, 5), (1, 15)):
        process.wait_until(
            lambda folded=folded: any(e.get("batches", 0) >= folded for e in events(folder)), seconds=20.0
        )
        time.sleep(chance.uniform(0.0, 0.2))
        workers[victim].signal(signal.SIGKILL)
    done = process.wait()
    assert done.code == 0, done.err
    assert product_checksum(folder) == checksum


def test_a_worker_with_another_numba_is_refused(start, folder, cluster):
    cluster(1)
    cluster(1, STRANGER)
    address = json.loads((folder / "scheduler.json").read_text())["address"]
    waiting = start(code=WAIT_FOR_TWO)
    assert waiting.wait().code == 0
    done = start((*RUN, address)).wait()
    assert done.code == 2
    assert done.err.startswith(f"tracer: --cluster {address}: worker tcp://127.0.0.1:")
    assert " is refused: it has numba 0.1 where this process has 0." in done.err
    assert len(done.err.splitlines()) == 1


def test_every_worker_has_the_work_before_the_first_batch(start, folder, cluster):
    # With the work on one worker alone, the others had no batch until the first of these was done.
    cluster(2)
    done = start(code=SHARE_AMONG_TWO).wait()
    assert done.code == 0, done.err


SHARE_AMONG_TWO = """
from distributed import Client
from tracer.engine.executors.dask_cluster import shared_out
with Client(scheduler_file="scheduler.json", set_as_default=False) as client:
    client.wait_for_workers(2, timeout=10)
    shared = shared_out(client, "the work", "work")
    assert len(client.who_has([shared])["work"]) == 2
"""

WAIT_FOR_TWO = """
from distributed import Client
with Client(scheduler_file="scheduler.json", set_as_default=False) as client:
    client.wait_for_workers(2, timeout=10)
"""


def test_a_stranger_that_joins_late_ends_the_run_and_nothing_is_lost(start, folder, cluster):
    cluster(1)
    process = start((*RUN, "scheduler.json", "--set", "ensemble.batches=1000"))
    process.wait_until(lambda: any(e["event"] == "checkpoint" for e in events(folder)), seconds=20.0)
    cluster(1, STRANGER)
    done = process.wait()
    assert done.code == 1
    assert "has joined and is refused: it has numba 0.1 where this process has 0." in done.err
    assert "go on with: tracer run ball.toml" in done.err
    assert list(folder.glob(".ball.nc.checkpoint-[ab]"))


def test_local_processes_make_the_same_product_and_ctrl_c_leaves_a_checkpoint(start, folder, checksum):
    process = start((*RUN, "local:2"))
    process.wait_until(lambda: any(e["event"] == "checkpoint" for e in events(folder)), seconds=20.0)
    process.signal(signal.SIGINT)
    done = process.wait()
    assert done.code == 3
    assert done.err.splitlines()[-1].endswith(" --cluster local:2 --log log.jsonl --resume")
    kinds = [event["event"] for event in events(folder)]
    assert kinds[0] == "cluster"
    assert kinds[-1] == "interrupted"
    assert events(folder)[0]["dashboard"].startswith("http://127.0.0.1:")
    # What processes have begun threads may end: it is the same run.
    resumed = start(("run", "ball.toml", "--resume")).wait()
    assert resumed.code == 0, resumed.err
    assert product_checksum(folder) == checksum


def test_a_scheduler_that_dies_is_one_message_and_nothing_is_lost(start, folder, cluster, checksum):
    cluster(1)
    process = start((*RUN, "scheduler.json"))
    process.wait_until(lambda: any(e["event"] == "checkpoint" for e in events(folder)), seconds=20.0)
    cluster.scheduler().signal(signal.SIGKILL)
    done = process.wait()
    assert done.code == 1
    assert "go on with: tracer run ball.toml" in done.err
    resumed = start(("run", "ball.toml", "--resume")).wait()
    assert resumed.code == 0
    assert product_checksum(folder) == checksum


@pytest.mark.parametrize(
    ("where", "message"),
    [
        (
            "local:0",
            '--cluster: "local:0" is no cluster; must be local:N, tcp://HOST:PORT, tls://HOST:PORT or a scheduler '
            "FILE.json",
        ),
        ("no.json", "--cluster no.json: cannot be read: No such file or directory"),
        ("ball.json", "--cluster ball.json: is no scheduler file: it names no address"),
        ("evil.json", '--cluster evil.json: address: "file:///etc/passwd" is no tcp:// or tls:// address'),
    ],
)
def test_what_is_no_cluster_is_refused(start, folder, where, message):
    (folder / "ball.json").write_text("[]")
    (folder / "evil.json").write_text('{"address": "file:///etc/passwd"}')
    done = start((*RUN, where)).wait()
    assert done.code == 2
    assert done.err == f"tracer: {message}\n"


def test_threads_and_a_cluster_together_are_refused(start, folder):
    done = start((*RUN, "local:2", "--workers", "2")).wait()
    assert done.code == 2
    assert done.err == "tracer: --workers: is for threads; the workers of a --cluster are its own\n"


def test_a_missing_library_is_named_with_the_extra_that_brings_it(start, folder):
    done = start((*RUN, "local:2"), code="import sys; sys.modules['distributed'] = None").wait()
    assert done.code == 2
    expected = "tracer: --cluster needs the package distributed: pip install 'exosphere-tracer[cluster]'\n"
    assert done.err == expected

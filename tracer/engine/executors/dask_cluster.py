"""Batches on the workers of a Dask cluster: local processes, or a scheduler somewhere.

Needs the extra `cluster`, whose libraries are loaded only when a cluster is asked for. Dask runs the batches of lost
workers again by itself; a batch has the same last bit wherever it runs, if the worker has our fingerprint.
"""

import asyncio
import json
import logging
import re
from collections.abc import Generator, Iterator, Mapping, Sequence
from concurrent import futures
from contextlib import contextmanager, suppress
from functools import partial
from importlib import import_module
from itertools import islice
from threading import Event
from time import monotonic
from typing import Any, NamedTuple
from uuid import uuid4

from tracer.engine.batches import BatchResult, Task, Work, compile_kernels, trace_batch
from tracer.engine.executors.seam import POLL_SECONDS, MapBatches, Prepare, Queue, Tell, Tick, window
from tracer.engine.fingerprint import Fingerprint, difference, fingerprint
from tracer.engine.progress import Note
from tracer.errors import InputError, TracerError

LOCAL = re.compile(r"local:([1-9][0-9]{0,3})")
ADDRESS = re.compile(r"(tcp|tls)://\S+:[0-9]{1,5}")
MOST_FILE_BYTES = 1_000_000
CONNECT_SECONDS = 20.0
FIRST_WORKER_SECONDS = 60.0
SECONDS_BETWEEN_CENSUSES = 2.0
MOST_TRIALS = 10
"""Workers that may die under one batch before it is taken for the cause."""
LIBRARY = "distributed"
LOST = "the connection to the cluster's scheduler is lost"
IGNORE_CTRL_C = "import signal; signal.signal(signal.SIGINT, signal.SIG_IGN)"
"""Ctrl-C reaches every process of a terminal; only the one that folds decides what it means."""


ENVIRONMENT = {"OMP_NUM_THREADS": 1, "MKL_NUM_THREADS": 1, "OPENBLAS_NUM_THREADS": 1}
"""Of local workers, in place of the library's own. That has the C library give memory back as soon as it is free, so
that the system maps every array of launches page by page again: a quarter more time for a batch of arcs."""

SELF_OBSERVATION = {
    "distributed.worker.profile.enabled": False,
    "distributed.admin.tick.interval": "1s",
    "distributed.admin.system-monitor.interval": "5s",
}
"""Of local processes. They would look at their own stacks a hundred times a second, ask fifty times a second whether
they are late, and read the machine's load twice a second, all for pages of the dashboard: some per cent."""


class ForeignWorker(TracerError):
    """A worker whose batches would have other last bits."""


class Connection(NamedTuple):
    """A cluster in reach, and the batches that it can trace side by side."""

    map_batches: MapBatches
    workers: int
    prepare: Prepare


@contextmanager
def connected(where: str, note: Note) -> Iterator[Connection]:
    """Yield the connection to a cluster, every worker of which has been looked at.

    Parameters
    ----------
    where : str
        `local:N` for N processes of this machine, `tcp://HOST:PORT` or `tls://HOST:PORT` of a running scheduler, or
        the name of a scheduler's JSON file. What TLS needs stands in Dask's own configuration.
    note : callable
        Told of the cluster, its dashboard, and workers that come and go.

    Raises
    ------
    InputError
        The libraries are missing, `where` is none of these, nobody answers, or a worker is of another package, numba
        or platform.
    TracerError
        No worker has come.
    """
    distributed = _libraries()
    with _library_hushed(), _client(distributed, where) as client:
        try:
            client.wait_for_workers(1, timeout=FIRST_WORKER_SECONDS)
        except TimeoutError:
            raise TracerError(
                f"--cluster {where}: no worker has come in {FIRST_WORKER_SECONDS:.0f} s"
            ) from None
        _refuse_foreign_workers(client, where)
        workers = sum(client.nthreads().values())
        served = "dashboard" in client.scheduler_info()["services"]
        dashboard = str(client.dashboard_link) if served else None
        words = f"{workers} workers; dashboard: {dashboard or 'none'}"
        note("cluster", words, workers=workers, dashboard=dashboard)
        yield Connection(
            partial(_map_batches, distributed, client, note), workers, partial(_load_kernels, client)
        )


def _libraries() -> Any:
    try:
        import_module("dask")
        return import_module(LIBRARY)
    except ImportError as error:
        raise InputError(
            f"--cluster needs the package {error.name}: pip install 'exosphere-tracer[cluster]'"
        ) from None


@contextmanager
def _client(distributed: Any, where: str) -> Iterator[Any]:
    if match := LOCAL.fullmatch(where):
        with (
            import_module("dask").config.set(
                {"distributed.nanny.pre-spawn-environ": ENVIRONMENT, **SELF_OBSERVATION}
            ),
            distributed.LocalCluster(
                n_workers=int(match[1]),
                threads_per_worker=1,
                processes=True,
                host="127.0.0.1",
                dashboard_address="127.0.0.1:0",
                memory_limit=0,
                silence_logs=logging.ERROR,
                preload=[IGNORE_CTRL_C],
            ) as cluster,
            distributed.Client(cluster, set_as_default=False) as client,
        ):
            yield client
        return
    address = where if ADDRESS.fullmatch(where) else _address_in(where)
    try:
        client = distributed.Client(address, timeout=CONNECT_SECONDS, set_as_default=False)
    except (OSError, TimeoutError, ValueError) as error:
        reason = str(error).splitlines()[0] if str(error) else type(error).__name__
        raise InputError(f"--cluster {where}: no scheduler answers at {address} ({reason})") from None
    with client:
        yield client


def _address_in(where: str) -> str:
    """Return the scheduler's address out of its file."""
    if not where.endswith(".json"):
        raise InputError(
            f'--cluster: "{where}" is no cluster; must be local:N, tcp://HOST:PORT, tls://HOST:PORT '
            "or a scheduler FILE.json"
        )
    try:
        with open(where, "rb") as file:
            address = json.loads(file.read(MOST_FILE_BYTES))["address"]
    except OSError as error:
        raise InputError(f"--cluster {where}: cannot be read: {error.strerror}") from None
    except (ValueError, KeyError, TypeError, RecursionError):
        raise InputError(f"--cluster {where}: is no scheduler file: it names no address") from None
    if not (isinstance(address, str) and ADDRESS.fullmatch(address)):
        raise InputError(f"--cluster {where}: address: {json.dumps(address)} is no tcp:// or tls:// address")
    return address


def _refuse_foreign_workers(client: Any, where: str) -> None:
    answers: Mapping[str, Any] = client.run(worker_fingerprint, on_error="return")
    for worker, answer in answers.items():
        if reason := _why_foreign(answer):
            raise InputError(f"--cluster {where}: worker {worker} is refused: {reason}")


def _end_at_foreign_workers(client: Any, joined: list[str]) -> None:
    """Raise ForeignWorker where one that joined late could never help: waiting for its first batch may take long."""
    answers: Mapping[str, Any] = client.run(worker_fingerprint, workers=joined, on_error="return")
    for worker, answer in answers.items():
        if reason := _why_foreign(answer):
            raise ForeignWorker(f"worker {worker} has joined and is refused: {reason}")


def _why_foreign(answer: Any) -> str:
    try:
        theirs = Fingerprint(**answer)
    except TypeError:
        return f"it has no exosphere-tracer like this one ({type(answer).__name__}: {answer})"
    changed = difference(theirs, fingerprint())
    return f"it has {changed}" if changed else ""


def worker_fingerprint() -> dict[str, str]:
    """Return the fingerprint of the worker that runs this, in plain words for a client of any version."""
    return fingerprint()._asdict()


def _load_kernels(client: Any, work: Work) -> None:
    """Have every worker load or compile what batches call; one that fails says why with its first batch."""
    client.run(load_kernels, work, on_error="ignore")


async def load_kernels(work: Work) -> None:
    """Compile or load beside the worker's own loop, which must answer its scheduler meanwhile."""
    await asyncio.to_thread(compile_kernels, work)


def trace_on_worker(work: Work, task: Task, client: Fingerprint, key: str) -> BatchResult:
    """Trace one batch on a worker, which may have come late and unseen.

    Raises
    ------
    ForeignWorker
        Where the worker's fingerprint is not the client's.
    """
    if changed := difference(fingerprint(), client):
        raise ForeignWorker(f"a worker has joined that has {changed}")
    # Compiling counts among no batch's costs; only workers that came late still have to.
    compile_kernels(work)
    return trace_batch(work, task, lambda _atoms, _flights: None, partial(_is_cancelled, key))


def _is_cancelled(key: str) -> bool:
    """Whether nobody wants the task any longer, because the run was ended or its process has died."""
    with suppress(Exception):
        state = import_module(LIBRARY).get_worker().state.tasks[key].state
        return bool(state == "cancelled")
    return False


def most_under_way(workers: int) -> int:
    """Return how many batches the scheduler may have at a time: one for each worker, and a few for those that finish.

    It gives each to a worker at once, and there they wait. The more wait, the likelier one worker has several before it
    and another none, while the window is full.
    """
    return workers + max(1, workers // 4)


def keep(work: Work) -> Work:
    """Return `work`: as a task of its own it is sent once, and made again if its worker dies."""
    return work


def shared_out(client: Any, work: Work, key: str) -> Any:
    """Return `work` as a task that every worker has done.

    The scheduler gives batches to workers that have what they need: with the work on one alone, the others would wait
    until it steals for them, some for as long as a batch takes.
    """
    shared = client.submit(keep, work, key=key, pure=False)
    with _loss_told():
        client.replicate([shared])
    return shared


def _map_batches(
    distributed: Any,
    client: Any,
    note: Note,
    work: Work,
    tasks: Sequence[Task],
    workers: int,
    tell: Tell,
    tick: Tick,
) -> Generator[tuple[Task, BatchResult], None, None]:
    """Yield (task, result) for each task, in the order in which they finish; see `tracer.engine.executors.seam`."""
    run = f"tracer-{uuid4().hex}"
    shared = shared_out(client, work, f"{run}-work")
    queue = Queue(tasks)
    census = _Census(client, note, workers)
    running: dict[Any, tuple[int, Task, int]] = {}
    arrival = Event()

    def submit(place: int, task: Task, trial: int) -> None:
        key = f"{run}-{place}-{trial}"
        with _loss_told():
            future = client.submit(trace_on_worker, shared, task, fingerprint(), key, key=key, pure=False)
            future.add_done_callback(lambda _future: arrival.set())
        running[future] = place, task, trial

    try:
        while True:
            present = census.workers()
            startable = queue.startable(window(present, len(work.scene.releases)))
            for place, task in islice(startable, max(0, most_under_way(present) - len(running))):
                submit(place, task, 1)
            if not running:
                return
            arrival.wait(POLL_SECONDS)
            arrival.clear()
            if client.status != "running":
                raise TracerError(LOST)
            for future in [future for future in running if future.done()]:
                place, task, trial = running.pop(future)
                result = _result(distributed, future, trial)
                if result is None:
                    submit(place, task, trial + 1)
                    continue
                tell(work.launches, result.flights)
                yield task, result
                queue.finish(place)
            tick()
    finally:
        with suppress(Exception):
            client.cancel([*running, shared], force=True)


def _result(distributed: Any, future: Any, trial: int) -> BatchResult | None:
    """Return a finished batch; None where its workers have died and it must be sent again."""
    try:
        with _loss_told():
            return BatchResult(*future.result())
    except distributed.KilledWorker:
        if trial < MOST_TRIALS:
            return None
        raise TracerError(f"the workers of one batch have died {MOST_TRIALS} times") from None


@contextmanager
def _loss_told() -> Iterator[None]:
    """Say in our words what the library says in many when the scheduler has gone."""
    try:
        yield
    except (futures.CancelledError, asyncio.CancelledError, OSError, TimeoutError):
        raise TracerError(LOST) from None


@contextmanager
def _library_hushed() -> Iterator[None]:
    """Keep the library's own log off the terminal: what matters is told by events."""
    loggers = [
        logging.getLogger(name) for name in logging.root.manager.loggerDict if name.startswith(LIBRARY)
    ]
    levels = [logger.level for logger in loggers]
    for logger in loggers:
        logger.setLevel(logging.CRITICAL + 1)
    try:
        yield
    finally:
        for logger, level in zip(loggers, levels, strict=True):
            logger.setLevel(level)


class _Census:
    """How many workers there are, asked now and then, with a word about those that come and go."""

    def __init__(self, client: Any, note: Note, workers: int) -> None:
        self._client = client
        self._note = note
        self._known: dict[str, int] = {}
        self._workers = workers
        self._asked = -SECONDS_BETWEEN_CENSUSES

    def workers(self) -> int:
        """Return the batches that can be traced side by side, at least 1."""
        if monotonic() - self._asked >= SECONDS_BETWEEN_CENSUSES:
            with suppress(OSError, TimeoutError):
                self._compare(dict(self._client.nthreads()))
            self._asked = monotonic()
        return max(1, self._workers)

    def _compare(self, present: dict[str, int]) -> None:
        if self._known:
            for address in self._known.keys() - present.keys():
                self._note("worker lost", f"worker {address} is lost; its batches run again", worker=address)
            joined = sorted(present.keys() - self._known.keys())
            for address in joined:
                self._note("worker joined", f"worker {address} has joined", worker=address)
            if joined:
                _end_at_foreign_workers(self._client, joined)
        self._known = present
        self._workers = sum(present.values())

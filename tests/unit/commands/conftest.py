"""Commands as real processes that start in a blink: copies of one process in which all is loaded."""

import itertools
import json
import os
import subprocess
import sys
import time
from collections.abc import Callable, Iterator, Sequence
from pathlib import Path
from typing import NamedTuple

import pytest

MOTHER = """
import json, os, resource, signal, sys, traceback
import tracer.engine.checkpoint_slots as slots
from tracer.__main__ import main
from tracer.commands import merge, run, summary, sweep
from tracer.engine.batches import compile_kernels, make_work
from tracer.engine.runspec.load import load_run
from tracer.engine.scene import build_scene
signal.signal(signal.SIGINT, signal.default_int_handler)
compile_kernels(make_work(build_scene(load_run(sys.argv[1])), 1, 1))
print("ready", flush=True)

def child(order):
    os.setpgid(0, 0)
    os.chdir(order["folder"])
    for number, name in ((0, os.devnull), (1, order["stdout"]), (2, order["stderr"])):
        os.dup2(os.open(name, os.O_RDWR | os.O_CREAT | os.O_TRUNC, 0o600), number)
    slots.SHORTEST_INTERVAL = order["interval"]
    slots.COST_SHARE = 1.0
    if order["file_size"]:
        resource.setrlimit(resource.RLIMIT_FSIZE, (order["file_size"], order["file_size"]))
    exec(order["code"], {})
    if order["words"]:
        main(order["words"])

for line in sys.stdin:
    order = json.loads(line)
    if "wait" in order:
        print(os.waitstatus_to_exitcode(os.waitpid(order["wait"], 0)[1]), flush=True)
        continue
    exec(order["before"], {})
    pid = os.fork()
    if pid == 0:
        code = 70
        try:
            child(order)
            code = 0
        except SystemExit as end:
            code = end.code or 0
        except BaseException:
            traceback.print_exc()
        finally:
            sys.stdout.flush()
            sys.stderr.flush()
            os._exit(code)
    print(pid, flush=True)
"""

WARMING = """
title = "Warming"
body = { name = "Ball", radius = "1000 km", gm = "3000 km3 s-2" }
gas = { species = "He" }
surface = { sticking = 1.0 }
domain = { outer_radius = "20 radii" }
[[release]]
name = "vent"
rate = "1e20 s-1"
speed = { law = "maxwell-flux", temperature = "300 K" }
"""


class Done(NamedTuple):
    """How a process has ended; a negative code is the signal that killed it."""

    code: int
    out: str
    err: str


class Running(NamedTuple):
    """A process at work."""

    pid: int
    folder: Path
    files: tuple[Path, Path]
    ask: Callable[[dict[str, object]], str]

    def wait(self) -> Done:
        """Return how it ended."""
        code = int(self.ask({"wait": self.pid}))
        return Done(code, *(path.read_text(encoding="utf-8") for path in self.files))

    def signal(self, number: int) -> None:
        """Send a signal."""
        os.kill(self.pid, number)

    def wait_until(self, true: Callable[[], bool], seconds: float = 10.0) -> None:
        """Wait until something is so, and fail where it does not come."""
        end = time.monotonic() + seconds
        while not true():
            assert time.monotonic() < end, self.files[1].read_text(encoding="utf-8")
            time.sleep(0.002)


Start = Callable[..., Running]


@pytest.fixture(scope="session")
def mother(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Callable[[dict[str, object]], str]]:
    """Yield a function that sends an order to the process from which the others are copied."""
    if not hasattr(os, "fork"):
        pytest.skip("processes are copied by fork")
    run_file = tmp_path_factory.mktemp("warming") / "warming.toml"
    run_file.write_text(WARMING, encoding="utf-8")
    command = [sys.executable, "-c", MOTHER, str(run_file)]
    with subprocess.Popen(command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True) as process:
        assert process.stdin
        assert process.stdout
        source, sink = process.stdout, process.stdin
        assert source.readline() == "ready\n"

        def ask(order: dict[str, object]) -> str:
            print(json.dumps(order), file=sink, flush=True)
            return source.readline().strip()

        yield ask
        process.kill()


@pytest.fixture
def start(mother: Callable[[dict[str, object]], str], tmp_path: Path) -> Start:
    """Return a function that starts a command in `tmp_path`, with checkpoints at least `interval` seconds apart.

    `code` runs in the new process before the command, `before` in the process from which all are copied.
    """

    numbers = itertools.count()

    def begin(
        words: Sequence[str] = (),
        interval: float = 0.05,
        file_size: int = 0,
        code: str = "",
        before: str = "",
    ) -> Running:
        number = next(numbers)
        files = (tmp_path / f"{number}.out", tmp_path / f"{number}.err")
        for path in files:
            path.touch()
        order = {"words": list(words), "folder": str(tmp_path), "interval": interval, "file_size": file_size}
        order |= {"stdout": str(files[0]), "stderr": str(files[1]), "code": code, "before": before}
        pid = int(mother(order))
        return Running(pid, tmp_path, files, mother)

    return begin

"""A page whose texts try to break out of it, and a browser to look at it, one start for all tests of a process."""

import itertools
import json
import os
import select
import shutil
import subprocess
import sys
import time
from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest
import xarray as xr

from tracer.plots.page import document
from tracer.plots.page.document import report_page
from tracer.plots.page.figure_list import product_figures
from tracer.plots.plan_table import read_plan

HOSTILE = '<script>document.title = "broken"</script>"><img src=x onerror="document.title=1">'
HEADS = (
    "time,tangent_altitude_km,brightness_na_d2_rayleigh,brightness_na_d2_standard_error_rayleigh,snr,thick,"
    "do_not_command,command\n"
)
PLAN = """2031-06-01T00:00:00,900,2e5,1e3,9,False,False,after flight rules
2031-06-01T00:01:00,20,2e6,1e4,100,True,False,after flight rules
2031-06-01T00:02:00,,nan,nan,,False,False,<b onclick=alert(1)>look</b>
2031-06-01T00:03:00,100,9e5,1e4,30,False,True,NOT to be commanded: Sun inside its keep-out
"""
FLAGS = (
    "--headless --no-sandbox --disable-gpu --disable-quic --no-first-run --disable-background-networking "
    "--disable-component-update --disable-sync --disable-dev-shm-usage --disable-extensions --mute-audio "
    "--remote-debugging-pipe"
)
LAUNCH = """
import fcntl, os, sys
# The protocol wants the numbers 3 and 4; first out of each other's way.
ends = [fcntl.fcntl(int(word), fcntl.F_DUPFD, 10) for word in sys.argv[1:3]]
for end, number in zip(ends, (3, 4)):
    os.dup2(end, number)
os.execv(sys.argv[3], sys.argv[3:])
"""
SECONDS = 20.0
SHOWN = ("figure-ledger", "figure-image-tail_from_north")


@pytest.fixture(scope="session")
def page(small_light_product: xr.Dataset, tmp_path_factory: pytest.TempPathFactory) -> str:
    """Return the page of a product in sunlight with a plan: texts hostile, few figures of few pixels."""
    plan = tmp_path_factory.mktemp("plan") / "plan.csv"
    plan.write_text(HEADS + PLAN, encoding="utf-8")
    product = small_light_product.assign_attrs(title=HOSTILE, git_commit=f"</pre>{HOSTILE}\x00")
    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(document, "DOTS_PER_INCH", 50)
        patch.setattr(
            document, "product_figures", lambda ds: (one for one in product_figures(ds) if one.name in SHOWN)
        )
        return report_page(product, "a & b.nc", read_plan(plan), "plan.csv")


class Browser:
    """Chromium by its DevTools protocol, over a pair of pipes."""

    def __init__(self, program: str, folder: Path) -> None:
        self._read, its_write = os.pipe()
        its_read, self._write = os.pipe()
        words = [*FLAGS.split(), f"--user-data-dir={folder}"]
        self.process = subprocess.Popen(
            [sys.executable, "-c", LAUNCH, str(its_read), str(its_write), program, *words],
            pass_fds=(its_read, its_write),
            stdout=subprocess.DEVNULL,
            stderr=subprocess.DEVNULL,
        )
        os.close(its_read)
        os.close(its_write)
        self._numbers, self._rest, self._session = itertools.count(1), b"", ""
        self.events: list[dict[str, Any]] = []

    def begin(self) -> None:
        """Open an empty window, to which all further commands go."""
        target = self.ask("Target.createTarget", url="about:blank")["targetId"]
        self._session = self.ask("Target.attachToTarget", targetId=target, flatten=True)["sessionId"]
        for domain in ("Page", "Runtime", "Log", "Network"):
            self.ask(f"{domain}.enable")

    def ask(self, method: str, **parameters: Any) -> dict[str, Any]:
        """Return the answer to one command; events on the way are kept."""
        number = next(self._numbers)
        message = {"id": number, "method": method, "params": parameters}
        if self._session:
            message["sessionId"] = self._session
        os.write(self._write, json.dumps(message).encode() + b"\0")
        while True:
            answer = self._next()
            if answer.get("id") == number:
                assert "error" not in answer, answer
                return answer["result"]
            self.events.append(answer)

    def run(self, script: str) -> Any:
        """Return the value of a script, awaited where it is a promise."""
        answer = self.ask("Runtime.evaluate", expression=script, returnByValue=True, awaitPromise=True)
        assert "exceptionDetails" not in answer, answer
        return answer["result"].get("value")

    def open(self, path: Path, width: int, height: int) -> None:
        """Show a file in a window of this size [CSS px], and wait until it is loaded."""
        self.ask(
            "Emulation.setDeviceMetricsOverride",
            width=width,
            height=height,
            deviceScaleFactor=1,
            mobile=width < 600,
        )
        self.events.clear()
        self.ask("Page.navigate", url=path.as_uri())
        while not any(event.get("method") == "Page.loadEventFired" for event in self.events):
            self.events.append(self._next())

    def close(self) -> None:
        """End the browser."""
        os.write(
            self._write, json.dumps({"id": next(self._numbers), "method": "Browser.close"}).encode() + b"\0"
        )
        try:
            self.process.wait(SECONDS)
        except subprocess.TimeoutExpired:
            self.process.kill()
            self.process.wait()
        os.close(self._read)
        os.close(self._write)

    def _next(self) -> dict[str, Any]:
        end = time.monotonic() + SECONDS
        while b"\0" not in self._rest:
            ready, _, _ = select.select([self._read], [], [], max(0.0, end - time.monotonic()))
            assert ready, "the browser does not answer"
            part = os.read(self._read, 1 << 20)
            assert part, "the browser has ended"
            self._rest += part
        message, _, self._rest = self._rest.partition(b"\0")
        return json.loads(message)


@pytest.fixture(scope="module")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Browser]:
    """Yield a headless Chromium; without one the tests are skipped."""
    program = next(filter(None, map(shutil.which, ("chromium", "chromium-browser", "google-chrome"))), None)
    if program is None:
        pytest.skip("there is no chromium: apt-get install chromium")
    one = Browser(program, tmp_path_factory.mktemp("chromium"))
    try:
        one.begin()
        yield one
    finally:
        one.close()


@pytest.fixture(scope="module")
def page_file(page: str, tmp_path_factory: pytest.TempPathFactory) -> Path:
    """Return the page as a file."""
    path = tmp_path_factory.mktemp("page") / "report.html"
    path.write_text(page, encoding="utf-8")
    return path


@pytest.fixture
def shown(browser: Browser, page_file: Path) -> Callable[..., Browser]:
    """Return a function that opens the page in a window of a size."""

    def show(width: int = 1200, height: int = 800) -> Browser:
        browser.open(page_file, width, height)
        return browser

    return show

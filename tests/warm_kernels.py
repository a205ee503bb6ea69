"""Compile kernels into the user's cache: `python tests/warm_kernels.py < RUNS`, run files parted by form feeds."""

import sys

from tracer.engine.batches import compile_kernels, make_work
from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import build_scene

if __name__ == "__main__":
    for text in sys.stdin.read().split("\f"):
        compile_kernels(make_work(build_scene(parse_run(text, "run file")), 1, 1))

"""Compile the kernels of one run file into the user's cache: `python tests/warm_kernels.py < RUN.toml`."""

import sys

from tracer.engine.batches import compile_kernels, make_work
from tracer.engine.runspec.load import parse_run
from tracer.engine.scene import build_scene

if __name__ == "__main__":
    compile_kernels(make_work(build_scene(parse_run(sys.stdin.read(), "run file")), 1, 1))

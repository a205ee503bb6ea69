"""The command that goes on with what was interrupted."""

import shlex

from tracer.commands.arguments import Tracing
from tracer.commands.next_command import resuming_command


def test_resuming_command_says_again_how_to_trace_and_nothing_else():
    plain = Tracing(workers=None, cluster=None, log=None, settings=(), overwrite=False, resume=False)
    assert resuming_command("run", "a.toml", tracing=plain) == "tracer run a.toml --resume"
    full = Tracing(2, "local:2", "my log", ["gas.species='Na'", "domain.age_limit=1 d"], True, True)
    words = shlex.split(resuming_command("sweep", "a b.toml", "-o", "c.nc", tracing=full))
    assert words == [
        *(
            "tracer",
            "sweep",
            "a b.toml",
            "-o",
            "c.nc",
            "--cluster",
            "local:2",
            "--log",
            "my log",
            "--workers",
            "2",
        ),
        *("--set", "gas.species='Na'", "--set", "domain.age_limit=1 d", "--overwrite", "--resume"),
    ]

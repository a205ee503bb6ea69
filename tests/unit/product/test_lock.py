import subprocess
import sys

import pytest

from tracer.errors import InputError
from tracer.product.lock import output_lock

HOLDER = """
import sys
from tracer.product.lock import output_lock
with output_lock(sys.argv[1]):
    print("held", flush=True)
    sys.stdin.read()
"""

TAKER = """
import sys
from tracer.errors import InputError
from tracer.product.lock import output_lock
path, counter = sys.argv[1:]
taken = 0
while taken < 200:
    try:
        with output_lock(path):
            with open(counter) as file:
                count = int(file.read())
            with open(counter, "w") as file:
                file.write(str(count + 1))
            taken += 1
    except InputError:
        pass
"""


@pytest.fixture
def holder(tmp_path):
    command = [sys.executable, "-c", HOLDER, str(tmp_path / "harrow.nc")]
    with subprocess.Popen(command, stdin=subprocess.PIPE, stdout=subprocess.PIPE, text=True) as process:
        assert process.stdout.readline() == "held\n"
        yield process
        process.kill()


def test_a_second_process_is_refused_at_once(tmp_path, holder):
    path = tmp_path / "harrow.nc"
    with pytest.raises(InputError) as refusal, output_lock(path):
        pass
    reason = "is being made by another run; wait for it, or name another output"
    assert str(refusal.value) == f"{path}: {reason}"
    with output_lock(tmp_path / "other.nc"):
        pass


def test_the_lock_of_a_dead_process_does_not_bind(tmp_path, holder):
    holder.kill()
    holder.wait()
    assert [entry.name for entry in tmp_path.iterdir()] == [".harrow.nc.lock"]
    with output_lock(tmp_path / "harrow.nc"):
        pass
    assert list(tmp_path.iterdir()) == []


def test_one_process_cannot_hold_the_lock_twice(tmp_path):
    path = tmp_path / "harrow.nc"
    with output_lock(path), pytest.raises(InputError), output_lock(path):
        pass


def test_the_lock_is_gone_after_an_error(tmp_path):
    path = tmp_path / "harrow.nc"
    with pytest.raises(ZeroDivisionError), output_lock(path):
        raise ZeroDivisionError
    assert list(tmp_path.iterdir()) == []


def test_two_names_of_one_file_share_the_lock(tmp_path):
    (tmp_path / "link.nc").symlink_to(tmp_path / "harrow.nc")
    with output_lock(tmp_path / "harrow.nc"), pytest.raises(InputError), output_lock(tmp_path / "link.nc"):
        pass


def test_two_processes_that_take_turns_never_hold_it_together(tmp_path):
    counter = tmp_path / "counter"
    counter.write_text("0")
    command = [sys.executable, "-c", TAKER, str(tmp_path / "harrow.nc"), str(counter)]
    for process in [subprocess.Popen(command) for _ in range(2)]:
        assert process.wait() == 0
    assert counter.read_text() == "400"
    assert [entry.name for entry in tmp_path.iterdir()] == ["counter"]


def test_a_missing_folder_is_refused(tmp_path):
    path = tmp_path / "nowhere" / "harrow.nc"
    with pytest.raises(InputError) as refusal, output_lock(path):
        pass
    assert str(refusal.value) == f"{path}: there is no folder {path.parent}"

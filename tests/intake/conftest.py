"""A refusal measured in a process of its own."""

import subprocess
import sys

import pytest

_SCRIPT = """
import sys, time
from importlib import import_module
from pathlib import Path
from server.lab.refusal import Unacceptable

read = getattr(import_module(sys.argv[2]), sys.argv[3])
data, start, says = Path(sys.argv[1]).read_bytes(), time.process_time(), ""
try:
    read(data)
except Unacceptable as problem:
    says = problem.says
print(time.process_time() - start)
status = dict(line.split(":", 1) for line in Path("/proc/self/status").read_text().splitlines())
print(int(status["VmHWM"].split()[0]) / 1024)  # ru_maxrss would hold the parent's peak
print(says)
"""


@pytest.fixture
def refused_by():
    """A function that returns processor seconds, peak MB of the process, and the refusal."""

    def measure(path, module, function):
        done = subprocess.run(
            [sys.executable, "-c", _SCRIPT, str(path), module, function],
            capture_output=True,
            text=True,
            check=True,
        )
        seconds, megabytes, says = done.stdout.split("\n", 2)
        return float(seconds), float(megabytes), says.strip()

    return measure

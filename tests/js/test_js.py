"""The pages' own script under node: `lib` and `outbox` know no DOM, so that this works."""

import re
import shutil
import subprocess
from pathlib import Path

import pytest

HERE = Path(__file__).parent
FILES = sorted(HERE.glob("*.test.mjs"))


@pytest.mark.parametrize("path", FILES, ids=lambda path: path.name)
def test_script_passes_its_own_tests_under_node(path, missing):
    node = shutil.which("node")
    if node is None:
        missing("node is missing: the script's own tests need it (18 or newer)")
    done = subprocess.run(
        [node, "--test", str(path)],
        capture_output=True,
        text=True,
        encoding="utf-8",
        timeout=60,
        check=False,
    )
    assert done.returncode == 0, done.stdout[-6000:] + done.stderr[-2000:]
    passed = re.search(r"pass (\d+)", done.stdout)
    assert passed, done.stdout[-2000:]
    assert int(passed[1]) > 0


def test_every_module_of_lib_and_outbox_has_tests():
    static = HERE.parents[1] / "static" / "js"
    told = "\n".join(path.read_text(encoding="utf-8") for path in FILES)
    for room in ("lib", "outbox"):
        for module in sorted((static / room).glob("*.js")):
            assert f"static/js/{room}/{module.name}" in told, f"{room}/{module.name} has no test"

"""The verb that shows and retires signing keys."""

import os
import stat
import subprocess
import sys
from datetime import UTC, datetime
from pathlib import Path

from server.credentials.signing_keys import open_signing_keys

ROOT = Path(__file__).resolve().parents[2]


def keys(data: Path, *more: str) -> subprocess.CompletedProcess[str]:
    return subprocess.run(
        [sys.executable, "-m", "server", "keys", "--data", str(data), *more],
        cwd=ROOT, env={**os.environ, "PYTHONPATH": str(ROOT), "PYTHONUTF8": "1"},
        capture_output=True, text=True, encoding="utf-8", timeout=60, check=False,
    )  # fmt: skip


def test_key_is_made_once_and_shown(tmp_path: Path) -> None:
    first, again = keys(tmp_path), keys(tmp_path)

    assert first.returncode == again.returncode == 0, first.stderr
    assert first.stdout == again.stdout
    assert first.stdout.count("signs") == 1
    (file,) = (tmp_path / "keys").iterdir()
    assert stat.S_IMODE(file.stat().st_mode) == 0o600


def test_key_that_is_retired_stays_and_another_one_signs(tmp_path: Path) -> None:
    before = open_signing_keys(tmp_path / "keys", now=datetime(2026, 5, 4, tzinfo=UTC)).current

    done = keys(tmp_path, "--retire")

    assert done.returncode == 0, done.stderr
    lines = done.stdout.splitlines()
    assert before.kid in lines[0]
    assert "retired" in lines[0]
    assert lines[1].endswith("signs")
    assert "Start the server anew" in lines[2]


def test_keys_that_others_may_read_or_without_a_folder_are_refused_in_words(tmp_path: Path) -> None:
    keys(tmp_path)
    (file,) = (tmp_path / "keys").iterdir()
    file.chmod(0o644)

    refused, nowhere = keys(tmp_path), keys(tmp_path / "elsewhere")

    assert refused.returncode == nowhere.returncode == 2
    assert "chmod 600" in refused.stderr
    assert "There is no data folder" in nowhere.stderr

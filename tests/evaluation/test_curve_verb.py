"""``python -m server evaluate`` with a record that holds curves."""

import json
import subprocess
import sys
from pathlib import Path

ROOT = Path(__file__).resolve().parents[2]


def run(path):
    return subprocess.run(
        [sys.executable, "-m", "server", "evaluate", path],
        cwd=ROOT,
        capture_output=True,
        text=True,
        encoding="utf-8",
        timeout=120,
        check=False,
    )


def test_verb_evaluates_a_record_with_curves(tmp_path, curve_records):
    path = tmp_path / "curves.json"
    path.write_text(json.dumps(curve_records.record("tris-hcl")), "utf-8")
    done = run(path)
    assert done.returncode == 0, done.stderr
    assert done.stderr == ""
    result = json.loads(done.stdout)
    curve = curve_records.curves["tris-hcl"]
    expected = curve["n_base_mmol"] / curve["equivalence_mL"]
    assert abs(result["concentration"]["value"] / expected - 1) < 3e-4
    assert [one["taken"] for one in result["methods"]] == ["model fit"] * 3


def test_verb_names_the_point_that_goes_back(tmp_path, curve_records):
    record = curve_records.record("tris-hcl")
    record["replicates"][2]["curve"]["volume_mL"][9] = "0.5"
    path = tmp_path / "curves.json"
    path.write_text(json.dumps(record), "utf-8")
    done = run(path)
    assert done.returncode == 2
    problem = json.loads(done.stderr)
    assert problem["field"] == "replicates[2].curve.volume_mL[9]"
    assert "goes back at point 10" in problem["detail"]

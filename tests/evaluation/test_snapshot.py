import json
from pathlib import Path

import pytest

from server.evaluation.calculations import CALCULATIONS, UnknownCalculation
from server.evaluation.entrance import evaluate
from server.evaluation.snapshot import make_snapshot, replay
from server.lab.canonical import digest

RECORDS = Path(__file__).parents[1] / "reference" / "records"
# A snapshot of this format, kept for ever: every later version of the program must replay it.
KEPT = Path(__file__).parents[1] / "reference" / "snapshots"


def snapshot(name="random-00", trials=20_000):
    document = json.loads((RECORDS / f"{name}.json").read_text(encoding="utf-8"))
    result = evaluate(document, trials=trials, seed=1)
    return make_snapshot(document, None, result, trials=trials)


def test_snapshot_replays_to_the_same_digits():
    made = snapshot()
    again = replay(made.text, expected_digest=made.digest)
    assert again.agrees, again.says
    assert again.shift_over_u == 0.0


def test_snapshot_is_canonical_text_with_its_digest():
    made = snapshot()
    assert digest(made.text) == made.digest
    assert (
        json.dumps(json.loads(made.text), sort_keys=True, ensure_ascii=False, separators=(",", ":"))
        == made.text
    )


@pytest.mark.parametrize("path", sorted(KEPT.glob("*.json")), ids=lambda one: one.stem)
def test_kept_snapshot_of_an_earlier_program_replays(path):
    again = replay(path.read_text(encoding="utf-8").strip())
    assert again.agrees, again.says


def test_kept_snapshots_cover_every_calculation():
    named = {
        (one["calculation"]["name"], one["calculation"]["version"])
        for one in (json.loads(path.read_text(encoding="utf-8")) for path in KEPT.glob("*.json"))
    }
    assert named == set(CALCULATIONS)


def test_replay_changed_reading_does_not_agree():
    made = snapshot()
    held = json.loads(made.text)
    held["record"]["replicates"][0].setdefault("label", "1")
    held["record"]["titrant"]["nominal"]["value"] = "0.09"
    again = replay(json.dumps(held), expected_digest=made.digest)
    assert not again.agrees
    assert "not the one" in again.says


def test_replay_unknown_calculation_is_refused_by_name():
    held = json.loads(snapshot(trials=None).text)
    held["calculation"]["version"] = 99
    with pytest.raises(UnknownCalculation, match="version 99"):
        replay(json.dumps(held))

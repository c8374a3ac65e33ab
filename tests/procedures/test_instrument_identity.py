"""What describes an instrument: written anew with a reason; originals handed over before."""

import base64

import pytest

from server.lab.refusal import NotAllowed, NotFound, SavedFirst, Unacceptable
from server.procedures.calibration_files import HandOver, hand_over
from server.procedures.instruments import (
    DescribeInstrument,
    RecordCalibration,
    describe_instrument,
    record_calibration,
)
from server.records.tables.stores import Calibration, File, Instrument

SEEN = {"maker": "Holm", "type": "example", "serial": "17", "location": "Bench 1"}


def describe(lab, described, *, reason="moved", seen=None, who="keeper"):
    command = DescribeInstrument(lab.burette, described, reason, SEEN if seen is None else seen)
    lab.act(describe_instrument, command, who)


def document(lab):
    return lab.transactions.read(lambda session: session.get(Instrument, lab.burette)).document


def test_instrument_is_described_anew_and_keeps_its_scale(lab):
    before = document(lab)
    software = "not applicable: glass"
    describe(lab, {"location": "Bench 3", "software": software, "type": ""})
    kept = {key: before[key] for key in before if key != "type"}
    assert document(lab) == kept | {"location": "Bench 3", "software": software}
    assert lab.acts()[-1] == ("Nils Obermark", "described an instrument", "instrument")
    assert lab.chain().holds


@pytest.mark.parametrize(
    ("described", "reason", "field"),
    [
        ({"resolution": "0.1"}, "x", "described.resolution"),
        ({"location": "Bench 3"}, " ", "reason"),
        ({"location": "Bench 1"}, "x", "described"),
        ({}, "x", "described"),
        ({"software": "not applicable"}, "x", "software"),
        ({"software": "a\0b"}, "x", "software"),
        ({"software": "x" * 501}, "x", "software"),
    ],
)
def test_odd_description_is_refused_by_field(shared_lab, described, reason, field):
    with pytest.raises(Unacceptable) as refused:
        describe(shared_lab, described, reason=reason)
    assert refused.value.field == field


def test_description_of_who_saw_something_older_is_refused_with_what_stands(sqlite_lab):
    describe(sqlite_lab, {"location": "Bench 3"})
    with pytest.raises(SavedFirst) as refused:
        describe(sqlite_lab, {"location": "Bench 4"})
    assert refused.value.shown["standing"]["location"] == "Bench 3"
    with pytest.raises(NotAllowed):
        describe(sqlite_lab, {"location": "Bench 4"}, who="analyst")


def test_original_is_kept_as_it_came_and_goes_with_its_calibration(lab):
    content = b"load, g;error, g\n50;0.0001\n100;0.0002\n"
    command = HandOver(lab.balance, "../B-1 table.csv", base64.b64encode(content).decode())
    file_id = lab.act(hand_over, command, "keeper")
    kept = lab.transactions.read(lambda session: session.get(File, file_id))
    assert (kept.name, kept.content) == ("B-1 table.csv", content)
    linearity = {"unit": "g", "half_width": "0.0001", "shape": "rectangular"}
    recorded = RecordCalibration(
        lab.balance, "C-9", "house", "2026-05-04", "2027-05-03", "12 months",
        {"linearity": linearity}, file_id=file_id,
    )  # fmt: skip
    made = lab.act(record_calibration, recorded, "keeper")
    found = lab.transactions.read(lambda session: session.get(Calibration, made))
    assert found.file_id == file_id
    assert lab.chain().holds
    with pytest.raises(NotAllowed):
        lab.act(hand_over, command, "analyst")
    with pytest.raises(NotFound):
        lab.act(hand_over, HandOver("none", "x.csv", command.content_base64), "keeper")


def test_calibration_with_a_file_that_is_not_kept_is_refused(shared_lab):
    linearity = {"unit": "g", "half_width": "0.0001", "shape": "rectangular"}
    recorded = RecordCalibration(
        shared_lab.balance, "C-9", "house", "2026-05-04", "2027-05-03", "12 months",
        {"linearity": linearity}, file_id="none",
    )  # fmt: skip
    with pytest.raises(Unacceptable) as refused:
        shared_lab.act(record_calibration, recorded, "keeper")
    assert refused.value.field == "file_id"

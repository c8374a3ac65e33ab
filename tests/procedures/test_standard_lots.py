"""The life of a standard lot, act by act."""

import base64
from concurrent.futures import ThreadPoolExecutor
from dataclasses import replace
from uuid import uuid4

import pytest
import sqlalchemy as sa

from server.lab.refusal import NotAllowed, NotFound, Unacceptable
from server.procedures.entries import NewEntry
from server.procedures.standard_lots import (
    AttachCertificate,
    CountStandardLot,
    OpenStandardLot,
    RecordDrying,
    RecordRetest,
    RecordUse,
    StrikeLotLine,
    attach_certificate,
    count_lot,
    open_lot,
    record_drying,
    record_retest,
    record_use,
    strike_lot_line,
)
from server.procedures.stores import ReceiveStandardLot, receive_standard_lot
from server.records.queries.list_log import log_lines
from server.records.queries.load_standard_lots import load_standard_lot_fact
from server.records.tables.stores import File, Log, StandardLot

PDF = base64.b64encode(b"%PDF-1.7 a certificate").decode()
STATED = {
    "name": "KHP lot 8", "substance": "KHP", "certificate_number": "RM-8",
    "issuer": "reference house", "due_on": "2028-01-31", "due_basis": "expiry on the certificate",
    "mass_fraction": {"value": "0.9999", "U": "0.0004", "k": "2"}, "received_g": "10.00",
    "minimum_sample_g": "0.2", "period_after_opening": "12 months",
}  # fmt: skip


def receive(lab, **given):
    return lab.act(receive_standard_lot, ReceiveStandardLot(**STATED | given), "keeper")


def fact(lab, key):
    return lab.transactions.read(lambda session: load_standard_lot_fact(session, key))


def lines(lab, key):
    return lab.transactions.read(
        lambda session: log_lines(session, "standard lot", (key,)).get(key, ())
    )


def test_standard_lot_keeps_what_the_store_adds_and_its_certificates_file(lab):
    demand = {"low_C": "110", "high_C": "120", "hours": "2", "desiccator": True}
    key = receive(
        lab, received_on="2026-05-02", retest_on="2027-06-30", drying_demand=demand,
        file_name="../RM-8.pdf", content_base64=PDF,
    )  # fmt: skip
    row = lab.transactions.read(lambda session: session.get_one(StandardLot, key))
    assert row.document["received_g"] == "10.00"
    assert row.document["received_on"] == "2026-05-02"
    assert row.document["drying_demand"] == demand
    kept = lab.transactions.read(lambda session: session.get_one(File, row.file_id))
    assert (kept.name, kept.media_type) == ("RM-8.pdf", "application/pdf")
    assert kept.content == b"%PDF-1.7 a certificate"
    found = fact(lab, key)
    assert found.due_basis == "re-test day"
    assert found.due_at.isoformat() == "2027-06-30T22:00:00+00:00"


@pytest.mark.parametrize(
    ("given", "field"),
    [
        ({"received_g": "-1"}, "received_g.value"),
        ({"received_g": "much"}, "received_g.value"),
        ({"received_on": "2026-05-05"}, "received_on"),
        ({"received_on": "lately"}, "received_on"),
        ({"period_after_opening": "a while"}, "period_after_opening"),
        ({"period_after_opening": "51 years"}, "period_after_opening"),
        ({"retest_on": "2026-05-03"}, "retest_on"),
        ({"drying_demand": {"low_C": "120"}}, "drying_demand.high_C"),
        ({"drying_demand": {"colour": "white"}}, "drying_demand.colour"),
        ({"file_name": "x.pdf"}, "content_base64"),
        ({"file_name": "x.exe", "content_base64": "TVqQAAM="}, "content_base64"),
        ({"content_base64": PDF}, "file_name"),
    ],
)
def test_standard_lot_odd_statement_of_the_store_is_refused_by_field(shared_lab, given, field):
    with pytest.raises(Unacceptable) as refused:
        receive(shared_lab, **given)
    assert refused.value.field == field


def test_opening_begins_the_period_and_is_noted_in_ink(lab):
    key = receive(lab)
    line = lab.act(open_lot, OpenStandardLot(key, "2026-05-02"), "analyst")
    assert fact(lab, key).due_basis == "period after opening, 12 months from 2026-05-02"
    assert lab.acts()[-1] == ("Ida Mohnke", "opened a standard lot", "standard lot")
    with pytest.raises(NotAllowed, match="was opened on 2026-05-02"):
        lab.act(open_lot, OpenStandardLot(key, "2026-05-03"), "keeper")
    with pytest.raises(sa.exc.DatabaseError):
        lab.transactions.write(
            lambda session: session.execute(
                sa.update(Log).where(Log.id == line).values(document={"day": "2026-01-01"})
            )
        )
    strike = StrikeLotLine(key, line, "another container")
    lab.act(strike_lot_line, strike, "keeper")
    assert fact(lab, key).due_basis == "expiry on the certificate"
    assert [one.struck.reason for one in lines(lab, key)] == ["another container"]
    lab.act(open_lot, OpenStandardLot(key, "2026-05-03"), "analyst")
    assert fact(lab, key).due_basis.endswith("from 2026-05-03")
    assert lab.chain().holds


def test_lapsed_by_its_opening_a_lot_is_refused_at_the_bench(sqlite_lab):
    lab = sqlite_lab
    key = receive(lab, period_after_opening="1 days")
    lab.act(open_lot, OpenStandardLot(key, "2026-05-02"), "analyst")
    with pytest.raises(Unacceptable, match="period after opening, 1 days from 2026-05-02"):
        lab.begin(standard_lot_id=key)
    override = {"override_reason": "container was sealed again under argon"}
    assert lab.begin(who="all hands", standard_lot_id=key, **override)


def test_drying_is_kept_as_typed_with_its_instant(lab):
    key = receive(lab)
    command = RecordDrying(key, "2026-05-04T10:15", "115.0", "2", desiccator=True, says="oven 2")
    lab.act(record_drying, command, "analyst")
    (line,) = lines(lab, key)
    # 10:15 in Berlin in summer
    assert line.document == {
        "temperature": "115.0", "hours": "2", "desiccator": True, "says": "oven 2",
        "ended_at": "2026-05-04T08:15:00+00:00",
    }  # fmt: skip
    with_offset = replace(command, ended_at="2026-05-04T08:15:00+00:00")
    lab.act(record_drying, with_offset, "analyst")
    assert lines(lab, key)[1].document["ended_at"] == line.document["ended_at"]


@pytest.mark.parametrize(
    ("given", "field"),
    [
        ({"ended_at": "2026-05-04T10:31"}, "ended_at"),
        ({"ended_at": "yesterday"}, "ended_at"),
        ({"ended_at": "0001-01-01T00:00"}, "ended_at"),
        ({"hours": ""}, "hours"),
        ({"temperature": ""}, "temperature"),
        ({"temperature": "hot"}, "temperature"),
        ({"temperature": "1300"}, "temperature"),
        ({"hours": "-1"}, "hours"),
        ({"says": "a\0"}, "says"),
    ],
)
def test_drying_that_cannot_be_is_refused_by_field(shared_lab, given, field):
    usual = {"ended_at": "2026-05-04T10:00", "temperature": "115", "hours": "2"}
    command = RecordDrying(shared_lab.standard_lot, **usual | given)
    with pytest.raises(Unacceptable) as refused:
        shared_lab.act(record_drying, command, "analyst")
    assert refused.value.field == field


def test_use_by_hand_beyond_what_is_left_is_refused_and_a_count_begins_anew(lab):
    key = receive(lab)
    lab.act(record_use, RecordUse(key, "9.50", "loss on drying"), "analyst")
    with pytest.raises(Unacceptable, match=r"Only 0\.50 g") as refused:
        lab.act(record_use, RecordUse(key, "0.51", "loss on drying"), "analyst")
    assert (refused.value.field, refused.value.example) == ("mass_g", "0.50")
    lab.clock.move(minutes=1)
    lab.act(count_lot, CountStandardLot(key, "1.2"), "keeper")
    lab.clock.move(minutes=1)
    lab.act(record_use, RecordUse(key, "1.2", "the rest, for another laboratory"), "analyst")
    with pytest.raises(Unacceptable, match=r"Only 0\.0 g"):
        lab.act(record_use, RecordUse(key, "0.1", "more"), "analyst")


def test_use_counts_the_weighings_of_sheets(sqlite_lab):
    lab = sqlite_lab
    key = receive(lab, received_g="1.30")
    sheet = lab.begin(standard_lot_id=key)
    written = lab.write_lines([(0, "step:mixed", "done"), *first_replicate("60.4084")], sheet=sheet)
    with pytest.raises(Unacceptable, match=r"Only 0\.8916 g"):
        lab.act(record_use, RecordUse(key, "0.9", "x"), "analyst")
    # a weighing struck through is not counted
    struck = next(one.id for one in written if one.position == 2)
    lab.write(
        entry("container_and_standard", "60.6084", strikes=struck, reason="misread"), sheet=sheet
    )
    with pytest.raises(Unacceptable, match=r"Only 0\.6916 g"):
        lab.act(record_use, RecordUse(key, "0.9", "x"), "analyst")


def first_replicate(full):
    return [(1, "container_and_standard", full), (1, "container_less_standard", "60.0000")]


def entry(slot, text, **more):
    return NewEntry(id=str(uuid4()), replicate=1, slot=slot, text=text, **more)


@pytest.mark.parametrize(
    ("mass", "says", "field"),
    [
        ("0", "x", "mass_g"),
        ("-1", "x", "mass_g"),
        ("", "x", "mass_g"),
        ("1,0", "x", "mass_g"),
        ("1", " ", "says"),
    ],
)
def test_use_that_cannot_be_is_refused_by_field(shared_lab, mass, says, field):
    with pytest.raises(Unacceptable) as refused:
        shared_lab.act(record_use, RecordUse(shared_lab.standard_lot, mass, says), "analyst")
    assert refused.value.field == field


def test_last_of_a_lot_taken_by_eight_at_once_is_taken_once(lab):
    key = receive(lab, received_g="1.0")

    def take(n):
        who = ("analyst", "second analyst")[n % 2]
        try:
            return lab.act(record_use, RecordUse(key, "0.7", f"use {n}"), who)
        except Unacceptable:
            return None

    with ThreadPoolExecutor(8) as pool:
        answers = list(pool.map(take, range(8)))
    assert sum(one is not None for one in answers) == 1
    assert len(lines(lab, key)) == 1


def test_retest_carries_the_day_on_and_is_a_keepers(sqlite_lab):
    lab = sqlite_lab
    key = receive(lab, retest_on="2026-12-31")
    command = RecordRetest(key, "2026-05-04", "2027-05-31", "0.9999 against lot 7, unchanged")
    with pytest.raises(NotAllowed):
        lab.act(record_retest, command, "analyst")
    line = lab.act(record_retest, command, "keeper")
    assert fact(lab, key).due_at.isoformat() == "2027-05-31T22:00:00+00:00"
    with pytest.raises(NotAllowed):
        lab.act(strike_lot_line, StrikeLotLine(key, line, "x"), "analyst")
    assert lines(lab, key)[0].struck is None
    for given, field in (
        ({"done_on": "2026-05-05"}, "done_on"),
        ({"next_on": "2026-05-04"}, "next_on"),
        ({"says": ""}, "says"),
    ):
        with pytest.raises(Unacceptable) as refused:
            lab.act(record_retest, replace(command, **given), "keeper")
        assert refused.value.field == field


def test_certificate_file_is_replaced_with_a_reason_and_the_first_one_stays(lab):
    key = receive(lab, file_name="RM-8.pdf", content_base64=PDF)
    scan = base64.b64encode(b"%PDF-1.7 page 1 and 2").decode()
    with pytest.raises(Unacceptable, match="There is a file already") as refused:
        lab.act(attach_certificate, AttachCertificate(key, "new.pdf", scan), "keeper")
    assert refused.value.field == "reason"
    command = AttachCertificate(key, "new.pdf", scan, "page 2 was missing")
    second = lab.act(attach_certificate, command, "keeper")
    row = lab.transactions.read(lambda session: session.get_one(StandardLot, key))
    assert row.file_id == second
    names = lab.transactions.read(lambda session: session.scalars(sa.select(File.name)).all())
    assert sorted(names) == ["RM-8.pdf", "new.pdf"]


def test_strike_without_reason_of_another_lots_line_or_twice_is_refused(sqlite_lab):
    lab = sqlite_lab
    key = receive(lab)
    line = lab.act(record_use, RecordUse(key, "0.5", "x"), "analyst")
    with pytest.raises(Unacceptable):
        lab.act(strike_lot_line, StrikeLotLine(key, line, " "), "analyst")
    with pytest.raises(NotFound):
        lab.act(strike_lot_line, StrikeLotLine(lab.standard_lot, line, "x"), "analyst")
    lab.act(strike_lot_line, StrikeLotLine(key, line, "wrong lot"), "second analyst")
    with pytest.raises(NotAllowed, match="already"):
        lab.act(strike_lot_line, StrikeLotLine(key, line, "again"), "analyst")


@pytest.mark.parametrize("who", ["countersigner", "reader", "steward"])
def test_log_of_a_lot_is_written_by_analysts_and_keepers_alone(shared_lab, who):
    with pytest.raises(NotAllowed):
        shared_lab.act(open_lot, OpenStandardLot(shared_lab.standard_lot, "2026-05-04"), who)

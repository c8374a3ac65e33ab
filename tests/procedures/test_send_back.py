"""Sent back with remarks on rows: seen at the row and in the history, also after the next round."""

import pytest

from server.lab.refusal import NotAllowed, Stale, Unacceptable
from server.lab.sheet_facts import RowRemark
from server.lab.signing import signature_holds, trail_seen
from server.procedures.countersign import Countersign, countersign_sheet
from server.procedures.send_back import SendBack, send_back_sheet
from server.sheets.bench_sheet import open_bench_sheet
from server.sheets.countersigning import open_countersign
from server.sheets.queue import open_queue
from tests.procedures.conftest import all_lines

SLIP = RowRemark(2, "burette_end", "is 20.08 a slip?")
WARM = RowRemark(0, "temperature", "read where?")


def waiting(lab):
    lab.write_lines(all_lines())
    lab.hand_in()
    return lab


def send_back(lab, remark="", *rows, who="countersigner", revision=None):
    command = SendBack(lab.sheet, revision or lab.facts().revision, remark, rows)
    return lab.act(send_back_sheet, command, who)


def open_page(lab, opener, who="countersigner", *given):
    return lab.transactions.read(
        lambda session: opener(session, *given, actor=lab.people[who], now=lab.clock())
    )


def row_of(page, remark):
    place = (remark.replicate, remark.slot, remark.segment)
    (found,) = [
        row
        for group in page.groups
        for row in group.rows
        if (row.replicate, row.slot, row.segment) == place
    ]
    return found


def test_remarks_stand_at_their_rows_and_in_the_trail(lab):
    send_back(waiting(lab), "two things", SLIP, WARM)
    facts = lab.facts()
    assert facts.state == "sent back"
    (once,) = facts.returns
    assert (once.by, once.remark, once.rows) == ("Lene Tiedt", "two things", (SLIP, WARM))
    page = open_page(lab, open_bench_sheet, "analyst", lab.sheet)
    (at_row,) = row_of(page, SLIP).remarks
    assert (at_row.text, at_row.by) == ("is 20.08 a slip?", "Lene Tiedt")
    assert page.sent_back.rows == (
        ("Replicate 2, Burette, end", "is 20.08 a slip?"),
        ("Sheet, Temperature of the titrant", "read where?"),
    )
    assert "Replicate 2, Burette, end: is 20.08 a slip?" in page.sent_back_remark
    assert lab.chain().holds


def test_remarks_are_still_there_when_the_sheet_comes_back_corrected(lab):
    send_back(waiting(lab), "", SLIP)
    lab.correct((2, "burette_end", 1), "20.05", "misread")
    # the first correction takes the sheet up again; the remark stays in view
    assert open_page(lab, open_bench_sheet, "analyst", lab.sheet).sent_back.rows
    lab.hand_in()
    page = open_page(lab, open_countersign, "countersigner", lab.sheet)
    assert row_of(page, SLIP).remarks[0].text == "is 20.08 a slip?"
    assert [one.rows for one in page.returns] == [
        (("Replicate 2, Burette, end", "is 20.08 a slip?"),)
    ]
    says = [one.says for one in page.to_see]
    assert says == ["1 entry struck through", "Sent back 1 time before"]
    assert page.to_see[0].rows == (("Replicate 2, Burette, end", "row-2-burette_end-1"),)
    (line,) = open_page(lab, open_queue).waiting
    assert line.notes == "1 entry struck through, 1 time sent back"
    lab.countersign()
    assert lab.facts().state == "countersigned"


def test_remark_on_the_whole_alone_is_enough_and_so_is_one_on_a_row(sqlite_lab):
    send_back(waiting(sqlite_lab), "look again")
    assert sqlite_lab.facts().sent_back_remark == "look again"
    sqlite_lab.hand_in()
    send_back(sqlite_lab, "", SLIP)
    assert [len(one.rows) for one in sqlite_lab.facts().returns] == [0, 1]


@pytest.mark.parametrize(
    ("remark", "rows", "field", "says"),
    [
        ("", (), "remark", "Say in a remark"),
        ("  ", (RowRemark(1, "burette_end", "  "),), "remark", "Say in a remark"),
        ("x" * 10_000, (), "remark", "up to 2000 characters; this has 10000"),
        (
            "",
            (SLIP, RowRemark(1, "burette_end", "x" * 10_000)),
            "remarks[1].text",
            "The remark on Replicate 1, Burette, end takes up to 2000 characters",
        ),
        ("", (RowRemark(1, "colour", "which?"),), "slot", "no row “colour”"),
        ("", (RowRemark(99, "burette_end", "which?"),), "replicate", "replicate must be"),
        ("", (SLIP, SLIP), "remarks[1]", "has two remarks"),
        ("", (SLIP,) * 51, "remarks", "Up to 50 rows"),
    ],
)
def test_send_back_that_says_nothing_or_nothing_sensible_is_refused(
    sqlite_lab, remark, rows, field, says
):
    before = waiting(sqlite_lab).facts()
    with pytest.raises(Unacceptable) as refused:
        send_back(sqlite_lab, remark, *rows)
    assert refused.value.field == field
    assert says in refused.value.says
    assert sqlite_lab.facts() == before


def test_send_back_of_a_sheet_that_was_sent_back_a_second_ago_is_refused(sqlite_lab):
    revision = waiting(sqlite_lab).facts().revision
    send_back(sqlite_lab, "", SLIP)
    with pytest.raises(NotAllowed, match="This sheet is sent back"):
        send_back(sqlite_lab, "", WARM, who="second countersigner")
    sqlite_lab.hand_in()
    with pytest.raises(Stale):
        send_back(sqlite_lab, "", WARM, who="second countersigner", revision=revision)


def sign(lab, seen):
    command = Countersign(lab.sheet, lab.facts().revision, trail_seen=seen)
    return lab.act(countersign_sheet, command, "countersigner", proof=lab.proof("countersigner"))


def test_signature_notes_the_trail_that_was_seen_and_is_bound_to_it(lab):
    # R044
    seen = waiting(lab).last_act()
    sign(lab, seen)
    second = lab.facts().signatures[-1]
    assert trail_seen(second) == seen
    snapshot = lab.facts().evaluation.snapshot_digest
    assert signature_holds(second, lab.facts(), snapshot)
    second.reasons["trail_seen"] = seen - 1
    assert not signature_holds(second, lab.facts(), snapshot)


def test_signature_without_the_trail_read_to_its_end_is_refused(sqlite_lab):
    last = waiting(sqlite_lab).last_act()
    with pytest.raises(Unacceptable, match=f"its last act is no. {last}") as unread:
        sign(sqlite_lab, 0)
    assert unread.value.field == "trail_seen"
    with pytest.raises(Unacceptable):
        sign(sqlite_lab, last + 1)
    with pytest.raises(Stale, match=f"up to act {last - 1}, act {last} was noted"):
        sign(sqlite_lab, last - 1)
    assert sqlite_lab.facts().state == "handed in"

"""Watching bottles and lots, on both engines: one notice per change, told once."""

from datetime import timedelta

import pytest
import sqlalchemy as sa

from server.lab.refusal import NotFound, Unacceptable
from server.procedures.holds import HoldThing, ReleaseThing, hold_thing, release_thing
from server.procedures.letters import NewLetter, keep_letters
from server.procedures.lots import (
    ConfirmPull,
    FillBottles,
    ProposePull,
    confirm_pull,
    fill_bottles,
    propose_pull,
)
from server.procedures.watches import (
    ReadNotices,
    SendNotices,
    StopWatching,
    WatchThing,
    read_notices,
    send_notices,
    stop_watching,
    watch_thing,
)
from server.records.tables.shelf import Watch
from server.sheets.letters import open_letters
from server.sheets.notices_page import count_unread, open_notices


def watch(lab, who="reader", kind="bottle"):
    return lab.act(watch_thing, WatchThing(kind, lab.bottle), who)


def page(lab, who="reader"):
    return lab.transactions.read(
        lambda session: open_notices(session, actor=lab.people[who], now=lab.clock())
    )


def unread(lab, who="reader"):
    person = lab.people[who].person_id
    counted = lab.transactions.read(lambda session: count_unread(session, person, now=lab.clock()))
    assert counted == page(lab, who).unread
    return counted


def states(lab, who="reader"):
    return [one.state for one in reversed(page(lab, who).notices)]


def test_every_change_is_one_notice_whether_a_person_or_time_made_it(certified):
    lab = certified
    watch(lab)
    assert unread(lab) == 0
    lab.clock.move(hours=1)
    lab.act(hold_thing, HoldThing("bottle", lab.bottle, "cloudy"), "analyst")
    assert (unread(lab), states(lab)) == (1, ["held"])
    lab.clock.move(hours=1)
    lab.act(release_thing, ReleaseThing("bottle", lab.bottle, "filtered"), "keeper")
    assert states(lab) == ["held", "in force"]
    lab.clock.move(days=12)
    assert states(lab) == ["held", "in force", "check due"]
    lab.clock.move(days=30)
    assert (unread(lab), states(lab)) == (4, ["held", "in force", "check due", "lapsed"])
    lab.act(propose_pull, ProposePull(lab.lot, "old"), "keeper")
    lab.act(confirm_pull, ConfirmPull(lab.lot), "countersigner")
    assert states(lab)[-1] == "pulled"
    newest, *_, oldest = page(lab).notices
    assert newest.says.endswith("Why: old.")
    assert oldest.says.endswith("Why: cloudy.")


def test_new_certificate_tells_number_and_date_once(sqlite_lab):
    lab = sqlite_lab
    watch(lab)
    watch(lab, kind="lot")
    lab.certify()
    notices = page(lab).notices
    assert len(notices) == 2  # one for the bottle, one for the lot
    for notice in notices:
        assert notice.state == "in force"
        assert "Certificate TL-2026-0001: 0." in notice.says
        assert "Good until 18 May 2026" in notice.says


def test_notices_read_are_counted_no_more_and_stay_listed(certified):
    lab = certified
    watch(lab)
    lab.clock.move(days=12)
    until = page(lab).read_until
    lab.act(read_notices, ReadNotices(until), "reader")
    assert (unread(lab), len(page(lab).notices)) == (0, 1)
    lab.clock.move(days=30)
    assert (unread(lab), len(page(lab).notices)) == (1, 2)
    lab.act(read_notices, ReadNotices(until), "reader")  # an old page sends its instant again
    assert unread(lab) == 1


def test_watch_is_ones_own_and_ends_where_one_says(certified):
    lab = certified
    watch(lab)
    assert unread(lab, "analyst") == 0
    lab.clock.move(hours=1)
    lab.act(stop_watching, StopWatching("bottle", lab.bottle), "reader")
    lab.act(stop_watching, StopWatching("bottle", lab.bottle), "reader")
    lab.clock.move(days=60)
    assert (unread(lab), page(lab).watches) == (0, ())
    watch(lab)
    assert unread(lab) == 0  # what was before the second watch is not told


def test_watching_twice_is_one_watch(lab):
    assert watch(lab) == watch(lab)
    assert lab.transactions.read(lambda session: len(session.scalars(sa.select(Watch)).all())) == 1


def test_count_takes_the_same_statements_for_one_watch_and_for_many(certified):
    lab = certified
    person = lab.people["reader"].person_id

    def statements():
        seen = []
        engine = lab.transactions.database.reader
        listen = (engine, "before_cursor_execute", lambda *told: seen.append(told[2]))
        sa.event.listen(*listen)
        unread(lab)
        sa.event.remove(*listen)
        return len(seen)

    lab.transactions.read(lambda session: count_unread(session, person, now=lab.clock()))
    watch(lab)
    few = statements()
    for code in lab.act(fill_bottles, FillBottles(lab.lot, "Shelf 2", "500", 5), "analyst"):
        lab.act(watch_thing, WatchThing("bottle", code), "reader")
    watch(lab, kind="lot")
    assert statements() == few


@pytest.mark.parametrize(
    ("kind", "thing", "refusal"),
    [
        ("bottle", "00000000", NotFound),
        ("bottle", "XXXXXXXX", NotFound),
        ("instrument", "00000000", Unacceptable),
    ],
)
def test_unknown_thing_cannot_be_watched(sqlite_lab, kind, thing, refusal):
    with pytest.raises(refusal):
        sqlite_lab.act(watch_thing, WatchThing(kind, thing), "reader")


@pytest.mark.parametrize(
    "address",
    [
        "ida",
        "ida@",
        "@x.example",
        "a@b.example,c@d.example",
        "a b@c.example",
        "i@x\nBcc: y@z.example",
    ],
)
def test_address_that_is_none_is_refused(sqlite_lab, address):
    with pytest.raises(Unacceptable) as refused:
        sqlite_lab.act(send_notices, SendNotices(address), "reader")
    assert refused.value.field == "address"


def test_address_is_kept_and_taken_back(lab):
    lab.act(send_notices, SendNotices(" alba@waterworks.example "), "reader")
    assert page(lab).address == "alba@waterworks.example"
    lab.act(send_notices, SendNotices(""), "reader")
    assert page(lab).address == ""


def test_change_that_time_makes_is_to_be_written_about_once(certified):
    lab = certified

    def drafts():
        return lab.transactions.read(lambda session: open_letters(session, now=lab.clock()))

    watch(lab)
    lab.act(send_notices, SendNotices("alba@waterworks.example"), "reader")
    assert drafts() == ()
    lab.clock.move(days=12)
    (draft,) = drafts()
    assert draft.subject == f"NaOH 0.1 mol/L, bottle {lab.bottle}: check due"
    assert "Good until 18 May 2026." in draft.body
    new = NewLetter(draft.watch_id, draft.changed_at, draft.address, draft.subject, draft.body)
    for kept in (1, 0):
        assert (
            lab.transactions.write(lambda session: keep_letters(session, [new], now=lab.clock()))
            == kept
        )
    assert drafts() == ()
    lab.clock.move(days=30)
    assert [one.subject.rpartition(" ")[2] for one in drafts()] == ["lapsed"]


def test_far_future_cannot_be_read_already(sqlite_lab):
    watch(sqlite_lab)
    later = (sqlite_lab.clock() + timedelta(days=1)).isoformat()
    with pytest.raises(Unacceptable, match="future"):
        sqlite_lab.act(read_notices, ReadNotices(later), "reader")

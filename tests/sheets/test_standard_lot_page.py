"""One standard lot with its life, read from the demonstration laboratory."""

from datetime import timedelta
from decimal import Decimal

import pytest
import sqlalchemy as sa

from server.lab.refusal import NotAllowed, NotFound, NotSignedIn, Unacceptable
from server.procedures.holds import HoldThing, ReleaseThing, hold_thing, release_thing
from server.records.tables.stores import File, StandardLot
from server.sheets.files import open_file
from server.sheets.lots_page import open_lots
from server.sheets.standard_lot_page import open_standard_lot
from server.sheets.stores_page import open_stores
from server.sheets.trail_list import open_trail_list


def lot_id(demo, substance):
    asked = sa.select(StandardLot.id).where(StandardLot.substance == substance)
    return demo.transactions.read(lambda session: session.scalar(asked))


def page(demo, substance="KHP", who="jonas"):
    return demo.read(open_standard_lot, lot_id(demo, substance), who=who)


def grams(words):
    return Decimal(words.removesuffix(" g"))


def test_uses_run_down_without_a_gap_to_what_is_left(demo) -> None:
    found = page(demo)
    assert grams(found.uses[0].left) == grams(found.left)
    left = Decimal("60.00")
    for use in reversed(found.uses):
        left -= grams(use.taken)
        assert grams(use.left) == left
    assert found.left_check.verdict == "holds"


def test_uses_come_from_every_sheet_that_weighed_and_from_the_log(demo) -> None:
    found = page(demo)
    weighed = {use.name for use in found.uses if use.url}
    assert weighed == {sheet.number for sheet in found.sheets}
    (by_hand,) = [use for use in found.uses if not use.url]
    assert (by_hand.taken, by_hand.by, by_hand.may_strike) == ("1.0213 g", "Jonas Halework", True)


def test_lines_struck_through_stay_readable_with_the_reason(demo) -> None:
    found = page(demo)
    (struck,) = [line for line in found.dryings if line.struck]
    assert "0.2 h" in struck.says
    assert struck.struck.startswith("struck through by Bashir Oduya, ")
    assert struck.struck.endswith("slip of the pen: 2.0 h, not 0.2 h")
    assert not struck.may_strike
    assert found.drying_now.verdict == "holds"


def test_end_shows_every_rule_and_which_sets_it(demo) -> None:
    assert [rule.sets for rule in page(demo).rules] == [True, False]
    tris = page(demo, "TRIS")
    assert tris.due_rule.startswith("period after opening, 9 months from ")
    assert [rule.rule for rule in tris.rules if rule.sets] == [tris.due_rule]
    lines = demo.read(open_stores, who="jonas").standard_lots
    line = next(one for one in lines if one.kind == "TRIS")
    assert (line.due, line.due_rule) == (tris.due, tris.due_rule)


def test_what_rests_on_it_names_sheets_and_certificates(demo) -> None:
    found = page(demo)
    certified = [sheet for sheet in found.sheets if sheet.certificate]
    assert len(certified) == 4
    assert all(one.certificate_url == f"/certificates/{one.certificate}" for one in certified)
    assert {one.state for one in found.sheets} == {
        "countersigned", "handed in", "sent back", "open",
    }  # fmt: skip


@pytest.mark.parametrize(
    ("who", "keep", "log"),
    [("jonas", True, True), ("imke", False, True), ("ottilie", False, False)],
)
def test_what_may_be_written_depends_on_the_role(demo, who, keep, log) -> None:
    found = page(demo, who=who)
    assert (found.may_keep, found.may_log) == (keep, log)
    assert any(line.may_strike for line in found.dryings) is log


def test_holds_are_told_with_their_releases(own_demo) -> None:
    key, now = lot_id(own_demo, "KHP"), own_demo.now
    bashir, jonas = own_demo.people["bashir"], own_demo.people["jonas"]
    hold = HoldThing("standard lot", key, "lid was off")
    release = ReleaseThing("standard lot", key, "dried again and compared")
    own_demo.write(lambda s: hold_thing(s, hold, actor=bashir, now=now))
    own_demo.write(lambda s: release_thing(s, release, actor=jonas, now=now + timedelta(minutes=5)))
    own_demo.write(lambda s: hold_thing(s, hold, actor=bashir, now=now + timedelta(minutes=9)))
    standing, released = page(own_demo).holds
    assert "lid was off" in standing
    assert "Jonas Halework" in released
    assert "dried again and compared" in released


def test_file_is_read_whole_and_a_changed_one_is_refused(own_demo) -> None:
    found = page(own_demo)
    file_id = found.file.url.removeprefix("/files/")
    kept = own_demo.read(open_file, file_id, who="imke")
    assert kept.name == "certificate PH-2291-1.txt"
    assert b"0.99986" in kept.content
    assert kept.sha256 == found.file.sha256
    own_demo.without_triggers()
    changed = sa.update(File).where(File.id == file_id).values(content=b"0.99996")
    own_demo.write(lambda session: session.execute(changed))
    with pytest.raises(NotAllowed, match="no longer what was kept"):
        own_demo.read(open_file, file_id, who="imke")
    with pytest.raises(NotSignedIn):
        own_demo.read(open_file, file_id, who=None)
    with pytest.raises(NotFound):
        own_demo.read(open_file, "nothing", who="imke")


def test_lots_are_listed_by_state_with_what_is_in_force(demo) -> None:
    every = demo.read(open_lots, state="", who="imke")
    assert every.may_make_up
    assert not demo.read(open_lots, state="", who="jonas").may_make_up
    lapsed = demo.read(open_lots, state="lapsed", who="imke").lots
    assert [one.state for one in lapsed] == ["lapsed"]
    assert lapsed[0].reported == ""
    assert all(
        (one.reported != "") is (one.state in {"in force", "check due"}) for one in every.lots
    )
    with pytest.raises(NotSignedIn):
        demo.read(open_lots, state="", who=None)


def test_trail_list_refuses_an_odd_day_and_a_visitor(demo) -> None:
    asked = {"person": "", "thing": "", "day": "soon"}
    with pytest.raises(Unacceptable):
        demo.read(open_trail_list, **asked, who="imke")
    with pytest.raises(NotSignedIn):
        demo.read(open_trail_list, **asked, who=None)

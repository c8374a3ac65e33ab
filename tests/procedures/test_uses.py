"""What bottles were used for, on both engines."""

from concurrent.futures import ThreadPoolExecutor

import pytest
import sqlalchemy as sa
from sqlalchemy.exc import DBAPIError

from server.lab.refusal import NotAllowed, NotFound, SavedFirst, Unacceptable
from server.procedures.holds import HoldThing, hold_thing
from server.procedures.lots import ConfirmPull, ProposePull, confirm_pull, propose_pull
from server.procedures.uses import StrikeUse, UseBottle, strike_use, use_bottle
from server.records.tables.shelf import BottleUse
from server.sheets.uses_page import open_uses_of_bottle, open_uses_of_lot


def use(lab, result="W-1", who="analyst", **more):
    return lab.act(use_bottle, UseBottle(lab.bottle, result, **more), who)


def uses(lab, who="reader", **more):
    actor = lab.people[who]
    return lab.transactions.read(
        lambda session: open_uses_of_lot(
            session, lab.lot, actor=actor, now=lab.clock(), **{"since": "", **more}
        )
    )


def test_use_is_kept_with_the_certificate_that_stood_then(certified):
    lab = certified
    use(lab, says="chloride in process water")
    (line,) = uses(lab).uses
    assert (line.result_id, line.certificate) == ("W-1", "TL-2026-0001")
    assert line.by == "Ida Mohnke"
    assert (line.state_then, line.in_force_then, line.by_token) == ("in force", True, "")
    assert lab.acts()[-1][1:] == ("used a bottle", "bottle")
    assert lab.chain().holds


def test_same_use_sent_twice_is_written_once_and_another_refused(certified):
    lab = certified
    first = use(lab)
    lab.clock.move(minutes=1)
    assert use(lab) == first
    with pytest.raises(SavedFirst, match="already") as refused:
        use(lab, used_at="2026-05-04T09:15Z")
    assert refused.value.shown["standing"]["result"] == "W-1"
    assert len(uses(lab).uses) == 1


def test_two_scripts_that_send_one_use_at_once_write_it_once(certified):
    lab = certified
    with ThreadPoolExecutor(4) as pool:
        made = list(pool.map(lambda _: use(lab), range(8)))
    assert len(set(made)) == 1
    assert len(uses(lab).uses) == 1


def test_use_before_the_certificate_names_none_and_says_unproven(certified):
    lab, at = certified, "2026-05-04T10:31"  # in Berlin, a minute after the bottle was filled
    use(lab, used_at=at)
    (line,) = uses(lab).uses
    assert (line.certificate, line.state_then, line.in_force_then) == ("", "unproven", False)


def test_use_of_a_held_bottle_is_kept_and_says_so(certified):
    lab = certified
    lab.act(hold_thing, HoldThing("bottle", lab.bottle, "cloudy"), "analyst")
    lab.clock.move(minutes=1)
    use(lab)
    view = uses(lab)
    assert view.uses[0].state_then == "held"
    assert "1 while the bottle was not in force" in view.says


def test_pulled_lot_lists_who_had_used_it_since_a_day(certified):
    lab = certified
    use(lab, "before")
    lab.clock.move(days=2)
    use(lab, "since", who="keeper")
    lab.clock.move(minutes=1)
    lab.act(propose_pull, ProposePull(lab.lot, "wrong standard"), "keeper")
    lab.act(confirm_pull, ConfirmPull(lab.lot), "countersigner")
    lab.clock.move(minutes=1)
    use(lab, "after")
    everything = uses(lab)
    assert [(one.result_id, one.state_then) for one in everything.uses] == [
        ("after", "pulled"), ("since", "in force"), ("before", "in force"),
    ]  # fmt: skip
    assert "1 of them after the lot was pulled" in everything.says
    since = uses(lab, since="2026-05-06")
    assert [one.result_id for one in since.uses] == ["after", "since"]
    assert "2 uses since 6 May 2026, by 2 people" in since.says


def test_use_struck_through_stays_readable_and_may_be_written_anew(certified):
    lab = certified
    line = use(lab)
    lab.act(strike_use, StrikeUse(lab.bottle, line, "another bottle"), "keeper")
    (struck,) = uses(lab).uses
    assert struck.struck == "Struck by Nils Obermark: another bottle"
    assert uses(lab).says == "Nobody wrote down a use."
    with pytest.raises(NotAllowed, match="already"):
        lab.act(strike_use, StrikeUse(lab.bottle, line, "again"), "keeper")
    assert use(lab) != line
    assert len(uses(lab).uses) == 2


def test_uses_are_in_ink(certified):
    lab = certified
    use(lab)
    for statement in ("UPDATE bottle_use SET result_id = 'x'", "DELETE FROM bottle_use"):
        with pytest.raises(DBAPIError, match="ink"):
            lab.transactions.write(
                lambda session, statement=statement: session.execute(sa.text(statement))
            )


@pytest.mark.parametrize(
    ("more", "field"),
    [
        ({"result": "  "}, "result_id"),
        ({"result": "x" * 81}, "result_id"),
        ({"certificate": "TL-2020-0001"}, "certificate"),
        ({"used_at": "yesterday"}, "used_at"),
        ({"used_at": "2026-05-05T00:00Z"}, "used_at"),
        ({"used_at": "2020-01-01T00:00Z"}, "used_at"),
        ({"says": "x" * 1001}, "says"),
    ],
)
def test_use_that_cannot_be_is_refused_by_its_field(sqlite_lab, more, field):
    with pytest.raises(Unacceptable) as refused:
        use(sqlite_lab, **more)
    assert refused.value.field == field
    assert refused.value.example or field == "says"


@pytest.mark.parametrize("who", ["countersigner", "reader", "steward"])
def test_use_is_written_by_analysts_and_keepers_only(sqlite_lab, who):
    with pytest.raises(NotAllowed, match="analyst or keeper"):
        use(sqlite_lab, who=who)
    with pytest.raises(NotAllowed, match="analyst or keeper"):
        sqlite_lab.act(strike_use, StrikeUse(sqlite_lab.bottle, "x", "y"), who)


def test_use_of_another_bottle_cannot_be_struck_here(sqlite_lab):
    with pytest.raises(NotFound, match="no such use"):
        sqlite_lab.act(strike_use, StrikeUse(sqlite_lab.bottle, "nothing", "why"), "analyst")


def test_markup_in_a_use_is_kept_as_written(sqlite_lab):
    use(sqlite_lab, "<b>W</b>", says="<script>alert(1)</script>")
    (line,) = sqlite_lab.transactions.read(
        lambda session: session.scalars(sa.select(BottleUse)).all()
    )
    assert (line.result_id, line.says) == ("<b>W</b>", "<script>alert(1)</script>")
    view = sqlite_lab.transactions.read(
        lambda session: open_uses_of_bottle(
            session, sqlite_lab.bottle, actor=sqlite_lab.people["reader"], now=sqlite_lab.clock()
        )
    )
    assert view.uses[0].used_at == sqlite_lab.clock().isoformat()

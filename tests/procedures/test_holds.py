from concurrent.futures import ThreadPoolExecutor

import pytest
from sqlalchemy import func, select

from server.lab.refusal import NotAllowed, NotFound, Unacceptable
from server.procedures.holds import KINDS, HoldThing, ReleaseThing, hold_thing, release_thing
from server.records.tables.stores import Hold


def thing(lab, kind):
    return {
        "lot": lab.lot, "bottle": lab.bottle, "standard lot": lab.standard_lot,
        "instrument": lab.burette,
    }[kind]  # fmt: skip


def hold(lab, kind="bottle", who="analyst", reason="cloudy"):
    return lab.act(hold_thing, HoldThing(kind, thing(lab, kind), reason), who)


def release(lab, kind="bottle", who="keeper", reason="filtered, clear"):
    return lab.act(release_thing, ReleaseThing(kind, thing(lab, kind), reason), who)


@pytest.mark.parametrize("kind", KINDS)
def test_thing_held_by_one_is_released_by_another_with_both_reasons(lab, kind):
    hold(lab, kind)
    lab.clock.move(hours=1)
    release(lab, kind)
    (row,) = lab.transactions.read(lambda session: session.scalars(select(Hold)).all())
    assert (row.reason, row.release_reason) == ("cloudy", "filtered, clear")
    assert row.released_at == lab.clock()
    assert [act for _, act, _ in lab.acts()[-2:]] == [f"held a {kind}", f"released a {kind}"]
    assert lab.chain().holds


def test_thing_released_can_be_held_again(sqlite_lab):
    hold(sqlite_lab)
    release(sqlite_lab)
    hold(sqlite_lab, who="keeper")
    with pytest.raises(NotAllowed, match="You held it"):
        release(sqlite_lab)
    release(sqlite_lab, who="countersigner")


@pytest.mark.parametrize("who", ["keeper", "countersigner", "all hands"])
def test_ones_own_hold_is_released_by_somebody_else_only(sqlite_lab, who):
    hold(sqlite_lab, who=who)
    with pytest.raises(NotAllowed, match="You held it; somebody else releases"):
        release(sqlite_lab, who=who)


def test_analyst_holds_and_releases_nothing(sqlite_lab):
    hold(sqlite_lab)
    with pytest.raises(NotAllowed, match="role countersigner or keeper"):
        release(sqlite_lab, who="second analyst")


def test_thing_held_already_says_why(sqlite_lab):
    hold(sqlite_lab)
    with pytest.raises(NotAllowed, match="is held already: cloudy"):
        hold(sqlite_lab, who="keeper")


def test_thing_held_by_twenty_at_once_is_held_once(lab):
    def one(n):
        try:
            return hold(lab, who=("analyst", "keeper", "countersigner")[n % 3])
        except NotAllowed:
            return None

    with ThreadPoolExecutor(20) as pool:
        answers = list(pool.map(one, range(20)))
    assert sum(answer is not None for answer in answers) == 1
    asked = select(func.count()).select_from(Hold)
    assert lab.transactions.read(lambda session: session.scalar(asked)) == 1


def test_thing_not_held_is_not_released(sqlite_lab):
    with pytest.raises(NotAllowed, match="is not held"):
        release(sqlite_lab)


@pytest.mark.parametrize("reason", ["", "  ", "a\0", "x" * 1001])
def test_hold_without_a_reason_that_can_be_kept_is_refused(shared_lab, reason):
    with pytest.raises(Unacceptable) as refused:
        hold(shared_lab, reason=reason)
    assert refused.value.field == "reason"


@pytest.mark.parametrize(
    ("kind", "key", "error", "field"),
    [
        ("shelf", "x", Unacceptable, "kind"),
        ("bottle", "x", NotFound, "code"),
        ("bottle", "00000000", NotFound, "thing"),
        ("lot", "00000000", NotFound, "thing"),
        ("standard lot", "x", NotFound, "thing"),
        ("instrument", "x", NotFound, "thing"),
    ],
)
def test_hold_of_something_unknown_is_refused_by_field(shared_lab, kind, key, error, field):
    with pytest.raises(error) as refused:
        shared_lab.act(hold_thing, HoldThing(kind, key, "cloudy"), "analyst")
    assert refused.value.field == field

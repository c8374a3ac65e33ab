"""The countersigner's queue: longest first, what stands out, whose own work it is."""

from dataclasses import replace
from datetime import timedelta

import pytest

from server.lab.refusal import NotSignedIn
from server.records.queries.load_sheet import load_many_sheet_facts, load_sheet_facts
from server.sheets.queue import open_queue


def test_queue_tells_what_stands_out_with_the_reasons_given(demo) -> None:
    (line,) = demo.read(open_queue, who="ottilie").waiting
    assert line.sheet_id == demo.summary.waiting_sheet_id
    assert line.handed_in_by == "Bashir Oduya"
    assert line.waiting == "waits 10 hours"
    assert line.refused is None
    gravity = [one.verdict for one in line.stands_out]
    assert gravity[:2] == ["fails", "fails"]
    assert "holds" not in gravity
    assert line.stands_out[0].reason.startswith("replicate 2 is high")


@pytest.mark.parametrize(
    ("who", "says"),
    [
        ("imke", "To countersign you need the role countersigner."),
        ("marisol", "To countersign you need the role countersigner."),
    ],
)
def test_queue_says_why_somebody_may_not_sign(demo, who, says) -> None:
    assert demo.read(open_queue, who=who).waiting[0].refused == says


@pytest.mark.parametrize(
    ("who", "says"),
    [
        ("imke", "You made up this lot; somebody else countersigns."),
        ("bashir", "You wrote on this sheet; somebody else countersigns."),
    ],
)
def test_queue_refuses_ones_own_work_also_to_a_countersigner(demo, who, says) -> None:
    person = replace(demo.people[who], roles=frozenset({"analyst", "countersigner"}))
    both = replace(demo, people={**demo.people, who: person})
    assert both.read(open_queue, who=who).waiting[0].refused == says


def test_queue_longest_waiting_stands_first(own_demo) -> None:
    earlier = own_demo.now - timedelta(days=2)
    own_demo.write(
        lambda s: own_demo.twin_sheet(s, own_demo.summary.waiting_sheet_id, handed_in_at=earlier)
    )
    waiting = own_demo.read(open_queue, who="ottilie").waiting
    assert [line.waiting for line in waiting] == ["waits 2 days", "waits 10 hours"]


def test_queue_done_names_who_countersigned_and_accepted(demo) -> None:
    done = demo.read(open_queue, who="ottilie").done
    assert [line.number for line in done] == [f"S-2026-000{n}" for n in (7, 5, 4, 3, 2, 1)]
    assert done[0].waiting.endswith("by Ottilie Renn")
    failed = [one for line in done for one in line.stands_out if one.verdict == "fails"]
    assert failed
    assert {one.accepted_by for one in failed} == {"Ottilie Renn"}


def test_queue_for_a_visitor_asks_to_sign_in(demo) -> None:
    with pytest.raises(NotSignedIn):
        demo.read(open_queue, who=None)


def test_many_sheets_loaded_at_once_are_those_loaded_one_by_one(demo) -> None:
    ids = [
        demo.summary.waiting_sheet_id,
        demo.summary.open_sheet_id,
        demo.summary.sent_back_sheet_id,
        *(line.sheet_id for line in demo.read(open_queue, who="ottilie").done),
    ]
    together = demo.transactions.read(lambda s: load_many_sheet_facts(s, ids))
    for one, sheet_id in zip(together, ids, strict=True):
        assert one == demo.transactions.read(lambda s, i=sheet_id: load_sheet_facts(s, i))

"""The shelf: what answers, what a visitor sees, codes close to a wrong one."""

from dataclasses import asdict

import pytest
import sqlalchemy as sa

from server.demo.cast import MEMBERS
from server.lab.refusal import NotSignedIn
from server.records.tables.people import Laboratory
from server.sheets.shelf_page import open_shelf


def shelf(demo, *, who, words="", state=""):
    return demo.read(open_shelf, who=who, words=words, state=state)


def close_shelf(demo):
    def work(session):
        row = session.scalar(sa.select(Laboratory))
        row.settings = {**row.settings, "shelf_open": False}

    demo.write(work)


def test_shelf_for_a_visitor_holds_bottles_in_force_and_no_names(demo) -> None:
    page = shelf(demo, who=None)
    assert {line.code for line in page.bottles} == set(demo.summary.bottles_in_force)
    assert all(line.in_force and line.reported for line in page.bottles)
    assert page.states == ("in force", "check due")
    for member in MEMBERS:
        assert member.printed_name not in repr(asdict(page))


def test_shelf_of_the_laboratory_shows_all_due_soonest_first(demo) -> None:
    page = shelf(demo, who="bashir")
    assert [line.state for line in page.bottles] == [
        "check due", "in force", "lapsed", "used up", "held", "unproven",
    ]  # fmt: skip
    assert [bool(line.reported) for line in page.bottles] == [True, True] + [False] * 4
    assert page.bottles[0].due_in == "in 4 days"
    assert (page.bottles[3].good_until, page.bottles[5].good_until) == ("", "")
    assert page.says == "6 bottles, 2 in force; due soonest first."


@pytest.mark.parametrize(
    ("words", "count"),
    [
        ("naoh 0.1", 5),
        ("HYDROCHLORIC", 1),
        ("shelf 1", 5),
        ("naoh 0.2", 0),
        ("2026-10-21", 1),
        ("0,10 NaOH", 5),
        ("0.15", 0),
        ("0", 0),
    ],
)
def test_shelf_words_answer_in_any_case_and_order(demo, words, count) -> None:
    assert len(shelf(demo, who="bashir", words=words).bottles) == count


def test_shelf_state_filters_and_an_unknown_one_finds_nothing(demo) -> None:
    assert [one.state for one in shelf(demo, who="bashir", state="held").bottles] == ["held"]
    assert shelf(demo, who="bashir", state="nonsense").bottles == ()


def test_shelf_code_finds_its_bottle_also_in_lower_case_with_hyphens(demo) -> None:
    code = demo.summary.bottles[2]
    page = shelf(demo, who="bashir", words=f"{code[:4]}-{code[4:]}".lower())
    assert [line.code for line in page.bottles] == [code]


def test_shelf_unknown_code_names_the_nearest(demo) -> None:
    code = demo.summary.bottles_in_force[1]
    swapped = code[1] + code[0] + code[2:]
    page = shelf(demo, who=None, words=swapped)
    assert (page.bottles, page.nearest) == ((), (code,))


def test_shelf_code_of_a_lapsed_bottle_tells_a_visitor_its_state_without_a_number(demo) -> None:
    lapsed = shelf(demo, who="bashir", state="lapsed").bottles[0].code
    page = shelf(demo, who=None, words=lapsed)
    assert (page.bottles, page.nearest) == ((), ())
    assert page.says == f"Bottle {lapsed} is lapsed."


def test_shelf_that_is_closed_asks_visitors_to_sign_in(own_demo) -> None:
    close_shelf(own_demo)
    with pytest.raises(NotSignedIn):
        shelf(own_demo, who=None)
    assert len(shelf(own_demo, who="bashir").bottles) == 6

"""Chrome and people: what a visitor, an analyst and the steward see."""

import pytest

from server.lab.refusal import NotAllowed, NotSignedIn
from server.sheets.people import Chrome, open_chrome, open_people


def test_chrome_of_a_visitor_names_the_laboratory_only(demo) -> None:
    chrome = demo.read(open_chrome, who=None)
    assert chrome == Chrome("Tarnbeck Waterworks, Laboratory", None, None, (), 0, None)


def test_chrome_of_a_person_counts_the_sheets_that_wait(demo) -> None:
    chrome = demo.read(open_chrome, who="ottilie")
    assert (chrome.printed_name, chrome.initials, chrome.waiting) == ("Ottilie Renn", "OR", 1)
    assert chrome.person_id == demo.people["ottilie"].person_id


def test_chrome_before_the_set_up_has_no_laboratory(sqlite_transactions, clock) -> None:
    chrome = sqlite_transactions.read(lambda s: open_chrome(s, actor=None, now=clock()))
    assert chrome.laboratory == ""


def test_people_for_the_steward_lists_everybody_with_roles(demo) -> None:
    page = demo.read(open_people, who="marisol")
    assert {one.printed_name: one.roles for one in page.people}["Ottilie Renn"] == (
        "countersigner",
        "reader",
    )
    assert page.roles == ("analyst", "countersigner", "keeper", "steward", "reader")
    assert page.shelf_open


@pytest.mark.parametrize("who", ["bashir", "ottilie", "jonas"])
def test_people_for_anybody_else_is_refused(demo, who) -> None:
    with pytest.raises(NotAllowed, match="steward"):
        demo.read(open_people, who=who)


def test_people_for_a_visitor_asks_to_sign_in(demo) -> None:
    with pytest.raises(NotSignedIn):
        demo.read(open_people, who=None)

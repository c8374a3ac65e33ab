"""The trail: filters, pages, and a badge that tells the truth."""

import hashlib
import json

import pytest
import sqlalchemy as sa

from server.lab.refusal import NotSignedIn, Unacceptable
from server.records.tables.trail import TrailRow
from server.reports.trail_record import trail_json_lines
from server.sheets.trail_list import open_trail_record
from server.sheets.trail_page import LINES, open_trail


def trail(demo, *, who="ottilie", **asked):
    given = {"person": "", "thing": "", "day": "", **asked}
    return demo.read(open_trail, who=who, **given)


def test_trail_newest_stands_first_and_pages_join_without_gap(demo) -> None:
    first = trail(demo)
    assert len(first.lines) == LINES
    assert (first.newer_url, first.older_url) == (None, "/trail?page=2")
    seen, page = [], 1
    while True:
        found = trail(demo, page=page)
        seen += [line.seq for line in found.lines]
        if found.older_url is None:
            break
        page += 1
    assert seen == list(range(first.lines[0].seq, 0, -1))


def test_trail_of_a_person_holds_that_persons_acts_only(demo) -> None:
    page = trail(demo, person="Ottilie Renn")
    assert {line.who for line in page.lines} == {"Ottilie Renn"}
    assert "sent back a bench sheet" in {line.act for line in page.lines}
    assert page.people == tuple(sorted(page.people))


def test_trail_of_a_thing_is_found_by_a_part_of_its_name_in_any_case(demo) -> None:
    page = trail(demo, thing="s-2026-0005")
    assert {line.thing for line in page.lines} == {"S-2026-0005"}
    assert "corrected entries" in {line.act for line in page.lines}
    assert trail(demo, thing="100%_").lines == ()


def test_trail_of_a_day_is_that_of_the_laboratory(demo) -> None:
    page = trail(demo, day="2026-11-27")
    assert {line.says_at.partition(",")[0] for line in page.lines} == {"27 Nov 2026"}
    with pytest.raises(Unacceptable) as refused:
        trail(demo, day="yesterday")
    assert refused.value.field == "day"


def test_trail_pager_keeps_the_filter(demo) -> None:
    assert trail(demo, person="Imke Thorvald", page=2).newer_url == (
        "/trail?person=Imke+Thorvald&page=1"
    )


def test_trail_correction_tells_what_was_struck_and_why(demo) -> None:
    page = trail(demo, thing="S-2026-0005")
    line = next(one for one in page.lines if one.act == "corrected entries")
    assert line.why == "misread by a whole millilitre"
    assert line.details.startswith("replicate 3, burette end: ")
    assert "an earlier value struck through (misread" in line.details


def test_trail_words_are_looked_for_in_act_reason_details_and_names(demo) -> None:
    def found(words: str) -> set[str]:
        return {line.act for line in trail(demo, words=words).lines}

    assert found("misread millilitre") == {"corrected entries"}
    assert found("COUNTERSIGNED") >= {"countersigned"}
    assert found("ottilie certificate") >= {"issued a certificate", "countersigned"}
    assert found("no-such-word") == set()
    assert found("100%_") == set()
    page = trail(demo, words="wrote entries", page=1)
    assert page.asked == "words=wrote+entries"
    assert page.older_url in (None, "/trail?words=wrote+entries&page=2")


def test_trail_taken_out_whole_is_checked_by_a_few_lines_without_this_program(demo) -> None:
    rows = demo.read(open_trail_record, who="ottilie", person="", thing="", day="")
    before = "0" * 64
    for line in trail_json_lines(rows).decode("utf-8").splitlines():
        row = json.loads(line)
        previous, named = row.pop("previous_hash"), row.pop("hash")
        said = json.dumps(row, sort_keys=True, separators=(",", ":"), ensure_ascii=False)
        assert previous == before
        before = hashlib.sha256(f"{previous}\n{said}".encode()).hexdigest()
        assert before == named
    assert trail(demo).seal == f"Row {len(rows)}: {before}"


def test_trail_taken_out_is_that_of_the_filter(demo) -> None:
    rows = demo.read(open_trail_record, who="ottilie", person="", thing="S-2026-0005", day="")
    assert {row["thing_name"] for row in rows} == {"S-2026-0005"}
    with pytest.raises(NotSignedIn):
        demo.read(open_trail_record, who=None, person="", thing="", day="")


def test_trail_longer_than_a_page_checks_says_from_where_to_where(demo, monkeypatch) -> None:
    monkeypatch.setattr("server.sheets.trail_page.MOST_CHECKED", 100)
    page = trail(demo)
    last = page.lines[0].seq
    assert page.holds
    assert f"newest 100 rows, from {last - 99} to {last}" in page.badge


def test_trail_badge_says_that_the_chain_holds(demo) -> None:
    page = trail(demo)
    assert page.holds
    assert str(page.lines[0].seq) in page.badge


def test_trail_badge_says_where_the_chain_breaks(own_demo) -> None:
    own_demo.without_triggers()
    changed = sa.update(TrailRow).where(TrailRow.seq == 40).values(person_name="Nobody")
    own_demo.write(lambda s: s.execute(changed))
    page = trail(own_demo)
    assert not page.holds
    assert "40" in page.badge


def test_trail_for_a_visitor_asks_to_sign_in(demo) -> None:
    with pytest.raises(NotSignedIn):
        trail(demo, who=None)

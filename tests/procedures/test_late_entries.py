"""Late entries and clocks that are wrong (R092): flagged to whoever countersigns, never refused."""

from datetime import timedelta
from uuid import uuid4

import pytest

from server.lab.refusal import Unacceptable
from server.procedures.entries import WriteEntries, write_entries
from server.procedures.new_entries import NewEntry
from server.sheets.countersigning import open_countersign
from tests.procedures.conftest import all_lines


def written(lab, *, minutes_ago, skew_s=0, told=True):
    """The lines of a sheet, written some minutes ago by a clock that is so much ahead."""
    skew = timedelta(seconds=skew_s)
    device_at = (lab.clock() - timedelta(minutes=minutes_ago) + skew).isoformat()
    entries = tuple(
        NewEntry(str(uuid4()), *line, device_at=device_at, device_zone="Europe/Berlin")
        for line in all_lines()
    )
    sent_at = (lab.clock() + skew).isoformat() if told else None
    lab.act(write_entries, WriteEntries(lab.sheet, entries, sent_at=sent_at), "analyst")


def value_of(lab):
    lab.hand_in()
    actor = lab.people["countersigner"]
    page = lab.transactions.read(
        lambda session: open_countersign(session, lab.sheet, actor=actor, now=lab.clock())
    )
    (value,) = [
        row.value
        for group in page.groups
        for row in group.rows
        if (row.replicate, row.slot) == (1, "burette_end")
    ]
    return value, [one.says for one in page.to_see]


@pytest.mark.parametrize(
    ("minutes_ago", "skew_s", "told", "late", "says"),
    [
        (0, 0, True, False, ""),
        (15, 0, True, False, ""),
        (22, 0, True, True, "came 22 min after it was written"),
        (1, 120, True, False, ""),
        (1, 300, True, False, "its clock was 5 min ahead"),
        (1, -300, True, False, "its clock was 5 min behind"),
        # a clock that is behind does not make an entry late, and one ahead does not hide it
        (1, -3600, True, False, "its clock was 60 min behind"),
        (40, 3600, True, True, "came 40 min after it was written; its clock was 60 min ahead"),
        # a script that does not tell its clock: only what cannot be otherwise is said
        (0, 300, False, False, "its clock was 5 min ahead"),
        (22, 0, False, True, "came 22 min after it was written"),
    ],
)
def test_entry_is_flagged_by_its_delay_and_by_its_clock(
    sqlite_lab, minutes_ago, skew_s, told, late, says
):
    written(sqlite_lab, minutes_ago=minutes_ago, skew_s=skew_s, told=told)
    value, to_see = value_of(sqlite_lab)
    assert (value.late, value.clock_says) == (late, says)
    assert any("late entry" in one for one in to_see) is late
    assert any("clock that was more than 2 min wrong" in one for one in to_see) is ("clock" in says)
    assert sqlite_lab.chain().holds


def test_sender_whose_clock_is_no_time_is_refused_by_name(sqlite_lab):
    entry = NewEntry(str(uuid4()), 0, "temperature", "20.4")
    command = WriteEntries(sqlite_lab.sheet, (entry,), sent_at="yesterday")
    with pytest.raises(Unacceptable) as refused:
        sqlite_lab.act(write_entries, command, "analyst")
    assert refused.value.field == "sent_at"
    assert sqlite_lab.facts().entries == ()

from concurrent.futures import ThreadPoolExecutor
from dataclasses import replace
from datetime import UTC, datetime
from uuid import uuid4

import pytest
from sqlalchemy import func, select

from server.lab.ink import history, standing
from server.lab.refusal import KeyMissing, NotAllowed, NotFound, SavedFirst, Unacceptable
from server.procedures.bench import AbandonSheet, abandon_sheet
from server.procedures.entries import MOST_ENTRIES, NewEntry
from server.records.tables.bench import Entry

END = (1, "burette_end", 1)


def entry(slot, text, replicate=1, **more):
    return NewEntry(
        **{"id": str(uuid4()), "replicate": replicate, "slot": slot, "text": text} | more
    )


def refusal(lab, *entries, kind=Unacceptable, who="analyst"):
    before = lab.facts()
    with pytest.raises(kind) as refused:
        lab.write(*entries, who=who)
    assert lab.facts() == before
    return refused.value


def count_of(lab, *where):
    asked = select(func.count()).select_from(Entry).where(*where)
    return lab.transactions.read(lambda session: session.scalar(asked))


# what is typed


@pytest.mark.parametrize("text", ["60.5450", "60,5450", " 60.5450", "+60.5450", "060.5450"])
def test_entry_text_is_kept_byte_by_byte_as_typed(lab, text):
    lab.write(entry("container_and_standard", text, raw="  +60.5450 g"))
    (kept,) = lab.facts().entries
    assert (kept.text, kept.unit, kept.raw) == (text, "g", "  +60.5450 g")
    assert (kept.printed_name, kept.received_at) == ("Ida Mohnke", lab.clock())


def test_entries_of_two_people_get_positions_without_gaps(sqlite_lab):
    first = sqlite_lab.write(entry("burette_start", "0.00"), entry("burette_end", "18.64"))
    second = sqlite_lab.write(entry("container_and_standard", "60.5450"), who="second analyst")
    assert [one.position for one in (*first, *second)] == [1, 2, 3]
    assert not any(one.repeated for one in (*first, *second))


def test_entry_markup_in_a_remark_is_kept_as_characters(lab):
    text = "<script>alert(1)</script> & 'x' ä検"
    lab.write(entry("remark", text, replicate=0))
    assert lab.facts().entries[0].text == text


@pytest.mark.parametrize(
    ("odd", "field"),
    [
        ({"slot": "colour", "text": "pink"}, "slot"),
        ({"slot": "burette_end", "text": "18.6"}, "Burette, end"),
        ({"slot": "burette_end", "text": "18.640"}, "Burette, end"),
        ({"slot": "burette_end", "text": "-0.10"}, "Burette, end"),
        ({"slot": "burette_end", "text": "25.01"}, "Burette, end"),
        ({"slot": "burette_end", "text": "18.64", "unit": "L"}, "Burette, end"),
        ({"slot": "burette_end", "text": "18.64", "segment": 2}, "Burette, end, filling 2"),
        ({"slot": "burette_end", "text": ""}, "Burette, end"),
        ({"slot": "remark", "text": "a\0b"}, "text"),
        ({"slot": "remark", "text": "a\ud800b"}, "text"),
        ({"slot": "remark", "text": "x" * 2001}, "text"),
        ({"slot": "remark", "text": "x", "reason": "a\0"}, "reason"),
        ({"slot": "remark", "text": "x", "raw": "\x1b"}, "raw"),
        ({"slot": "remark", "text": "x", "device_at": "yesterday"}, "device_at"),
        ({"slot": "remark", "text": "x", "device_at": "2026-05-04T10:00:00"}, "device_at"),
        ({"slot": "remark", "text": "x", "device_at": "9999-12-31T23:59:59-10:00"}, "device_at"),
        ({"slot": "remark", "text": "x", "device_zone": "Mars/Olympus"}, "zone"),
        ({"slot": "remark", "text": "x", "device_id": "tablet"}, "device_id"),
        ({"slot": "remark", "text": "x", "monotonic_ms": 2**63}, "monotonic_ms"),
        ({"slot": "remark", "text": "x", "base_revision": 2**31}, "base_revision"),
        ({"slot": "remark", "text": "x", "device_sequence": -1}, "device_sequence"),
        ({"slot": "remark", "text": "x", "id": "7"}, "id"),
        ({"slot": "remark", "text": "x", "strikes": "7"}, "strikes"),
        ({"slot": "remark", "text": "x", "replicate": 21}, "replicate"),
    ],
)
def test_entry_that_cannot_be_is_refused_by_field_and_nothing_is_kept(shared_lab, odd, field):
    assert refusal(shared_lab, entry(**odd)).field == field


def test_entry_without_uuid_is_refused_as_without_key(shared_lab):
    assert refusal(shared_lab, entry("remark", "x", id=""), kind=KeyMissing).field == "id"


def test_entries_none_or_too_many_are_refused(shared_lab):
    assert refusal(shared_lab).field == "entries"
    many = [entry("remark", "x") for _ in range(MOST_ENTRIES + 1)]
    assert refusal(shared_lab, *many).field == "entries"


def test_entries_one_bad_in_a_list_leaves_none(sqlite_lab):
    refusal(sqlite_lab, entry("burette_start", "0.00"), entry("burette_end", "1.0"))
    assert sqlite_lab.facts().entries == ()


def test_entry_on_no_sheet_is_not_found(shared_lab):
    with pytest.raises(NotFound):
        shared_lab.write(entry("remark", "x"), sheet=str(uuid4()))


def test_entry_device_time_is_kept_beside_the_servers(lab):
    device = str(uuid4())
    lab.write(
        entry(
            "remark", "x", device_id=device, device_sequence=7, monotonic_ms=123_456,
            device_at="2026-05-04T10:29:58.5+02:00", device_zone="Europe/Berlin",
        )
    )  # fmt: skip
    (kept,) = lab.facts().entries
    assert kept.device_at == datetime(2026, 5, 4, 8, 29, 58, 500_000, tzinfo=UTC)
    assert (kept.device_zone, kept.device_sequence) == ("Europe/Berlin", 7)
    assert kept.received_at == lab.clock()


def test_entry_device_sequence_used_twice_is_refused(lab):
    device = {"device_id": str(uuid4()), "device_sequence": 1}
    lab.write(entry("remark", "x", **device))
    assert refusal(lab, entry("remark", "y", segment=2, **device)).field == "device_sequence"


# corrections in ink: R002


def test_correction_keeps_all_four_values_with_who_when_and_why(lab):
    lab.write(entry("burette_start", "0.00"), entry("burette_end", "19.64"))
    lab.correct(END, "18.46", "misread")
    lab.correct(END, "18.65", "slip of the pen", who="second analyst")
    lab.clock.move(minutes=3)
    lab.correct(END, "18.64", "read again at rest")
    facts = lab.facts()
    written = history(facts.entries, END)
    assert [one.text for one in written] == ["19.64", "18.46", "18.65", "18.64"]
    assert [one.reason for one in written] == [
        None, "misread", "slip of the pen", "read again at rest",
    ]  # fmt: skip
    assert written[2].printed_name == "Pavel Orrin"
    assert written[3].received_at == lab.clock()
    assert standing(facts.entries)[END].text == "18.64"
    acts = [act for _, act, kind in lab.acts() if kind == "sheet"]
    assert acts == ["began a bench sheet", "wrote entries", *["corrected entries"] * 3]


def test_correction_without_reason_is_refused(sqlite_lab):
    sqlite_lab.write(entry("burette_start", "0.00"), entry("burette_end", "19.64"))
    stands = standing(sqlite_lab.facts().entries)[END]
    for reason in (None, "   "):
        odd = entry("burette_end", "18.64", strikes=stands.id, reason=reason)
        assert refusal(sqlite_lab, odd).field == "reason"


def test_correction_of_another_row_is_refused(sqlite_lab):
    (start, _) = sqlite_lab.write(entry("burette_start", "0.00"), entry("burette_end", "19.64"))
    odd = entry("burette_end", "18.64", strikes=start.id, reason="misread")
    assert refusal(sqlite_lab, odd).field == "strikes"


def test_row_written_already_shows_both_values(sqlite_lab):
    sqlite_lab.write(entry("burette_start", "0.00"), entry("burette_end", "18.64"))
    refused = refusal(
        sqlite_lab, entry("burette_end", "18.46"), kind=SavedFirst, who="second analyst"
    )
    assert refused.shown["standing"]["text"] == "18.64"
    assert refused.shown["standing"]["by"] == "Ida Mohnke"
    assert refused.shown["yours"] == {"text": "18.46", "unit": None, "by": "Pavel Orrin"}


def test_row_struck_by_two_at_once_lets_the_first_win(lab):
    lab.write(entry("burette_start", "0.00"), entry("burette_end", "19.64"))
    stands = standing(lab.facts().entries)[END]
    words = {"strikes": stands.id, "reason": "misread"}
    lab.write(entry("burette_end", "18.64", **words))
    refused = refusal(lab, entry("burette_end", "18.46", **words), kind=SavedFirst)
    assert refused.shown["standing"]["text"] == "18.64"


def test_row_struck_out_only_can_be_written_anew(sqlite_lab):
    (written,) = sqlite_lab.write(entry("container_and_standard", "60.5450"))
    sqlite_lab.write(entry("container_and_standard", "", strikes=written.id, reason="wrong row"))
    assert standing(sqlite_lab.facts().entries) == {}
    sqlite_lab.write(entry("container_and_standard", "60.5451"))
    assert [one.text for one in sqlite_lab.facts().entries] == ["60.5450", "", "60.5451"]


# idempotency: R087, R088


def test_entry_repeated_gets_its_first_answer_and_writes_nothing(lab):
    one = entry("burette_start", "0.00")
    (first,) = lab.write(one)
    trail, revision = lab.acts(), lab.facts().revision
    (again,) = lab.write(one)
    assert again == replace(first, repeated=True)
    assert (lab.acts(), lab.facts().revision) == (trail, revision)


def test_entry_repeated_in_a_list_with_new_ones_writes_the_new_ones(sqlite_lab):
    one, two = entry("burette_start", "0.00"), entry("burette_end", "18.64")
    sqlite_lab.write(one)
    written = sqlite_lab.write(one, two)
    assert [(w.position, w.repeated) for w in written] == [(1, True), (2, False)]


def test_entry_uuid_with_other_content_is_refused(lab):
    one = entry("burette_start", "0.00")
    lab.write(one)
    assert refusal(lab, replace(one, text="0.01")).field == "id"


def test_entry_uuid_of_another_sheet_is_refused(lab):
    one = entry("burette_start", "0.00")
    lab.write(one)
    other = lab.begin()
    with pytest.raises(Unacceptable) as refused:
        lab.write(one, sheet=other)
    assert refused.value.field == "id"
    assert lab.facts(other).entries == ()


def test_entry_uuid_twice_in_one_list_is_refused(sqlite_lab):
    one = entry("burette_start", "0.00")
    assert refusal(sqlite_lab, one, one).field == "id"


def test_entry_repeated_after_hand_in_still_gets_its_answer(lab):
    from_tablet = entry("remark", "seen", replicate=0)
    lab.write(from_tablet)
    lab.act(abandon_sheet, AbandonSheet(lab.sheet, "burette leaked"), "analyst")
    (again,) = lab.write(from_tablet)
    assert again.repeated
    with pytest.raises(NotAllowed, match="This sheet is abandoned"):
        lab.write(entry("remark", "more", replicate=0))


def test_two_hundred_duplicates_at_once_leave_one_row_and_equal_answers(lab):
    one = entry("burette_start", "0.00", device_id=str(uuid4()), device_sequence=1)
    with ThreadPoolExecutor(20) as pool:
        answers = list(pool.map(lambda _: lab.write(one), range(200)))
    assert count_of(lab, Entry.id == one.id) == 1
    assert {(a.id, a.position) for (a,) in answers} == {(one.id, 1)}
    assert sum(not a.repeated for (a,) in answers) == 1
    assert lab.facts().revision == 2
    assert lab.chain().holds


# many at once


def test_twenty_threads_write_positions_without_gaps(lab):
    remarks = [
        [entry("remark", f"{replicate}.{n}", replicate=replicate, segment=n) for n in range(1, 4)]
        for replicate in range(1, 21)
    ]

    def write_all(mine):
        return [lab.write(one)[0].position for one in mine]

    with ThreadPoolExecutor(20) as pool:
        positions = [position for found in pool.map(write_all, remarks) for position in found]
    assert sorted(positions) == list(range(1, 61))
    assert [one.position for one in lab.facts().entries] == list(range(1, 61))
    assert lab.facts().revision == 61
    assert lab.chain().holds


def test_twenty_threads_for_one_row_leave_one_value_and_tell_the_others(lab):
    def write(n):
        try:
            return lab.write(entry("burette_start", f"0.{n:02d}"))
        except SavedFirst as refused:
            return refused.shown["standing"]["text"]

    with ThreadPoolExecutor(20) as pool:
        answers = list(pool.map(write, range(20)))
    (kept,) = lab.facts().entries
    told = [one for one in answers if isinstance(one, str)]
    assert told == [kept.text] * 19

from dataclasses import replace

from server.lab.ink import COUNTS_AGAIN, excluded, history, ink_digest, standing, strikes

PLACE = (1, "burette_end", 1)


def corrected_three_times(entry):
    first = entry(1, "burette_end", "19.64")
    second = entry(1, "burette_end", "18.46", strikes=first.id, reason="misread")
    third = entry(1, "burette_end", "18.65", strikes=second.id, reason="slip of the pen")
    return [first, second, third, entry(1, "burette_end", "18.64", strikes=third.id, reason="tip")]


def test_standing_is_the_last_entry_that_is_not_struck(entry):
    assert standing(corrected_three_times(entry))[PLACE].text == "18.64"


def test_standing_order_of_arrival_in_memory_does_not_matter(entry):
    entries = corrected_three_times(entry)
    assert standing(reversed(entries)) == standing(entries)


def test_standing_empty_strike_leaves_the_row_open(entry):
    first = entry(1, "mass", "0.3888")
    strike = entry(1, "mass", "", strikes=first.id, reason="wrong row")
    assert standing([first, strike]) == {}


def test_correction_made_three_times_keeps_four_values(entry):
    # R002: first value, each new one, who, when and why stay readable
    entries = corrected_three_times(entry)
    assert [one.text for one in history(entries, PLACE)] == ["19.64", "18.46", "18.65", "18.64"]
    assert [(one.struck.text, one.by.text, one.by.reason) for one in strikes(entries)] == [
        ("19.64", "18.46", "misread"),
        ("18.46", "18.65", "slip of the pen"),
        ("18.65", "18.64", "tip"),
    ]


def test_excluded_tells_the_criterion_until_the_replicate_counts_again(entry):
    out = entry(2, "excluded", "spilled or lost", reason="flask fell over")
    assert excluded([out]) == {2: out}
    back = entry(2, "excluded", COUNTS_AGAIN, strikes=out.id, reason="it was replicate 3")
    assert excluded([out, back]) == {}


def test_ink_digest_covers_what_is_struck_and_why(entry):
    entries = corrected_three_times(entry)
    whole = ink_digest(entries)
    assert whole == ink_digest(reversed(entries))
    changes = [
        {"text": "19.65"}, {"unit": "L"}, {"reason": "because"}, {"person_id": "p-other"},
        {"slot": "burette_start"}, {"replicate": 2}, {"segment": 2}, {"strikes": "e-9"},
        {"position": 9}, {"id": "e-9"},
    ]  # fmt: skip
    for change in changes:
        assert ink_digest([replace(entries[0], **change), *entries[1:]]) != whole
    assert ink_digest(entries[:-1]) != whole


def test_ink_digest_covers_a_curves_points_and_no_other_raw_line(entry):
    curve, reading = entry(1, "curve", "6 points"), entry(1, "burette_end", "18.64")
    for one, covered in ((curve, True), (reading, False)):
        other = replace(one, raw="another")
        assert (ink_digest([other]) != ink_digest([replace(one, raw="one")])) is covered

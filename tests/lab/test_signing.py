from dataclasses import replace
from datetime import timedelta

import pytest

from server.lab.signing import MEASURED, digest_to_sign, signature_holds


@pytest.fixture
def signed(facts, entry, sheet_parts):
    """A sheet with two entries and a signature that is bound to it."""
    sheet = facts(entries=(entry(1, "mass", "0.3888"), entry(1, "burette_end", "18.64")))
    unsigned = sheet_parts["signature"](
        sheet_parts["writer"], MEASURED, reasons={"replicates": "one only"}, remark="clear"
    )
    bound = replace(unsigned, signed_digest=digest_to_sign(unsigned, sheet, "snap"))
    return sheet, bound


def test_signature_on_what_was_signed_holds(signed):
    sheet, signature = signed
    assert signature_holds(signature, sheet, "snap")


@pytest.mark.parametrize(
    "change",
    [
        {"person_id": "p-other"},
        {"printed_name": "Somebody Else"},
        {"meaning": "countersigned"},
        {"zone": "UTC"},
        {"reasons": {}},
        {"remark": None},
        {"signed_digest": "0" * 64},
    ],
)
def test_signature_changed_in_one_word_does_not_hold(signed, change):
    sheet, signature = signed
    assert not signature_holds(replace(signature, **change), sheet, "snap")


def test_signature_moved_in_time_does_not_hold(signed):
    sheet, signature = signed
    later = replace(signature, at=signature.at + timedelta(microseconds=1))
    assert not signature_holds(later, sheet, "snap")


def test_signature_copied_to_another_sheet_or_evaluation_does_not_hold(signed):
    # R033: bound to the record; a copy elsewhere fails
    sheet, signature = signed
    assert not signature_holds(signature, replace(sheet, id="s-2"), "snap")
    assert not signature_holds(signature, sheet, "another")


def test_signature_over_changed_ink_does_not_hold(signed):
    sheet, signature = signed
    first, second = sheet.entries
    for entries in ((first,), (replace(first, text="0.3889"), second)):
        assert not signature_holds(signature, replace(sheet, entries=entries), "snap")


def test_signature_stays_good_when_something_is_written_later(signed, entry):
    sheet, signature = signed
    later = entry(0, "remark", "seen", received_at=signature.at + timedelta(minutes=5))
    assert signature_holds(signature, replace(sheet, entries=(*sheet.entries, later)), "snap")

import pytest

from server.lab.free_text import check_text, read_reason, read_text
from server.lab.refusal import Unacceptable


def test_text_of_any_language_with_lines_and_markup_is_kept():
    text = "Trübung?\n\t<b>nein</b> — 検査 ✓"
    assert read_text(f"  {text} ", "remark") == text


@pytest.mark.parametrize(
    "character", ["\0", "\x07", "\x1b", "\x7f", "\x9d", chr(0xD800), chr(0xDFFF)]
)
def test_text_with_what_no_record_keeps_is_refused_by_field(character):
    with pytest.raises(Unacceptable) as refused:
        check_text(f"fine{character}", "remark", most=100)
    assert refused.value.field == "remark"


def test_text_too_long_is_refused_never_cut():
    assert read_text("x" * 100, "remark", most=100) == "x" * 100
    with pytest.raises(Unacceptable, match="up to 100 characters; this has 101"):
        read_text("x" * 101, "remark", most=100)


@pytest.mark.parametrize("text", ["", "  \n "])
def test_reason_that_says_nothing_is_refused_with_an_example(text):
    with pytest.raises(Unacceptable, match="Give the reason") as refused:
        read_reason(text, says="Give the reason.", example="misread")
    assert (refused.value.field, refused.value.example) == ("reason", "misread")

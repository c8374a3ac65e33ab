import pytest

from server.lab.identity import check_described, is_not_applicable
from server.lab.refusal import Unacceptable


@pytest.mark.parametrize(
    "text",
    ["", "3.1", "not applicable: glass", "Not applicable (no software)", "not applicable - glass"],
)
def test_field_stated_or_with_a_reason_is_taken(text):
    check_described(text, "software")


@pytest.mark.parametrize("text", ["not applicable", "Not applicable:", "not applicable  ,  "])
def test_field_not_applicable_without_why_is_refused(text):
    assert is_not_applicable(text)
    with pytest.raises(Unacceptable, match="say why") as refused:
        check_described(text, "software")
    assert refused.value.field == "software"

import pytest

from server.lab.own_site import read_base_url, read_country
from server.lab.refusal import Unacceptable


@pytest.mark.parametrize(
    ("typed", "kept"),
    [
        ("", ""),
        ("  ", ""),
        ("https://ledger.example/", "https://ledger.example"),
        (" http://10.0.0.7:8017 ", "http://10.0.0.7:8017"),
        ("https://lab.example/titrants/", "https://lab.example/titrants"),
        ("https://[::1]:8017", "https://[::1]:8017"),
    ],
)
def test_own_address_is_kept_without_a_slash_at_its_end(typed, kept):
    assert read_base_url(typed) == kept


@pytest.mark.parametrize(
    "typed",
    ["ledger.example", "ftp://x", "https://", "https://x/?a=1", "https://x/#a", "https://a b",
     "https://u:p@x", "https://x:0", "https://x:99999", "https://[::1", "https://bücher.example",
     "https://x/\n", "https://" + "x" * 200, "javascript:alert(1)"],
)  # fmt: skip
def test_own_address_that_is_none_is_refused_by_field(typed):
    if typed.endswith("\n"):
        typed += "y"
    with pytest.raises(Unacceptable) as refused:
        read_base_url(typed)
    assert refused.value.field == "base_url"


@pytest.mark.parametrize(("typed", "kept"), [("", ""), (" ch ", "CH"), ("DE", "DE")])
def test_country_is_two_capital_letters_or_none(typed, kept):
    assert read_country(typed) == kept


@pytest.mark.parametrize("typed", ["C", "CHE", "C1", "ÄÖ", "C H"])
def test_country_that_is_none_is_refused_by_field(typed):
    with pytest.raises(Unacceptable) as refused:
        read_country(typed)
    assert refused.value.field == "country"

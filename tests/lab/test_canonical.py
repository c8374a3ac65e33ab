import hashlib
import json
from decimal import Decimal

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from server.lab.canonical import canonical, digest

VALUES = st.recursive(
    st.none()
    | st.booleans()
    | st.integers()
    | st.floats(allow_nan=False, allow_infinity=False)
    | st.text(st.characters(exclude_categories=["Cs"])),
    lambda inner: (
        st.lists(inner, max_size=4)
        | st.dictionaries(st.text(st.characters(exclude_categories=["Cs"])), inner, max_size=4)
    ),
    max_leaves=12,
)


def test_canonical_object_has_sorted_keys_and_no_spaces():
    assert canonical({"b": [1, 2.5], "a": "µ"}) == '{"a":"µ","b":[1,2.5]}'


def test_canonical_decimal_keeps_its_zeros_as_text():
    assert canonical({"V": Decimal("18.60")}) == '{"V":"18.60"}'


@pytest.mark.parametrize("value", [float("nan"), float("inf")])
def test_canonical_number_that_json_lacks_is_refused(value):
    with pytest.raises(ValueError, match="JSON"):
        canonical(value)


def test_canonical_unknown_type_is_refused():
    with pytest.raises(TypeError, match="set has no canonical text"):
        canonical({1, 2})


@settings(deadline=None, max_examples=60)
@given(VALUES)
def test_canonical_any_value_reads_back_and_is_stable(value):
    text = canonical(value)
    assert json.loads(text) == value
    assert canonical(json.loads(text)) == text


def test_digest_is_sha256_of_the_bytes():
    assert digest("18.60 mL µ") == hashlib.sha256("18.60 mL µ".encode()).hexdigest()

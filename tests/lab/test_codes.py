from random import Random

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from server.lab.codes import ALPHABET, LENGTH, holds, nearest, new_code, read_code
from server.lab.refusal import NotFound

CODES = st.integers(min_value=0).map(lambda seed: new_code(Random(seed)))


def test_alphabet_has_31_characters_without_those_that_look_alike():
    assert len(ALPHABET) == len(set(ALPHABET)) == 31
    assert not set("ILOUV") & set(ALPHABET)


@settings(deadline=None, max_examples=60)
@given(CODES)
def test_new_code_holds(code):
    assert len(code) == LENGTH == 8
    assert holds(code)


@settings(deadline=None, max_examples=60)
@given(CODES, st.integers(0, LENGTH - 1), st.sampled_from(ALPHABET))
def test_code_with_one_wrong_character_does_not_hold(code, place, other):
    wrong = code[:place] + other + code[place + 1 :]
    assert holds(wrong) is (wrong == code)


@settings(deadline=None, max_examples=60)
@given(CODES, st.integers(0, LENGTH - 2))
def test_code_with_neighbours_swapped_does_not_hold(code, place):
    a, b = code[place], code[place + 1]
    swapped = code[:place] + b + a + code[place + 2 :]
    assert holds(swapped) is (a == b)


def test_code_every_single_error_and_swap_of_one_code_is_caught():
    code = new_code(Random(7))
    wrong = {code[:i] + c + code[i + 1 :] for i in range(LENGTH) for c in ALPHABET} - {code}
    wrong |= {
        code[:i] + code[i + 1] + code[i] + code[i + 2 :] for i in range(LENGTH - 1)
    } - {code}  # fmt: skip
    assert len(wrong) >= LENGTH * 30
    assert not any(map(holds, wrong))


@settings(deadline=None, max_examples=60)
@given(CODES)
def test_read_code_any_case_and_spaces_is_taken(code):
    assert read_code(f" {code[:4].lower()} {code[4:]} ") == code
    assert read_code(f"{code[:4]}-{code[4:]}") == code


@pytest.mark.parametrize("text", ["", "ABC", "IIIIIIII", "0000000X", "00000000" * 2, "ÄÖÜ00000"])
def test_read_code_no_code_is_refused_by_field(text):
    with pytest.raises(NotFound) as refused:
        read_code(text)
    assert refused.value.field == "code"


@settings(deadline=None, max_examples=60)
@given(CODES, st.integers(0, LENGTH - 2))
def test_nearest_swapped_code_finds_the_right_one_first(code, place):
    swapped = code[:place] + code[place + 1] + code[place] + code[place + 2 :]
    assert nearest(swapped.lower(), ["ZZZZZZZZ", code])[0] == code


def test_nearest_far_codes_are_not_offered():
    assert nearest("00000000", ["ZZZZZZZZ", "000ZZZ00"]) == []


def test_nearest_dropped_character_finds_the_code():
    assert nearest("ABCDEF1", ["ABCDEF12"]) == ["ABCDEF12"]


def test_nearest_many_close_codes_are_cut_to_five():
    known = [f"0000000{c}" for c in ALPHABET]
    assert len(nearest("0000000%", known)) == 5

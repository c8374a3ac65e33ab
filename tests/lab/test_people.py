import pytest

from server.lab.people import check_name, check_roles, initials_of, read_initials, sign_in_key
from server.lab.refusal import Unacceptable


def test_roles_are_sorted_once_each():
    assert check_roles(["keeper", "analyst", "keeper"]) == ("analyst", "keeper")


@pytest.mark.parametrize(
    "roles", [[], ["king"], ["steward", "analyst"], ["steward", "reader"], ["Analyst"]]
)
def test_roles_none_unknown_or_steward_beside_another_are_refused(roles):
    with pytest.raises(Unacceptable) as refused:
        check_roles(roles)
    assert refused.value.field == "roles"


def test_steward_alone_is_taken():
    assert check_roles(["steward"]) == ("steward",)


@pytest.mark.parametrize(
    "name", ["<b>Ida</b>", "O'Neill & Söhne", "检验员", "'; DROP TABLE lot; --"]
)
def test_name_with_markup_is_kept_as_characters(name):
    assert check_name(f"  {name} ", "printed_name", example="Ida Mohnke") == name


@pytest.mark.parametrize("name", ["", "   ", "x" * 81, "a\nb", "a\0b", "\ud800", "a\u202eb"])
def test_name_empty_long_or_unprintable_is_refused_by_field(name):
    with pytest.raises(Unacceptable) as refused:
        check_name(name, "printed_name", example="Ida Mohnke")
    assert (refused.value.field, refused.value.example) == ("printed_name", "Ida Mohnke")


def test_name_composed_and_decomposed_spelling_are_one():
    assert check_name("Zoe\u0308", "name", example="x") == "Zoë"


def test_sign_in_key_case_width_and_spaces_do_not_count():
    assert sign_in_key("  Ｉda.M ") == sign_in_key("IDA.m") == "ida.m"


@pytest.mark.parametrize(
    ("name", "initials"),
    [
        ("Ida Mohnke", "IM"),
        ("Ida", "I"),
        ("ida van der Aar", "IA"),
        ("<Ida> Aar", "A"),
        ("!?", "?"),
    ],
)
def test_initials_are_first_letters_of_first_and_last_word(name, initials):
    assert initials_of(name) == initials


def test_initials_given_are_kept_or_refused_never_cut():
    assert read_initials(" IdM ") == "IdM"
    assert read_initials("  ") == ""
    for odd in ("IDAMO", "I\0"):
        with pytest.raises(Unacceptable, match="initials takes"):
            read_initials(odd)

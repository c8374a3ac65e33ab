import pytest

from server.metrology.rounding import (
    printed_k,
    report,
    rounded_pair,
    rounding_exponent,
    significant,
)


@pytest.mark.parametrize(
    ("value", "U", "shown"),
    [
        (0.10213615970679157, 0.0002009714, ("0.10214", "0.00020")),
        (0.10213615970679157, 0.000996, ("0.1021", "0.0010")),
        (0.1, 0.00035, ("0.10000", "0.00035")),
        (1002.69972, 1.67, ("1002.7", "1.7")),
        (50000838.0, 93.2, ("50000838", "93")),
        (50000838.0, 932.0, ("50000840", "930")),
        (0.125, 0.25, ("0.12", "0.25")),
        (0.135, 0.25, ("0.14", "0.25")),
        (1.00000000012, 0.0000000034, ("1.0000000001", "0.0000000034")),
    ],
)
def test_rounded_pair_two_digits_of_U_half_to_even(value, U, shown):
    # JCGM 100, 7.2.6; ties to even as in ISO 80000-1, annex B, rule A
    assert rounded_pair(value, U) == shown


def test_rounding_exponent_u_that_rounds_up_keeps_two_digits():
    assert rounding_exponent(0.0996) == -2
    assert rounding_exponent(0.0994) == -3


def test_report_reads_as_it_is_printed():
    assert report(0.1021361, 0.000200971, "mol/L", 2.0) == "0.10214 ± 0.00020 mol/L (k = 2.0)"


@pytest.mark.parametrize(("k", "shown"), [(2.0, "2.0"), (2.776, "2.78"), (2.1, "2.1")])
def test_printed_k_has_no_needless_zero(k, shown):
    assert printed_k(k) == shown


@pytest.mark.parametrize(
    ("value", "shown"), [(0, "0"), (-0.00012345, "-0.00012"), (1234.5, "1200")]
)
def test_significant_keeps_sign_and_size(value, shown):
    assert significant(value) == shown

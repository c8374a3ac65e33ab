"""Published titrations and titrimetric equivalents, through the whole evaluation."""

from decimal import Decimal

import pytest

from server.chemistry.reactions import CUBIC_EXPANSION_PER_K
from server.evaluation.circumstances import Circumstances
from server.evaluation.entrance import evaluate

EXACTLY = {"value": "1", "u": "0"}


def _record(titrant, standard, nominal, **more):
    record = {
        "format": "bench-record/1",
        "titrant": {"substance": titrant, "nominal": {"value": nominal, "unit": "mol/L"}},
        "route": "weighed",
        "standard": {"substance": standard, "mass_fraction": EXACTLY},
        "balance": {"buoyancy": False},
        "burette": {
            "capacity": {"value": "50", "unit": "mL"},
            "delivery": {"unit": "mL", "u": "0.02"},
        },
    }
    if titrant == "HClO4":
        record["titrant"]["medium"] = "acetic acid"
        expansion = f"{CUBIC_EXPANSION_PER_K['HClO4']:g}"
        record["liquid_expansion"] = {"value": expansion, "unit": "1/K"}
    return record | more


def _concentration(record):
    return evaluate(record)["concentration"]["value"]


def test_thiosulfate_against_iodate_gives_the_textbook_s_concentration():
    # Skoog, West, Holler, Crouch, Fundamentals of Analytical Chemistry, example on standardizing
    # sodium thiosulfate: 0.1210 g KIO3, 41.64 mL, 0.08147 M (from memory)
    replicates = [{"mass": "0.1210", "delivered": "41.64"}]
    c = _concentration(_record("Na2S2O3", "KIO3", "0.08", replicates=replicates, **_ONE))
    assert c == pytest.approx(0.08147, abs=0.5e-5)


def test_permanganate_against_oxalate_gives_the_textbook_s_concentration():
    # Harris, Quantitative Chemical Analysis, example on standardizing permanganate: 0.3562 g
    # Na2C2O4 in 250.0 mL, 10.00 mL of it took 48.36 mL, the blank 0.03 mL, 8.80e-4 M (from memory)
    record = _record(
        "KMnO4",
        "Na2C2O4",
        "0.00088",
        route="aliquot",
        solution={
            "mass": {"value": "0.3562", "unit": "g", "u": "0.0001"},
            "flask": {"volume": {"value": "250.0", "unit": "mL", "u": "0.1"}},
        },
        pipette={"delivery": {"value": "10.00", "unit": "mL", "u": "0.01"}},
        blank={"value": "0.03", "unit": "mL", "u": "0.01", "kind": "reagent"},
        replicates=[{"delivered": "48.36"}],
        **_ONE,
    )
    assert _concentration(record) == pytest.approx(8.80e-4, abs=0.5e-6)


_ONE = {"repeatability": {"relative_u": "0.001", "applies_to": "mean"}}

# mg of the standard that 1 mL of a titrant of this concentration takes: the equivalents that the
# assays of the European Pharmacopoeia and of the USP state (from memory)
EQUIVALENTS = [
    ("EDTA", "ZnO", "0.1", "8.14"),
    ("EDTA", "Zn", "0.1", "6.54"),
    ("EDTA", "CaCO3", "0.1", "10.01"),
    ("AgNO3", "NaCl", "0.1", "5.844"),
    ("AgNO3", "KCl", "0.1", "7.46"),
    ("NaOH", "C7H6O2", "0.1", "12.21"),
    ("NaOH", "KHP", "0.1", "20.42"),
    ("NaOH", "H2C2O4", "0.1", "6.303"),
    ("HClO4", "KHP", "0.1", "20.42"),
    ("HCl", "Na2CO3", "1", "53.00"),
    ("HCl", "TRIS", "0.1", "12.11"),
    ("H2SO4", "Na2CO3", "0.5", "53.00"),
    ("HCl", "Na2B4O7", "0.1", "19.07"),
    ("KMnO4", "Na2C2O4", "0.02", "6.700"),
    ("Ce(SO4)2", "Na2C2O4", "0.1", "6.700"),
    ("Na2S2O3", "K2Cr2O7", "0.1", "4.903"),
    ("Na2S2O3", "KIO3", "0.1", "3.567"),
]


@pytest.mark.parametrize(
    ("titrant", "standard", "c", "mg"), EQUIVALENTS, ids=[f"{a}-{b}" for a, b, *_ in EQUIVALENTS]
)
def test_titrimetric_equivalent_gives_the_titrant_s_concentration(titrant, standard, c, mg):
    replicates = [{"mass": str(20 * Decimal(mg) / 1000), "delivered": "20.00"}]
    found = _concentration(_record(titrant, standard, c, replicates=replicates, **_ONE))
    # what the printed figure's last digit leaves open, and 1e-4 for weights of another year
    half_a_digit = 0.5 * 10.0 ** Decimal(mg).as_tuple().exponent
    assert found == pytest.approx(float(c), rel=half_a_digit / float(mg) + 1e-4)


# GB/T 601-2016, two people with four parallels each, worked example: the first four of A are
# refused for their relative range of 0.246 %, repeated and with B's they pass (mol/L)
A_FIRST = ("0.10142", "0.10156", "0.10139", "0.10131")
A_REPEATED = ("0.10142", "0.10148", "0.10139", "0.10145")
B = ("0.10138", "0.10142", "0.10135", "0.10140")


def _two_people(first, second):
    # a mass in proportion to each published concentration, in the same volume
    replicates = [
        {"mass": str(Decimal(c) * 4), "delivered": "20.00", "label": str(at)}
        for at, c in enumerate((*first, *second), 1)
    ]
    circumstances = Circumstances(analysts=("A",) * 4 + ("B",) * 4, two_people=True)
    result = evaluate(
        _record("NaOH", "KHP", "0.1", replicates=replicates), circumstances=circumstances
    )
    (found,) = (one for one in result["findings"] if one["name"] == "two people")
    return found


def test_two_people_gbt_601_example_passes_with_the_published_ranges():
    found = _two_people(A_REPEATED, B)
    assert found["verdict"] == "holds"
    # A's 9e-5 of 0.10144, and all eight's 13e-5 of 0.10141
    assert found["figure_text"] == "0.089 % and 0.128 %"
    assert found["limit_text"] == "0.15 % and 0.18 %"


def test_two_people_gbt_601_example_of_the_first_four_is_refused():
    found = _two_people(A_FIRST, B)
    assert found["verdict"] == "fails"
    # 0.246 % published, 25e-5/0.10142 = 0.2465 % to four digits
    assert float(found["figure_text"].split()[0]) == pytest.approx(0.2465, abs=6e-4)

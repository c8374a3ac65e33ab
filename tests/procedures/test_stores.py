from concurrent.futures import ThreadPoolExecutor

import pytest
from sqlalchemy import select

from server.lab.refusal import SavedFirst, Unacceptable
from server.procedures.stores import (
    ReceiveStandardLot,
    WriteRecipe,
    receive_standard_lot,
    write_recipe,
)
from server.records.tables.stores import Recipe, StandardLot

FRACTION = {"value": "0.99990", "U": "0.00040", "k": "2"}
DOCUMENT = {
    "title": "Hydrochloric acid against TRIS",
    "titrant": {"substance": "HCl", "nominal": "0.10"},
    "standard": "TRIS",
    "end_point": {"mode": "potentiometric"},
}


def receive(lab, **given):
    usual = {
        "name": "TRIS lot 1", "substance": "TRIS", "certificate_number": "RM-8",
        "issuer": "reference house", "due_on": "2027-01-31", "due_basis": "expiry",
        "mass_fraction": FRACTION,
    }  # fmt: skip
    return lab.act(receive_standard_lot, ReceiveStandardLot(**usual | given), "keeper")


def write(lab, name="HCl against TRIS", version=0, who="keeper", **given):
    return lab.act(write_recipe, WriteRecipe(name, DOCUMENT | given, version), who)


def row(lab, table, key):
    return lab.transactions.read(lambda session: session.get(table, key))


def test_standard_lot_keeps_the_digits_of_its_certificate(lab):
    key = receive(
        lab, molar_mass={"value": "121.1350", "unit": "g/mol", "u": "0.0020"}, basis="dried",
        density={"value": "1.330", "unit": "g/cm3"}, minimum_sample_g="0.10", drying=" 2 h ",
    )  # fmt: skip
    found = row(lab, StandardLot, key)
    assert found.document == {
        "mass_fraction": FRACTION,
        "molar_mass": {"value": "121.1350", "unit": "g/mol", "u": "0.0020"},
        "density": {"value": "1.330", "unit": "g/cm3"},
        "basis": "dried", "drying": "2 h", "minimum_sample_g": "0.10",
    }  # fmt: skip
    # good through 31 January in Berlin
    assert found.due_at.isoformat() == "2027-01-31T23:00:00+00:00"
    assert lab.acts()[-1] == ("Nils Obermark", "received a standard lot", "standard lot")


@pytest.mark.parametrize(
    ("given", "field"),
    [
        ({"name": "KHP lot 7"}, "name"),
        ({"name": ""}, "name"),
        ({"due_on": "2026-05-03"}, "due_on"),
        ({"due_on": "9999-12-31"}, "due_on"),
        ({"due_on": "soon"}, "due_on"),
        ({"issuer": ""}, "issuer"),
        ({"certificate_number": ""}, "certificate_number"),
        ({"due_basis": ""}, "due_basis"),
        ({"mass_fraction": None}, "mass_fraction"),
        ({"mass_fraction": {"value": "99.99"}}, "mass_fraction"),
        ({"mass_fraction": {"value": "0"}}, "mass_fraction.value"),
        ({"mass_fraction": {"value": "0.9999"}}, "mass_fraction.U"),
        ({"mass_fraction": {"value": "0.9999", "unit": "%"}}, "mass_fraction.unit"),
        ({"mass_fraction": {"value": "0.9999", "u": "0.1", "U": "0.2"}}, "mass_fraction.U"),
        ({"mass_fraction": {"value": "0.9999", "error": "0.1"}}, "mass_fraction.error"),
        ({"molar_mass": {"value": "121.135", "unit": "g"}}, "molar_mass.unit"),
        ({"molar_mass": {"value": "-121.135", "unit": "g/mol"}}, "molar_mass.value"),
        ({"density": {"value": "0", "unit": "g/cm3"}}, "density.value"),
        ({"minimum_sample_g": "-0.1"}, "minimum_sample_g.value"),
        ({"minimum_sample_g": "much"}, "minimum_sample_g.value"),
        ({"basis": "wet"}, "basis"),
        ({"substance": "white powder"}, "molar_mass"),
        ({"storage": "a\0"}, "storage"),
    ],
)
def test_standard_lot_odd_statement_is_refused_by_field(shared_lab, given, field):
    with pytest.raises(Unacceptable) as refused:
        receive(shared_lab, **given)
    assert refused.value.field == field


def test_recipe_is_kept_as_written_and_versioned(lab):
    first = write(lab)
    second = write(lab, version=1, replicates=4)
    assert row(lab, Recipe, first).document == DOCUMENT
    assert row(lab, Recipe, second).version == 2
    assert row(lab, Recipe, second).document["titrant"]["nominal"] == "0.10"
    assert lab.acts()[-1] == ("Nils Obermark", "wrote a recipe", "recipe")


def test_recipe_written_from_an_older_version_shows_the_newest(sqlite_lab):
    write(sqlite_lab)
    with pytest.raises(SavedFirst) as refused:
        write(sqlite_lab, replicates=4)
    assert refused.value.shown == {"standing": {"version": 1}}
    with pytest.raises(SavedFirst, match="There is no recipe"):
        write(sqlite_lab, name="New", version=1)


def test_recipe_saved_by_twelve_at_once_is_saved_once_and_the_others_are_told(lab):
    write(lab)

    def save(n):
        try:
            return write(lab, version=1, replicates=n + 1, who=("keeper", "second keeper")[n % 2])
        except SavedFirst:
            return None

    with ThreadPoolExecutor(12) as pool:
        answers = list(pool.map(save, range(12)))
    assert sum(one is not None for one in answers) == 1
    asked = select(Recipe.version).where(Recipe.name == "HCl against TRIS")
    versions = lab.transactions.read(lambda session: session.scalars(asked).all())
    assert sorted(versions) == [1, 2]


def test_recipe_of_an_unknown_reaction_needs_its_ratio(sqlite_lab):
    titrant = {"substance": "KOH", "nominal": "0.1"}
    with pytest.raises(Unacceptable) as refused:
        write(sqlite_lab, name="Odd", titrant=titrant, standard="NaCl")
    assert (refused.value.field, refused.value.example) == ("ratio", "2/5")
    assert write(sqlite_lab, name="Odd", titrant=titrant, standard="NaCl", ratio="1")


def test_recipe_odd_document_is_refused_by_path(shared_lab):
    with pytest.raises(Unacceptable) as refused:
        write(shared_lab, end_point={"mode": "by ear"})
    assert refused.value.field == "end_point.mode"

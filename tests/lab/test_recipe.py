import json

import pytest

from server.lab.recipe import read_recipe
from server.lab.refusal import Unacceptable

SMALLEST = {
    "title": "Sodium hydroxide against KHP",
    "titrant": {"substance": "NaOH", "nominal": "0.1"},
    "standard": "KHP",
    "end_point": {"mode": "visual", "indicator": "phenolphthalein"},
}


def refusal(**changed):
    with pytest.raises(Unacceptable) as refused:
        read_recipe(SMALLEST | changed)
    return refused.value


def test_recipe_smallest_document_gets_careful_defaults():
    read = read_recipe(SMALLEST)
    assert read.titrant.medium == "water"
    assert (read.route, read.weighing, read.replicates) == ("weighed", "difference", 6)
    assert (read.buoyancy, read.temperature, read.blank) == (True, "once", None)
    assert (read.interval_days, read.notice_days) == (30, 3)
    assert read.valid_for == "visual, phenolphthalein"
    assert read.steps == ()


def test_recipe_notice_is_never_longer_than_the_interval():
    assert read_recipe(SMALLEST | {"interval_days": 2}).notice_days == 2
    assert refusal(interval_days=2, notice_days=3).field == "notice_days"


def test_recipe_potentiometric_end_point_has_no_indicator():
    read = read_recipe(SMALLEST | {"end_point": {"mode": "potentiometric"}})
    assert read.end_point.indicator is None
    assert read.valid_for == "potentiometric"


def test_recipe_numbers_stay_the_text_that_was_typed():
    read = read_recipe(
        SMALLEST
        | {
            "titrant": {"substance": "NaOH", "nominal": "0.100"},
            "repeatability": {"relative_u": "0.00050", "dof": "24", "source": "validation"},
            "limits": {"spread_percent": "0.150"},
            "liquid_expansion": {"value": "2.10e-4", "unit": "1/K"},
        }
    )
    assert read.titrant.nominal == "0.100"
    assert read.repeatability == {
        "relative_u": "0.00050", "dof": "24", "applies_to": "one", "source": "validation",
    }  # fmt: skip
    assert read.limits == {"spread_percent": "0.150"}
    assert read.liquid_expansion == {"value": "2.10e-4", "unit": "1/K"}


@pytest.mark.parametrize("ratio", ["1", "2/5", "0.5", "6"])
def test_recipe_ratio_number_or_fraction_is_taken(ratio):
    assert read_recipe(SMALLEST | {"ratio": ratio}).ratio == ratio


@pytest.mark.parametrize(
    "ratio", ["0", "-1", "1/0", "1e9", "1e999999999", "x", 2, [], {}, True, "1" * 10, "1 /2"]
)
def test_recipe_odd_ratio_is_refused_by_field(ratio):
    refused = refusal(ratio=ratio)
    assert (refused.field, refused.example) == ("ratio", "2/5")


@pytest.mark.parametrize(
    ("changed", "field"),
    [
        ({"colour": "pink"}, "colour"),
        ({"title": ""}, "title"),
        ({"title": "x" * 121}, "title"),
        ({"title": "a\0b"}, "title"),
        ({"titrant": None}, "titrant"),
        ({"titrant": {"substance": "NaOH", "nominal": 0.1}}, "titrant.nominal"),
        ({"titrant": {"substance": "NaOH", "nominal": "0,1"}}, "titrant.nominal"),
        ({"titrant": {"substance": "NaOH", "nominal": "-0.1"}}, "titrant.nominal"),
        ({"titrant": {"substance": "", "nominal": "0.1"}}, "titrant.substance"),
        ({"titrant": {"substance": "NaOH", "nominal": "0.1", "x": 1}}, "titrant.x"),
        ({"route": "guessed"}, "route"),
        ({"weighing": []}, "weighing"),
        ({"replicates": 0}, "replicates"),
        ({"replicates": True}, "replicates"),
        ({"replicates": "9" * 5000}, "replicates"),
        ({"end_point": {"mode": "visual"}}, "end_point.indicator"),
        ({"end_point": {"mode": "by ear"}}, "end_point.mode"),
        ({"blank": "water"}, "blank"),
        ({"excess": {"value": "0.05", "unit": "L"}}, "excess.unit"),
        ({"buoyancy": "yes"}, "buoyancy"),
        ({"temperature": "never"}, "temperature"),
        ({"repeatability": {"relative_u": "0"}}, "repeatability.relative_u"),
        ({"repeatability": {"relative_u": "0.0005", "dof": 0}}, "repeatability.dof"),
        (
            {"repeatability": {"relative_u": "0.0005", "applies_to": "all"}},
            "repeatability.applies_to",
        ),
        ({"interval_days": 3661}, "interval_days"),
        ({"steps": "mix"}, "steps"),
        ({"steps": [{"key": "Dry!", "label": "x"}]}, "steps[0].key"),
        ({"steps": [{"key": "a", "label": "x"}, {"key": "a", "label": "y"}]}, "steps[1].key"),
        ({"steps": [{"key": "a", "label": "x", "when": "later"}]}, "steps[0].when"),
        ({"steps": ["mix"]}, "steps[0]"),
        ({"limits": {"spread": "0.2"}}, "limits.spread"),
        ({"limits": {"spread_percent": 0.2}}, "limits.spread_percent"),
        ({"limits": "none"}, "limits"),
    ],
)
def test_recipe_odd_value_is_refused_by_its_path(changed, field):
    assert refusal(**changed).field == field


def test_recipe_other_medium_needs_its_expansion():
    changed = {"titrant": {"substance": "NaOH", "nominal": "0.1", "medium": "methanol"}}
    assert refusal(**changed).field == "liquid_expansion"
    stated = changed | {"liquid_expansion": {"value": "1.1e-3", "unit": "1/K"}}
    assert read_recipe(SMALLEST | stated).titrant.medium == "methanol"


@pytest.mark.parametrize("document", [None, [], "recipe", 7])
def test_recipe_no_object_is_refused(document):
    with pytest.raises(Unacceptable, match="must be an object"):
        read_recipe(document)


def test_recipe_read_from_json_text_is_the_same():
    assert read_recipe(json.loads(json.dumps(SMALLEST))) == read_recipe(SMALLEST)


CURVE = {"mode": "potentiometric", "method": "model fit"}


def by_probe(**end_point):
    return {**SMALLEST, "blank": "none", "end_point": {**CURVE, **end_point}}


def test_recipe_with_a_method_takes_a_curve():
    recipe = read_recipe(by_probe(system="khp-naoh", flask_volume_mL="50"))
    told = recipe.end_point
    assert told.takes_curve
    assert (told.method, told.system, told.flask_volume_mL) == ("model fit", "khp-naoh", "50")
    assert recipe.valid_for == "potentiometric, model fit"


def test_recipe_without_a_method_takes_burette_readings_as_before():
    recipe = read_recipe({**SMALLEST, "end_point": {"mode": "potentiometric"}})
    assert not recipe.end_point.takes_curve
    assert recipe.valid_for == "potentiometric"


@pytest.mark.parametrize(
    ("document", "field"),
    [
        (by_probe(method="by eye"), "end_point.method"),
        (by_probe(system="water"), "end_point.system"),
        (by_probe(system="tris-hcl"), "end_point.system"),
        (by_probe(system="none"), "end_point.method"),
        (by_probe(flask_volume_mL="0"), "end_point.flask_volume_mL"),
        (by_probe(flask_volume_mL=50), "end_point.flask_volume_mL"),
        (by_probe(indicator="phenolphthalein", method="", system="khp-naoh"), "end_point.method"),
        (by_probe(mode="visual", indicator="phenolphthalein"), "end_point.method"),
        ({**by_probe(), "blank": "indicator"}, "blank"),
        ({**by_probe(), "excess": {"value": "0.02", "unit": "mL", "u": "0.01"}}, "excess"),
        ({**by_probe(), "standard": "NaCl"}, "end_point.method"),
    ],
)
def test_recipe_for_a_curve_that_cannot_be_names_the_field(document, field):
    with pytest.raises(Unacceptable) as refused:
        read_recipe(document)
    assert refused.value.field == field

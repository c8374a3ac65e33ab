"""Curves over the API: shown before they are kept, kept with their original, refused in words."""


import pytest

RECIPE = {
    "title": "NaOH 0.1 mol/L by probe",
    "titrant": {"substance": "NaOH", "nominal": "0.1"},
    "standard": "KHP",
    "replicates": "3",
    "end_point": {"mode": "potentiometric", "method": "model fit", "flask_volume_mL": "50"},
    "buoyancy": False,
}


@pytest.fixture(scope="module")
def bench(shared_web):
    """An analyst with an open sheet that takes curves, and the sheet's address."""
    keeper, analyst = shared_web.client("jonas"), shared_web.client("imke")
    body = {"name": "NaOH by probe, door", "document": RECIPE}
    recipe = keeper.post("/api/stores/recipes", body)
    assert recipe.status_code == 201, recipe.text
    lots = analyst.get("/api/sheets").json()["lots"]
    lot = next(
        one for one in lots if one["refused"] is None and "NaOH" in one["says"] + one["name"]
    )
    stores = analyst.get("/api/stores").json()
    standard = next(one for one in stores["standard_lots"] if one["name"].startswith("KHP"))
    tools = {one["kind"]: one["id"] for one in analyst.get("/api/instruments").json()["lines"]}
    begun = analyst.post(
        "/api/sheets",
        {
            "lot_code": lot["id"],
            "recipe_id": recipe.json()["id"],
            "standard_lot_id": standard["id"],
            "balance_id": tools["balance"],
            "burette_id": tools["burette"],
            "thermometer_id": tools["thermometer"],
            "probe_id": tools["probe"],
        },
    )
    assert begun.status_code == 201, begun.text
    return analyst, begun.json()["id"]

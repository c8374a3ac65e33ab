"""Bench records with the simulated curves whose equivalence volumes are known."""

import copy
import json
from pathlib import Path

import numpy as np
import pytest

from tests.lab.conftest import entry, facts, recipe  # noqa: F401 - fixtures of sheets

CURVES = json.loads(
    (Path(__file__).parents[1] / "reference" / "curves" / "simulated.json").read_text("utf-8")
)["curves"]
# g/mol, as the records below state them, so that no table decides what comes out
MOLAR = {"KHP": 204.2212, "TRIS": 121.135, "Na2CO3": 105.988}
SYSTEM = {"tris-hcl": ("HCl", "TRIS"), "carbonate-hcl-two-steps": ("HCl", "Na2CO3")}


class CurveRecords:
    """Records made of one simulated curve, each replicate with its own scatter."""

    curves = CURVES

    def replicate(self, name, *, seed=None, mass=None, digits=3, decimals=6):
        curve = CURVES[name]
        y = np.asarray(curve["y"], float)
        if seed is not None:
            scatter = 0.005 if curve["kind"] == "pH" else 0.5
            y = y + np.random.default_rng(seed).normal(0, scatter, y.size)
        points = {
            "volume_mL": [f"{one:g}" for one in curve["V"]],
            curve["kind"]: [f"{one:.{digits}f}" for one in y],
        }
        return {"mass": f"{mass or self.mass(name):.{decimals}f}", "curve": points}

    def mass(self, name):
        curve = CURVES[name]
        _, standard = SYSTEM.get(name, ("NaOH", "KHP"))
        n = curve.get("n_acid_mmol") or curve.get("n_base_mmol")
        return n * MOLAR[standard] / 1000

    def record(self, name, *, replicates=3, method=None, **more):
        curve = CURVES[name]
        titrant, standard = SYSTEM.get(name, ("NaOH", "KHP"))
        asked = {"flask_volume": {"value": str(curve["V0_mL"]), "unit": "mL"}}
        if method is not None:
            asked["method"] = method
        record = {
            "format": "bench-record/1",
            "titrant": {"substance": titrant, "nominal": {"value": "0.1", "unit": "mol/L"}},
            "route": "weighed",
            "standard": {
                "substance": standard,
                "mass_fraction": {"value": "1.0000", "u": "0.0002", "id": "lot"},
                "molar_mass": {"value": str(MOLAR[standard]), "unit": "g/mol"},
            },
            "temperature": {"value": "25.0", "unit": "Cel"},
            # the simulated volumes are those at 25 Cel
            "liquid_expansion": {"value": "0", "unit": "1/K"},
            "end_point": asked,
            "replicates": [self.replicate(name, seed=i) for i in range(replicates)],
        }
        return copy.deepcopy({**record, **more})

    def redox(self, *, replicates=3, **more):
        """Cerium(IV) into iron(II) in mV, as an aliquot of a solution of known concentration."""
        curve = CURVES["fe-ce-redox-mV"]
        rows = [
            self.replicate("fe-ce-redox-mV", seed=i, mass=1, digits=1) for i in range(replicates)
        ]
        record = {
            "format": "bench-record/1",
            "titrant": {"substance": "Ce(SO4)2", "nominal": {"value": "0.1", "unit": "mol/L"}},
            "route": "aliquot",
            "ratio": "1",
            "solution": {
                "concentration": {"value": f"{curve['n_mmol'] / 25:.9f}", "unit": "mol/L"}
            },
            "pipette": {"delivery": {"value": "25.00", "unit": "mL"}},
            "replicates": [{"curve": one["curve"]} for one in rows],
        }
        return copy.deepcopy({**record, **more})


@pytest.fixture(scope="session")
def curve_records():
    return CurveRecords()

"""Over random records of the routes back and mass-titre, GTC finds the same c, u and dof.

The two models are written down once more here, from the equations alone, on top of the second
implementation's water, air, weighing and roots. GTC (Measurement Standards Laboratory of New
Zealand) propagates them by automatic derivatives.
"""

import copy
import math
import random
from types import SimpleNamespace

import pytest

from server.evaluation.entrance import evaluate
from tests.reference.test_second_implementations import (
    df_of,
    random_record,
    second_air,
    second_factor,
    second_mass,
    second_per_gram,
    second_read,
    statement,
    u_of,
)

SEED = 20261203
RECORDS = 120
ROOTS = ["cal-burette", "cal-pipette", "thermo", "lot", "cal-balance-1"]


# --- records -------------------------------------------------------------------------------------
def reference(rng, strength, certificate):
    found = {
        "substance": "another titrant",
        "concentration": {
            "value": f"{strength:.7f}",
            "unit": "mol/L",
            "u": f"{0.001 * strength:.3g}",
        },
        "certificate": certificate,
    }
    if rng.random() < 0.6:
        found["components"] = [
            {"id": root, "relative": f"{rng.uniform(-0.0005, 0.0005):.6f}"}
            for root in rng.sample(ROOTS, rng.randint(1, 3))
        ]
    return found


def to_standard(rng, record):
    """A weighed record whose standard gets an excess of the titrant."""
    record["route"] = "back"
    record["back"] = {"excess_to": "standard", "ratio": rng.choice(["1", "2", "1/2"])}
    record["reference"] = reference(rng, rng.uniform(0.02, 0.2), "TL-1")
    record["pipette"] = {
        "delivery": {"value": "50.012", **statement(rng, 0.02, "mL", "cal-pipette")},
        "glass_expansion": "9.9e-6",
    }
    if rng.random() < 0.4:
        record["pipette"]["temperature"] = "22.4"
    return record


def to_unknown(rng, record):
    """A record against a titrant, with an excess of another one added to the pipetted titrant."""
    record["route"] = "back"
    del record["unknown_in"]
    back = {"excess_to": "unknown", "ratio": rng.choice(["1", "2", "1/2"])}
    record["back"] = back
    record["reference"] = reference(
        rng, float(record["reference"]["concentration"]["value"]), "TL-1"
    )
    used = max(
        sum(float(end) - float(start) for start, end in one["burette"])
        if "burette" in one
        else float(one["delivered"])
        for one in record["replicates"]
    )
    zero = used * rng.uniform(1.5, 3.5)
    if rng.random() < 0.5:
        root = rng.choice(["cal-burette", None])
        record["blank"] = {
            "value": f"{zero:.3f}",
            **statement(rng, 0.01, "mL", root),
            "kind": "zero",
        }
        record.pop("excess", None)
        return record
    per = {"1": 1.0, "2": 2.0, "1/2": 0.5}[back["ratio"]]
    strength = float(record["reference"]["concentration"]["value"]) * per * zero / 25.0
    back["added"] = {
        **reference(rng, strength, "TL-2"),
        "delivery": {"value": "25.004", **statement(rng, 0.01, "mL", "cal-pipette")},
        "glass_expansion": rng.choice(["0", "9.9e-6"]),
    }
    if rng.random() < 0.4:
        back["added"]["temperature"] = "19.2"
    return record


def mass_titre(rng, record):
    """A weighed record whose titre is counted in mg, with a drift or without one."""
    record["route"] = "mass-titre"
    record["titre_of"] = "H2O"
    del record["ratio"]
    record["titrant"]["nominal"] = {"value": "5", "unit": "mg/mL"}
    record["standard"].pop("molar_mass", None)
    if rng.random() < 0.8:
        record["drift"] = {
            "rate": {
                "value": f"{rng.uniform(100, 3000):.1f}",
                **statement(rng, 150, "ug/min", "drift"),
            }
        }
        if rng.random() < 0.5:
            record["drift"]["timing"] = statement(rng, 0.05, "min", "clock")
        for one in record["replicates"]:
            one["minutes"] = f"{rng.uniform(2, 2.2):.2f}"
    return record


def random_records(count):
    rng = random.Random(SEED)
    made = 0
    while made < count:
        record = copy.deepcopy(random_record(rng))
        if record["route"] == "weighed":
            made += 1
            yield rng.choice([to_standard, mass_titre])(rng, record)
        elif record.get("unknown_in") == "burette":
            made += 1
            yield to_unknown(rng, record)


# --- the models, once more -----------------------------------------------------------------------
class Second:
    """The mean of a record as an uncertain number of GTC; roots are one number each."""

    def __init__(self, record):
        import GTC

        self.gtc, self.record, self.roots = GTC, record, {}
        x = SimpleNamespace(quantity=self.quantity, number=self.number, exp=GTC.exp, record=record)
        x.temperature = self.quantity(record["temperature"])
        x.t0 = float(record["temperature"]["value"])
        x.beta = self.quantity(record["liquid_expansion"]) if "liquid_expansion" in record else None
        self.x = x
        self.counting = [one for one in record["replicates"] if "excluded" not in one]

    def number(self, value, u, df, root):
        if u == 0:
            return value
        if root is None:
            return value + u * self.gtc.ureal(0.0, 1.0, df)
        if root not in self.roots:
            self.roots[root] = self.gtc.ureal(0.0, 1.0, df)
        return value + u * self.roots[root]

    def quantity(self, document, scale=1.0):
        if document is None:
            return 0.0
        return self.number(
            float(document.get("value", 0)),
            scale * u_of(document),
            df_of(document, self.record),
            document.get("id"),
        )

    def factor(self, holder):
        t = float(holder.get("temperature", self.x.t0)) + (self.x.temperature - self.x.t0)
        return second_factor(self.x, t, holder)

    def strength(self, held):
        value, u = (float(held["concentration"][key]) for key in ("value", "u"))
        components = held.get("components", [])
        known = value * math.sqrt(sum(float(one["relative"]) ** 2 for one in components))
        found = self.number(value, math.sqrt(u**2 - known**2), math.inf, held["certificate"])
        for one in components:
            df = df_of({"id": one["id"]}, self.record)
            found = found + self.number(0.0, value * float(one["relative"]), df, one["id"])
        return found

    def volumes(self):
        record, burette = self.record, self.record["burette"]
        blank = None if record.get("blank", {}).get("kind") == "zero" else record.get("blank")
        self.delta = self.quantity(burette["delivery"])
        off = self.quantity(blank) + self.quantity(record.get("excess"))
        for one in self.counting:
            t = float(one.get("temperature", self.x.t0)) + (self.x.temperature - self.x.t0)
            read, fillings = second_read(one, burette.get("error_table"))
            yield (read + fillings * self.delta) * second_factor(self.x, t, burette) - off

    def masses(self):
        balance = self.record["balance"]
        shared = self.quantity(balance["linearity"], math.sqrt(2))
        shared = shared + self.quantity(balance["error_u"])
        return [second_mass(one, balance.get("error_table")) + shared for one in self.counting]

    def values(self):
        record = self.record
        if record["route"] == "mass-titre":
            return self.mass_titres()
        pipetted = self.quantity(record["pipette"]["delivery"]) * self.factor(record["pipette"])
        ratio, q = (eval_ratio(one) for one in (record["ratio"], record["back"]["ratio"]))
        volumes = list(self.volumes())
        came_back = [q * self.strength_once() * one for one in volumes]
        if record["back"]["excess_to"] == "standard":
            per_gram = second_per_gram(self.x)
            return [
                (ratio * 1000 * mass * per_gram + rest) / pipetted
                for mass, rest in zip(self.masses(), came_back, strict=True)
            ]
        added = record["back"].get("added")
        if added is None:
            zero = self.quantity(record["blank"]) + self.delta
            whole = q * self.strength_once() * zero * self.factor(self.zero_holder())
        else:
            whole = self.strength(added) * self.quantity(added["delivery"]) * self.factor(added)
        return [ratio * (whole - rest) / pipetted for rest in came_back]

    def zero_holder(self):
        return {"glass_expansion": self.record["burette"]["glass_expansion"]}

    def strength_once(self):
        if not hasattr(self, "_strength"):
            self._strength = self.strength(self.record["reference"])
        return self._strength

    def mass_titres(self):
        record = self.record
        fraction = self.quantity(record["standard"]["mass_fraction"])
        if record["balance"]["buoyancy"]:
            air = (
                self.quantity(record["air"][key]) for key in ("temperature", "pressure", "humidity")
            )
            moist = second_air(self.x, *air)
            rho = 1000 * self.quantity(record["standard"]["density"])
            fraction = fraction * (1 - moist / 8000) / (1 - moist / rho)
        drift = record.get("drift", {})
        rate, late = self.quantity(drift.get("rate")), self.quantity(drift.get("timing"))
        return [
            (1000 * mass * fraction + rate * (float(one.get("minutes", 0)) + late) / 1000) / volume
            for one, mass, volume in zip(self.counting, self.masses(), self.volumes(), strict=True)
        ]

    def mean(self):
        values = self.values()
        n = len(values)
        mean = sum(values) / n
        stated = self.record.get("repeatability", {})
        if "relative_u" in stated:
            u = float(stated["relative_u"])
            u /= 1 if stated.get("applies_to") == "mean" else math.sqrt(n)
            return mean * (1 + u * self.gtc.ureal(0.0, 1.0, float(stated.get("dof", "inf"))))
        plain = [self.gtc.value(one) for one in values]
        centre = sum(plain) / n
        s = math.sqrt(sum((one - centre) ** 2 for one in plain) / (n - 1))
        return mean * (1 + s / math.sqrt(n) / centre * self.gtc.ureal(0.0, 1.0, n - 1))


def eval_ratio(text):
    top, _, bottom = text.partition("/")
    return float(top) / float(bottom or 1)


# --- the comparison ------------------------------------------------------------------------------
def test_evaluate_back_and_mass_titre_against_gtc_agrees_on_c_u_and_dof():
    import GTC

    seen = set()
    for i, record in enumerate(random_records(RECORDS)):
        found, second = evaluate(record)["concentration"], Second(record).mean()
        back = record.get("back", {})
        seen.add((record["route"], back.get("excess_to"), "added" in back, "drift" in record))
        assert found["value"] == pytest.approx(second.x, rel=1e-9), (i, record)
        assert found["u"] == pytest.approx(second.u, rel=1e-6), (i, record)
        df = GTC.dof(second)
        if found["dof"] is None or found["dof"] > 1e6:
            assert df > 1e6, i
        else:
            assert found["dof"] == pytest.approx(df, rel=1e-4), i
    assert len(seen) == 5

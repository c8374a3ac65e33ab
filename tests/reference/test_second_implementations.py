"""Over random records of all routes, GTC and uncertainties find the same c, u and dof.

The model is written down once more here, from the equations alone: Tanaka's water density
(Metrologia 38 (2001) 301), CIPM-2007 moist air (Metrologia 45 (2008) 149), CIAAW 2021 atomic
weights (midpoint; interval or U as a rectangular half-width). GTC (Measurement Standards
Laboratory of New Zealand) and the uncertainties package propagate it by automatic derivatives.
"""

import math
import random
from collections.abc import Callable, Mapping
from fractions import Fraction
from itertools import pairwise
from types import SimpleNamespace
from typing import Any

import pytest

from server.evaluation.entrance import evaluate

SEED = 20260801
GTC_RECORDS = 1050
UNCERTAINTIES_RECORDS = 1050

# CIAAW 2021: (value, half-width), taken as rectangular
WEIGHTS = {
    "H": (1.007975, 0.000135),
    "C": (12.0106, 0.0010),
    "N": (14.006855, 0.000425),
    "O": (15.9994, 0.00037),
    "Na": (22.98976928, 2e-8),
    "Cl": (35.4515, 0.0055),
    "K": (39.0983, 0.0001),
    "I": (126.90447, 0.00003),
    "Zn": (65.38, 0.02),
}
# standard: formula, density g/cm3 (from memory, handbook values), titrant, amount of it per amount
REACTIONS = {
    "KHP": ({"C": 8, "H": 5, "O": 4, "K": 1}, 1.636, "NaOH", "1"),
    "Na2CO3": ({"Na": 2, "C": 1, "O": 3}, 2.54, "HCl", "2"),
    "TRIS": ({"C": 4, "H": 11, "N": 1, "O": 3}, 1.33, "HCl", "1"),
    "KIO3": ({"K": 1, "I": 1, "O": 3}, 3.89, "Na2S2O3", "6"),
    "Na2C2O4": ({"Na": 2, "C": 2, "O": 4}, 2.34, "KMnO4", "2/5"),
    "NaCl": ({"Na": 1, "Cl": 1}, 2.165, "AgNO3", "1"),
    "Zn": ({"Zn": 1}, 7.14, "EDTA", "1"),
}
DIVISORS = {"rectangular": math.sqrt(3), "triangular": math.sqrt(6), "arcsine": math.sqrt(2)}


# --- records -------------------------------------------------------------------------------------
def random_record(rng: random.Random) -> dict[str, Any]:
    standard = rng.choice(sorted(REACTIONS))
    formula, density, titrant, ratio = REACTIONS[standard]
    route = rng.choice(["weighed", "aliquot", "against-titrant"])
    nominal = rng.choice([0.01, 0.02, 0.05, 0.1, 0.25, 0.5])
    capacity = rng.choice([10, 25, 50])
    record: dict[str, Any] = {
        "format": "bench-record/1",
        "titrant": {"substance": titrant, "nominal": {"value": str(nominal), "unit": "mol/L"}},
        "route": route,
        "ratio": ratio,
        "burette": {
            "capacity": {"value": str(capacity), "unit": "mL"},
            "delivery": statement(rng, 0.02, "mL", "cal-burette"),
            "glass_expansion": rng.choice(["0", "9.9e-6", "2.7e-5"]),
        },
        "temperature": {
            "value": f"{rng.uniform(16, 28):.1f}",
            **statement(rng, 0.8, "Cel", "thermo"),
        },
    }
    if rng.random() < 0.5:
        points = [0, capacity / 4, capacity / 2, 3 * capacity / 4, capacity]
        record["burette"]["error_table"] = [
            [f"{x:.2f}", f"{rng.uniform(-0.02, 0.02):.3f}" if x else "0"] for x in points
        ]
    if rng.random() < 0.3:
        record["liquid_expansion"] = {"value": "2.5e-4", "unit": "1/K", "u": "1.5e-5"}
    if rng.random() < 0.4:
        record["blank"] = {
            "value": f"{rng.uniform(0, 0.05):.3f}",
            **statement(rng, 0.005, "mL", None),
            "kind": "reagent",
        }
    if rng.random() < 0.3:
        record["excess"] = {"value": f"{rng.uniform(0, 0.04):.3f}", "unit": "mL", "u": "0.01"}
    record |= random_repeatability(rng)
    amount = route_parts(rng, record, standard, nominal, capacity)
    record["replicates"] = [
        random_replicate(rng, record, amount, nominal, capacity) for _ in range(rng.randint(2, 6))
    ]
    if rng.random() < 0.3 and len(record["replicates"]) > 2:
        record["replicates"][1]["excluded"] = "colour overshot"
    return record


def statement(rng: random.Random, size: float, unit: str, root: str | None) -> dict[str, Any]:
    """One of the ways to state an uncertainty, now and then with degrees of freedom and a root."""
    found: dict[str, Any] = {"unit": unit}
    way = rng.choice(["u", "U", "half_width"])
    text = f"{size * rng.uniform(0.3, 1.5):.3g}"
    if way == "u":
        found["u"] = text
    elif way == "U":
        found |= {"U": text, "k": rng.choice(["2", "2.13"])}
    else:
        found |= {"half_width": text, "shape": rng.choice(sorted(DIVISORS))}
    if rng.random() < 0.4:
        found["dof"] = rng.choice(["5", "9", "24.5", "50"])
    if root is not None and rng.random() < 0.5:
        found["id"] = root
    return found


def random_repeatability(rng: random.Random) -> dict[str, Any]:
    way = rng.random()
    if way < 0.3:
        return {"repeatability": {"from": "replicates"}}
    if way < 0.4:
        return {}
    stated: dict[str, Any] = {"relative_u": rng.choice(["0.0004", "0.0006", "0.001"])}
    if rng.random() < 0.5:
        stated["dof"] = "24"
    if rng.random() < 0.5:
        stated["applies_to"] = rng.choice(["one", "mean"])
    return {"repeatability": stated}


def route_parts(
    rng: random.Random, record: dict[str, Any], standard: str, nominal: float, capacity: int
) -> float:
    """Add what the route needs; return mmol of titrant that one replicate's standard stands for."""
    formula, density, _, ratio = REACTIONS[standard]
    per_mol = float(Fraction(ratio))
    molar = sum(WEIGHTS[element][0] * count for element, count in formula.items())
    wanted = nominal * capacity * rng.uniform(0.45, 0.8)
    weighs = record["route"] == "weighed" or (record["route"] == "aliquot" and rng.random() < 0.6)
    if weighs:
        record["standard"] = {
            "substance": standard,
            "mass_fraction": {
                "value": f"{rng.uniform(0.995, 1.0):.5f}",
                **{k: v for k, v in statement(rng, 0.0004, "", "lot").items() if k != "unit"},
            },
        }
        if rng.random() < 0.3:
            record["standard"]["molar_mass"] = {
                "value": f"{molar:.4f}",
                "unit": "g/mol",
                "u": "0.004",
            }
        record["standard"]["density"] = {"value": str(density), "unit": "g/cm3"}
        if rng.random() < 0.5:
            record["standard"]["density"]["u"] = "0.02"
        record["balance"] = {
            "linearity": statement(rng, 0.0002, "g", "cal-balance-1"),
            "error_u": statement(rng, 0.0001, "g", "cal-balance-2"),
            "buoyancy": rng.random() < 0.7,
        }
        if rng.random() < 0.5:
            record["balance"]["error_table"] = [
                ["0", "0"],
                ["1", "0.0001"],
                ["50", "0.0004"],
                ["200", "-0.0002"],
            ]
        record["air"] = {
            "temperature": {
                "value": f"{rng.uniform(17, 26):.1f}",
                **statement(rng, 0.5, "Cel", "thermo"),
            },
            "pressure": {"value": f"{rng.uniform(940, 1030):.1f}", "unit": "hPa", "u": "2"},
            "humidity": {"value": str(rng.randint(20, 70)), "unit": "%", "u": "5"},
        }
        if not record["balance"]["buoyancy"]:
            del record["air"]  # nothing of it enters, so a root it names has no part either
    if record["route"] == "weighed":
        return wanted
    volume = float(rng.choice([v for v in (5, 10, 25) if v <= capacity]))
    record["pipette"] = {
        "delivery": {
            "value": f"{volume + rng.uniform(-0.02, 0.02):.3f}",
            # one calibration for burette and pipette, now and then: the errors add or cancel
            **statement(rng, 0.008, "mL", rng.choice(["cal-burette", "cal-pipette"])),
        },
        "glass_expansion": rng.choice(["0", "9.9e-6"]),
    }
    if rng.random() < 0.3:
        record["pipette"]["temperature"] = f"{rng.uniform(17, 26):.1f}"
    if record["route"] == "aliquot":
        strength = wanted / per_mol / volume
        if weighs:
            record["solution"] = {
                "mass": {"value": f"{strength * molar * 0.25:.4f}", "unit": "g", "u": "0.0002"},
                "flask": {
                    "volume": {"value": "250.00", **statement(rng, 0.1, "mL", "cal-flask")},
                    "glass_expansion": "9.9e-6",
                },
            }
            if rng.random() < 0.5:
                record["solution"]["flask"]["temperature"] = f"{rng.uniform(17, 26):.1f}"
        else:
            record["solution"] = {
                "concentration": {
                    "value": f"{strength:.6f}",
                    **statement(rng, 0.001 * strength, "mol/L", "bought"),
                }
            }
        return wanted
    record["unknown_in"] = rng.choice(["burette", "flask"])
    # in the flask, the burette holds the reference
    strength = wanted / per_mol / volume
    if record["unknown_in"] == "flask":
        strength = nominal * volume / per_mol / (capacity * rng.uniform(0.45, 0.8))
    u = 0.001 * strength
    record["reference"] = {
        "substance": "another titrant",
        "concentration": {"value": f"{strength:.7f}", "unit": "mol/L", "u": f"{u:.3g}"},
        "certificate": "TL-1",
    }
    if rng.random() < 0.6:
        roots = rng.sample(["cal-burette", "cal-pipette", "thermo", "lot"], rng.randint(1, 3))
        record["reference"]["components"] = [
            {"id": root, "relative": f"{rng.uniform(-0.0005, 0.0005):.6f}"} for root in roots
        ]
    if record["unknown_in"] == "flask":
        return per_mol * strength * (volume * nominal / per_mol / strength)
    return wanted


def random_replicate(
    rng: random.Random, record: dict[str, Any], amount: float, nominal: float, capacity: int
) -> dict[str, Any]:
    replicate: dict[str, Any] = {}
    wanted = amount / nominal * rng.gauss(1, 0.0006)
    if record["route"] == "against-titrant" and record["unknown_in"] == "flask":
        pipette = float(record["pipette"]["delivery"]["value"])
        reference = float(record["reference"]["concentration"]["value"])
        ratio = float(Fraction(record["ratio"]))
        wanted = nominal * pipette / ratio / reference * rng.gauss(1, 0.0006)
    if record["route"] == "weighed":
        standard = record["standard"]["substance"]
        formula, _, _, ratio = REACTIONS[standard]
        molar = sum(WEIGHTS[element][0] * count for element, count in formula.items())
        mass = round(amount / float(Fraction(ratio)) * molar / 1000, 4)
        if rng.random() < 0.5:
            replicate["mass"] = f"{mass:.4f}"
            if rng.random() < 0.5:
                replicate["tare_load"] = "32.1054"
        else:
            rest = rng.uniform(20, 60)
            replicate["container_and_standard"] = f"{round(rest, 4) + mass:.4f}"
            replicate["container_less_standard"] = f"{rest:.4f}"
    refilled = rng.random() < 0.2
    if refilled:
        replicate["burette"] = [
            ["0.10", f"{0.1 + wanted / 2:.2f}"],
            ["0.20", f"{0.2 + wanted / 2:.2f}"],
        ]
    elif "error_table" in record["burette"] or rng.random() < 0.7:
        start = rng.uniform(0, 0.5)
        replicate["burette"] = [[f"{start:.2f}", f"{start + wanted:.2f}"]]
    else:
        replicate["delivered"] = f"{wanted:.2f}"
    if rng.random() < 0.4:
        replicate["temperature"] = (
            f"{float(record['temperature']['value']) + rng.uniform(-1, 1):.1f}"
        )
    return replicate


# --- the model, once more ------------------------------------------------------------------------
def second_result(record: Mapping[str, Any], ops: SimpleNamespace) -> Any:
    """The mean concentration as an uncertain number of ``ops``; roots are one number each."""
    roots: dict[str, Any] = {}

    def number(value: float, u: float, df: float, root: str | None) -> Any:
        if u == 0:
            return value
        if root is None:
            return value + u * ops.standard(df)
        if root not in roots:
            roots[root] = ops.standard(df)
        return value + u * roots[root]

    def quantity(document: Mapping[str, Any] | None, scale: float = 1.0) -> Any:
        if document is None:
            return 0.0
        value = float(document.get("value", 0))
        return number(value, scale * u_of(document), df_of(document, record), document.get("id"))

    x = SimpleNamespace(quantity=quantity, number=number, exp=ops.exp, record=record)
    x.temperature = quantity(record.get("temperature"))
    x.t0 = float(record["temperature"]["value"])
    x.beta = quantity(record["liquid_expansion"]) if "liquid_expansion" in record else None
    x.ratio = float(Fraction(record["ratio"]))
    mean = second_mean(x, second_common(x))
    counting = [one for one in record["replicates"] if "excluded" not in one]
    stated = record.get("repeatability", {})
    if "relative_u" in stated:
        u = float(stated["relative_u"])
        u /= 1 if stated.get("applies_to") == "mean" else math.sqrt(len(counting))
        return mean * (1 + u * ops.standard(float(stated.get("dof", "inf"))))
    values = [ops.value(one) for one in x.values]
    centre = sum(values) / len(values)
    s = math.sqrt(sum((one - centre) ** 2 for one in values) / (len(values) - 1))
    return mean * (1 + s / math.sqrt(len(values)) / centre * ops.standard(len(values) - 1))


def u_of(document: Mapping[str, Any]) -> float:
    if "u" in document:
        return float(document["u"])
    if "U" in document:
        return float(document["U"]) / float(document["k"])
    if "half_width" in document:
        return float(document["half_width"]) / DIVISORS[document["shape"]]
    return 0.0


def df_of(document: Mapping[str, Any], record: Mapping[str, Any]) -> float:
    """Degrees of freedom; one root has one such number, the smallest that is stated for it."""
    root = document.get("id")
    if root is None:
        return float(document.get("dof", "inf"))
    return min(float(one.get("dof", "inf")) for one in quantities(record) if one.get("id") == root)


def quantities(part: Any) -> list[Mapping[str, Any]]:
    """All objects of a record that may state a root."""
    if isinstance(part, Mapping):
        return [part, *(one for value in part.values() for one in quantities(value))]
    if isinstance(part, list):
        return [one for value in part for one in quantities(value)]
    return []


def second_common(x: SimpleNamespace) -> Any:
    """What the standard contributes to every replicate."""
    record = x.record
    per_gram = second_per_gram(x) if "standard" in record else None
    x.linearity = x.quantity(record.get("balance", {}).get("linearity"), math.sqrt(2))
    x.balance_errors = x.quantity(record.get("balance", {}).get("error_u"))
    if record["route"] == "weighed":
        return per_gram
    pipette = record["pipette"]
    t_pipette = float(pipette.get("temperature", x.t0)) + (x.temperature - x.t0)
    pipetted = x.quantity(pipette["delivery"]) * second_factor(x, t_pipette, pipette)
    if record["route"] == "aliquot":
        solution = record["solution"]
        if "concentration" in solution:
            return x.quantity(solution["concentration"]) * pipetted
        flask = solution["flask"]
        t_flask = float(flask.get("temperature", x.t0)) + (x.temperature - x.t0)
        made_up = x.quantity(flask["volume"]) * second_factor(x, t_flask, flask)
        return 1000 * x.quantity(solution["mass"]) * per_gram / made_up * pipetted
    reference = record["reference"]
    value, u = (float(reference["concentration"][key]) for key in ("value", "u"))
    components = reference.get("components", [])
    known = value * math.sqrt(sum(float(one["relative"]) ** 2 for one in components))
    strength = x.number(value, math.sqrt(u**2 - known**2), math.inf, "TL-1")
    for one in components:
        df = df_of({"id": one["id"]}, record)
        strength = strength + x.number(0.0, value * float(one["relative"]), df, one["id"])
    return strength / pipetted if record["unknown_in"] == "flask" else strength * pipetted


def second_per_gram(x: SimpleNamespace) -> Any:
    """B·w/M, mol per gram weighed."""
    standard = x.record["standard"]
    formula, density, _, _ = REACTIONS[standard["substance"]]
    if "molar_mass" in standard:
        molar = x.quantity(standard["molar_mass"])
    else:
        value = sum(WEIGHTS[element][0] * count for element, count in formula.items())
        squares = sum((WEIGHTS[e][1] / math.sqrt(3) * count) ** 2 for e, count in formula.items())
        molar = x.number(value, math.sqrt(squares), math.inf, "the atomic weights")
    fraction = x.quantity(standard["mass_fraction"]) / molar
    if not x.record["balance"]["buoyancy"]:
        return fraction
    air = x.record["air"]
    moist = second_air(
        x, *(x.quantity(air[key]) for key in ("temperature", "pressure", "humidity"))
    )
    rho = 1000 * x.quantity(standard["density"])
    return fraction * (1 - moist / 8000) / (1 - moist / rho)


def second_air(x: SimpleNamespace, t: Any, p_hpa: Any, h_percent: Any) -> Any:
    """CIPM-2007, kg/m3."""
    p, h, kelvin = p_hpa * 100, h_percent / 100, t + 273.15
    saturation = x.exp(
        1.2378847e-5 * kelvin**2 - 1.9121316e-2 * kelvin + 33.93711047 - 6.3431645e3 / kelvin
    )
    enhancement = 1.00062 + 3.14e-8 * p + 5.6e-7 * t**2
    xv = h * enhancement * saturation / p
    z = (
        1
        - p
        / kelvin
        * (
            1.58123e-6
            - 2.9331e-8 * t
            + 1.1043e-10 * t**2
            + (5.707e-6 - 2.051e-8 * t) * xv
            + (1.9898e-4 - 2.376e-6 * t) * xv**2
        )
        + (p / kelvin) ** 2 * (1.83e-11 - 0.765e-8 * xv**2)
    )
    ma, mv, gas = 28.96546e-3, 18.01528e-3, 8.314472
    return p * ma / (z * gas * kelvin) * (1 - xv * (1 - mv / ma))


def second_factor(x: SimpleNamespace, t: Any, glass: Mapping[str, Any]) -> Any:
    """F of interfaces: a volume's amount is that of F times the volume at 20 °C."""
    gamma = float(glass.get("glass_expansion", 0))
    if x.beta is not None:
        return 1 + (gamma - x.beta) * (t - 20)
    return tanaka(t) / tanaka(20.0) * (1 + gamma * (t - 20))


def tanaka(t: Any) -> Any:
    return 999.97495 * (1 - (t - 3.983035) ** 2 * (t + 301.797) / (522528.9 * (t + 69.34881)))


def second_mean(x: SimpleNamespace, common: Any) -> Any:
    record, burette = x.record, x.record["burette"]
    delta, blank, excess = (
        x.quantity(one) for one in (burette["delivery"], record.get("blank"), record.get("excess"))
    )
    x.values = []
    for one in record["replicates"]:
        if "excluded" in one:
            continue
        t = float(one.get("temperature", x.t0)) + (x.temperature - x.t0)
        read, segments = second_read(one, burette.get("error_table"))
        volume = (read + segments * delta) * second_factor(x, t, burette) - blank - excess
        if record["route"] == "weighed":
            mass = second_mass(one, record["balance"].get("error_table"))
            total = 1000 * (mass + x.linearity + x.balance_errors) * common / volume
        elif record.get("unknown_in") == "flask":
            total = volume * common
        else:
            total = common / volume
        x.values.append(x.ratio * total)
    return sum(x.values) / len(x.values)


def second_read(one: Mapping[str, Any], table: list[list[str]] | None) -> tuple[float, int]:
    if "delivered" in one:
        return float(one["delivered"]), 1
    pairs = [(float(start), float(end)) for start, end in one["burette"]]
    total = sum(end + error(table, end) - start - error(table, start) for start, end in pairs)
    return total, len(pairs)


def second_mass(one: Mapping[str, Any], table: list[list[str]] | None) -> float:
    if "mass" in one:
        mass, tare = float(one["mass"]), float(one.get("tare_load", 0))
        return mass + error(table, tare + mass) - error(table, tare)
    first, second = float(one["container_and_standard"]), float(one["container_less_standard"])
    return first + error(table, first) - second - error(table, second)


def error(table: list[list[str]] | None, at: float) -> float:
    if table is None:
        return 0.0
    points = [(float(x), float(y)) for x, y in table]
    for (x0, y0), (x1, y1) in pairwise(points):
        if x0 <= at <= x1:
            return y0 + (y1 - y0) * (at - x0) / (x1 - x0)
    raise AssertionError("the generator left the table")


# --- the comparison ------------------------------------------------------------------------------
def differences(count: int, ops: SimpleNamespace, found: Callable[[Any], tuple[float, ...]]) -> Any:
    rng = random.Random(SEED)
    for i in range(count):
        record = random_record(rng)
        result = evaluate(record)["concentration"]
        yield i, record, result, found(second_result(record, ops))


@pytest.mark.slow
def test_evaluate_against_gtc_agrees_on_c_u_and_dof():
    import GTC

    ops = SimpleNamespace(standard=lambda df: GTC.ureal(0.0, 1.0, df), exp=GTC.exp, value=GTC.value)
    routes = set()
    for i, record, result, (c, u, df) in differences(
        GTC_RECORDS, ops, lambda y: (y.x, y.u, GTC.dof(y))
    ):
        routes.add(
            (record["route"], record.get("unknown_in"), "flask" in str(record.get("solution")))
        )
        assert result["value"] == pytest.approx(c, rel=1e-9), i
        assert result["u"] == pytest.approx(u, rel=1e-6), i
        # GTC truncates nothing and calls 1e6 and more infinite
        if result["dof"] is None or result["dof"] > 1e6:
            assert df > 1e6, i
        else:
            assert result["dof"] == pytest.approx(df, rel=1e-4), i
    assert len(routes) == 5


def test_evaluate_against_uncertainties_agrees_on_c_and_u():
    import uncertainties
    from uncertainties import umath

    ops = SimpleNamespace(
        standard=lambda _df: uncertainties.ufloat(0.0, 1.0),
        exp=umath.exp,
        value=uncertainties.nominal_value,
    )
    for i, _, result, (c, u) in differences(
        UNCERTAINTIES_RECORDS, ops, lambda y: (y.nominal_value, y.std_dev)
    ):
        assert result["value"] == pytest.approx(c, rel=1e-9), i
        assert result["u"] == pytest.approx(u, rel=1e-6), i

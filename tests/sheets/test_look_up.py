"""The look-up for programs: exactly the keys that are promised, never a number out of force."""

import json

import pytest
import sqlalchemy as sa

from server.lab.refusal import NotFound, NotSignedIn, Unacceptable
from server.records.tables.bench import Certificate
from server.records.tables.people import Laboratory
from server.sheets.bottle_card import open_bottle_card
from server.sheets.look_up import look_up
from server.sheets.shelf_page import open_shelf

KEYS = {
    "bottle", "titrant", "lot", "state", "in_force", "concentration", "factor", "valid_for",
    "valid_until", "certificate", "as_of",
}  # fmt: skip
#: Density of water in kg/m3 at 20, 24 and 30 °C: Tanaka et al., Metrologia 38 (2001), table.
TANAKA = {20: 998.2067, 24: 997.2988, 30: 995.6488}


def looked_up(demo, code, at=None):
    return demo.transactions.read(lambda s: look_up(s, code, at=at, now=demo.now))


def code_of(demo, state):
    return demo.read(open_shelf, who="bashir", words="", state=state).bottles[0].code


def test_look_up_gives_the_promised_keys_and_the_certificates_own_numbers(demo) -> None:
    found = looked_up(demo, demo.summary.bottles_in_force[1].lower())
    assert set(found) == KEYS
    number = found["certificate"]["number"]
    row = demo.transactions.read(
        lambda s: s.scalar(sa.select(Certificate.document).where(Certificate.number == number))
    )
    issued = json.loads(row)["result"]
    assert found["concentration"] == issued["concentration"]
    assert found["factor"] == issued["factor"]
    assert found["certificate"]["url"] == f"/certificates/{number}"
    assert found["valid_until"] == "2026-12-11T23:00:00+00:00"
    assert found["as_of"] == "2026-12-01T13:05:00+00:00"
    assert json.loads(json.dumps(found)) == found


def test_look_up_agrees_with_the_page(demo) -> None:
    code = demo.summary.bottles_in_force[0]
    found, page = looked_up(demo, code), demo.read(open_bottle_card, code, who=None, at=None)
    assert found["concentration"]["reported"] == (
        f"{page.value} ± {page.uncertainty} {page.unit} (k = {page.k})"
    )
    assert (found["state"], found["valid_for"]["words"]) == (page.state, page.valid_for)
    assert found["in_force"]


@pytest.mark.parametrize("state", ["lapsed", "used up", "held", "unproven"])
def test_look_up_out_of_force_has_a_state_and_no_number(demo, state) -> None:
    found = looked_up(demo, code_of(demo, state), at="24")
    assert set(found) == KEYS | {"at_temperature"}
    assert (found["state"], found["in_force"]) == (state, False)
    empty = ("concentration", "factor", "valid_for", "valid_until", "certificate",
             "at_temperature")  # fmt: skip
    assert [found[key] for key in empty] == [None] * len(empty)


@pytest.mark.parametrize("celsius", [24, 30])
def test_look_up_at_a_temperature_follows_waters_density(demo, celsius) -> None:
    found = looked_up(demo, demo.summary.bottles_in_force[1], at=f"{celsius},0")
    c20, at = found["concentration"], found["at_temperature"]
    # the published densities have seven figures
    assert at["value"] / c20["value"] == pytest.approx(TANAKA[celsius] / TANAKA[20], rel=2e-7)
    assert (at["temperature_C"], at["k"], at["unit"]) == (celsius, c20["k"], "mol/L")
    assert at["u"] > c20["u"] * at["value"] / c20["value"]
    assert at["U"] == pytest.approx(at["k"] * at["u"])


@pytest.mark.parametrize("at", ["", "hot", "41", "-0.5", "24.0.0"])
def test_look_up_at_no_temperature_is_refused(demo, at) -> None:
    with pytest.raises(Unacceptable) as refused:
        looked_up(demo, demo.summary.bottles_in_force[1], at=at)
    assert refused.value.field == "at"


def test_look_up_of_a_code_with_two_slips_names_the_nearest(demo) -> None:
    code = demo.summary.bottles_in_force[1]
    other = {"0": "1"}
    wrong = other.get(code[0], "0") + code[1:4] + other.get(code[4], "0") + code[5:]
    with pytest.raises(NotFound) as refused:
        looked_up(demo, wrong)
    assert refused.value.shown["nearest"] == [code]


def test_look_up_on_a_closed_shelf_needs_a_person(own_demo) -> None:
    def close(session):
        row = session.scalar(sa.select(Laboratory))
        row.settings = {**row.settings, "shelf_open": False}

    own_demo.write(close)
    code = own_demo.summary.bottles_in_force[1]
    with pytest.raises(NotSignedIn):
        looked_up(own_demo, code)
    actor = own_demo.people["bashir"]
    found = own_demo.transactions.read(
        lambda s: look_up(s, code, at=None, now=own_demo.now, actor=actor)
    )
    assert found["in_force"]

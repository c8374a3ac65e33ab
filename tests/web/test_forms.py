"""Every form, from an empty notebook to a certificate, with the figures of a published example.

EURACHEM/CITAC CG 4 (QUAM:2012), example A2: 0.3888 g of KHP, 18.64 mL, 0.10214 mol/L with
U = 0.00020 mol/L (k = 2).
"""

import re
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path
from typing import Any

import pytest
from fastapi.testclient import TestClient

from server.app import build_app
from server.records.transaction import Transactions
from server.settings import Settings
from server.web.forms.fields import form_field, table
from server.web.forms.stores import read_recipe_form
from server.web.forms.typed import Typed

CODE = "SETUPCODE"
PASSWORD = "five words that stand apart"
PEOPLE = {"ana": ["analyst"], "kit": ["keeper"], "cor": ["countersigner"]}
STANDARD_LOT = {
    "name": "KHP lot 7",
    "substance": "KHP",
    "certificate_number": "RM-7",
    "issuer": "producer of the standard",
    "due_on": "2027-05-31",
    "due_basis": "certificate",
    "basis": "as is",
    "mass_fraction_value": "1,0",
    "mass_fraction_statement": "half_width",
    "mass_fraction_bound": "0,0005",
    "mass_fraction_shape": "rectangular",
    "molar_mass_value": "204.2212",
    "molar_mass_unit": "g/mol",
    "molar_mass_statement": "u",
    "molar_mass_bound": "0.0038",
}
RECIPE = {
    "name": "NaOH against KHP, as in QUAM A2",
    "version": "0",
    "titrant_substance": "NaOH",
    "titrant_nominal": "0,1",
    "titrant_medium": "water",
    "standard": "KHP",
    "weighing": "difference",
    "replicates": "1",
    "end_point_mode": "visual",
    "end_point_indicator": "phenolphthalein",
    "interval_days": "14",
    "notice_days": "3",
    "blank": "none",
    "temperature": "once",
    "buoyancy": "no",
    "repeatability_relative_u": "0,0005",
    "repeatability_applies_to": "mean",
    "repeatability_source": "validation",
    "liquid_expansion_value": "2.1e-4",
    "liquid_expansion_unit": "1/K",
    "steps": "Flask rinsed\neach: Swirled until dissolved",
    "limits": "spread_percent 0,20",
}
INSTRUMENT = {"maker": "m", "type": "t", "serial": "1", "location": "Bench 1"}
PAPERS = {
    "certificate_number": "C-1",
    "issuer": "calibration house",
    "done_on": "2026-05-01",
    "due_on": "2027-05-01",
    "due_basis": "yearly, own plan",
}
TOOLS: dict[str, tuple[dict[str, str], dict[str, str]]] = {
    "balance": (
        {"resolution": "0,0001", "capacity": "220"},
        {
            "linearity_unit": "g", "linearity_statement": "half_width",
            "linearity_bound": "0,00015", "linearity_shape": "rectangular",
        },
    ),
    "burette": (
        {"resolution": "0,01", "capacity": "20"},
        {
            "capacity_value": "20", "delivery_unit": "mL", "delivery_statement": "half_width",
            "delivery_bound": "0,03", "delivery_shape": "triangular",
        },
    ),
    "thermometer": (
        {"resolution": "0,1"},
        {
            "reading_unit": "Cel", "reading_statement": "U", "reading_bound": "3",
            "reading_k": "1,96",
        },
    ),
    "room monitor": (
        {},
        {
            f"{name}_{part}": value
            for name, unit, bound in (
                ("temperature", "Cel", "0.5"), ("pressure", "hPa", "1"), ("humidity", "%", "5"),
            )
            for part, value in (
                ("unit", unit), ("statement", "half_width"), ("bound", bound),
                ("shape", "rectangular"),
            )
        },
    ),
}  # fmt: skip


class Hand:
    """A person at a browser who fills in forms as they are drawn."""

    def __init__(self, app: Any, name: str | None = None) -> None:
        self.client = TestClient(app, base_url="https://testserver", follow_redirects=False)
        self.name = name
        if name:
            self.send("/sign-in", "/sign-in", name=name, password=PASSWORD)

    def page(self, url: str, status: int = 200) -> str:
        answer = self.client.get(url)
        assert answer.status_code == status, (url, answer.text)
        return str(answer.text)

    def send(self, page: str, url: str, *, status: int = 303, **fields: Any) -> Any:
        """Open a page, take the hidden fields of the form that goes to ``url``, and send it."""
        html = self.page(page)
        form = re.search(rf'<form[^>]*action="{re.escape(url)}"[^>]*>(.*?)</form>', html, re.DOTALL)
        assert form is not None, f"{page} has no form for {url}"
        hidden = dict(re.findall(r'type="hidden" name="([^"]+)" value="([^"]*)"', form[1]))
        names = set(re.findall(r'name="([^"]+)"', form[1]))
        assert set(fields) <= names, f"{page} asks for no {sorted(set(fields) - names)}"
        answer = self.client.post(url, data={**hidden, **fields})
        assert answer.status_code == status, (url, answer.text)
        return answer


@pytest.fixture
def app(transactions: Transactions, clock: Any, tmp_path: Path) -> Any:
    """The application on an empty database, of each engine."""
    settings = Settings(data=tmp_path, database_url="")
    return build_app(settings, transactions=transactions, clock=clock, setup_code=CODE)


def _set_up(app: Any) -> None:
    Hand(app).send(
        "/setup", "/setup", setup_code=CODE, laboratory="Lab", address="Weir Lane",
        zone="Europe/Zurich", sign_in_name="una", printed_name="Una Tarn", password=PASSWORD,
    )  # fmt: skip
    steward = Hand(app, "una")
    for name, roles in PEOPLE.items():
        steward.send(
            "/people", "/people/new", sign_in_name=name, printed_name=f"{name.title()} Weir",
            initials=name[:2].upper(), roles=roles, password=PASSWORD,
        )  # fmt: skip


def _stock(keeper: Hand) -> dict[str, str]:
    found = {}
    url = "/stores/standard-lots/new"
    found["standard_lot_id"] = _id(keeper.send(url, url, **STANDARD_LOT))
    url = "/stores/recipes/new"
    found["recipe_id"] = _id(keeper.send(url, url, **RECIPE))
    for kind, (identity, calibration) in TOOLS.items():
        url = "/instruments/new"
        made = keeper.send(url, url, kind=kind, name=f"The {kind}", **INSTRUMENT, **identity)
        url = f"{made.headers['location']}/calibrations/new"
        keeper.send(url, url, **PAPERS, **calibration)
        found[kind] = _id(made)
    return found


def _id(answer: Any) -> str:
    return str(answer.headers["location"]).rpartition("/")[2]


def test_every_form_from_the_first_day_to_the_number_on_the_bottle(app: Any, clock: Any) -> None:
    _set_up(app)
    ana, kit, cor, visitor = Hand(app, "ana"), Hand(app, "kit"), Hand(app, "cor"), Hand(app)
    things = _stock(kit)
    made = ana.send(
        "/lots/new", "/lots/new", name="Lye 12", titrant="NaOH", nominal="0,1",
        prepared_on="2026-05-04", preparation="4 g of pellets\n1 L of boiled-out water",
    )  # fmt: skip
    lot = made.headers["location"]
    ana.send(lot, f"{lot}/bottles", count="2", volume_mL="500", place="Shelf 1")
    bottles = re.findall(r'href="/b/([0-9A-Z]{8})"', ana.page(lot))
    assert len(bottles) == 2

    begin = f"/bench/begin?lot={bottles[0]}"
    sheet = ana.send(
        begin, "/bench", standard_lot_id=things["standard_lot_id"], balance_id=things["balance"],
        burette_id=things["burette"], thermometer_id=things["thermometer"],
    ).headers["location"]  # fmt: skip
    _write_quam_a2(ana, sheet, clock)
    _hand_in(ana, sheet)
    certificate = _countersign(cor, sheet.rpartition("/")[2])

    page = visitor.page(f"/b/{bottles[1]}")
    assert '<span class="big-number">0.10214</span>' in page
    assert "± 0.00020 mol/L" in page
    assert "0.10214" in cor.page(certificate)
    assert "only one weighing was left" in cor.page(certificate)
    ana.send(f"/b/{bottles[0]}", f"/b/{bottles[0]}/used-up")
    kit.send(lot, f"{lot}/propose-pull", reason="the flask was not clean")
    cor.send(lot, f"{lot}/confirm-pull")
    assert "0.10214" not in visitor.page(f"/b/{bottles[1]}")
    trail = kit.page("/trail")
    for act in ("pulled a lot", "proposed a pull", "used up a bottle", "countersigned"):
        assert act in trail
    assert "holds" in trail


def _write_quam_a2(hand: Hand, sheet: str, clock: Any) -> None:
    """Write each row that the sheet asks for next, as the bench page does."""
    typed = {
        "temperature": "20.0", "indicator": "phenolphthalein", "container_and_standard": "60.5450",
        "container_less_standard": "60.1562", "burette_start": "0.00", "burette_end": "18.64",
    }  # fmt: skip
    door = f"/api/sheets/{sheet.rpartition('/')[2]}"
    for n in range(12):
        told = hand.client.get(door).json()
        if told["may_hand_in"]:
            return
        place = told["next"]
        row = next(
            row
            for group in told["groups"]
            for row in group["rows"]
            if all(row[name] == place[name] for name in ("replicate", "slot", "segment"))
        )
        text = typed.get(row["slot"]) or (row["choices"] or ["done"])[0]
        entry = {
            "id": f"00000000-0000-4000-8000-{n:012d}", **place, "text": text, "unit": row["unit"],
        }  # fmt: skip
        clock.move(minutes=1)
        headers = {"X-Titrant-Ledger": "bench", "Origin": "https://testserver"}
        answer = hand.client.post(f"{door}/entries", json={"entries": [entry]}, headers=headers)
        assert answer.status_code == 200, answer.text
    pytest.fail("the sheet asks for more than was expected")


def _hand_in(hand: Hand, sheet: str) -> None:
    url = f"{sheet}/hand-in"
    named = re.findall(r'name="(reason\.[^"]+)"', hand.page(url))
    reasons = dict.fromkeys(named, "only one weighing was left")
    assert {"reason.replicates", "reason.burette use"} <= set(named)

    unnamed = hand.send(url, url, status=401, **reasons, password=PASSWORD)
    assert "first signature since you signed in" in unnamed.text
    reasons |= {"name": hand.name}
    wrong = hand.send(url, url, status=401, **reasons, password="not mine at all")
    assert "only one weighing was left" in wrong.text
    assert "not mine at all" not in wrong.text
    partly = {**reasons, "reason.burette use": ""}
    refused = hand.send(url, url, status=422, **partly, password=PASSWORD)
    assert "burette use" in refused.text
    assert hand.send(url, url, **reasons, password=PASSWORD).headers["location"] == sheet
    assert hand.client.get(url).status_code in {200, 403}


def _countersign(hand: Hand, sheet_id: str) -> str:
    url = f"/countersign/{sheet_id}"
    accepted = re.findall(r'name="accepted" value="([^"]+)"', hand.page(url))
    seen = re.findall(r'name="trail_seen" value="([^"]+)"', hand.page(url))
    given = {"accepted": accepted, "trail_seen": seen, "name": hand.name, "password": PASSWORD}
    partly = hand.send(url, url, status=422, **{**given, "accepted": accepted[:1]})
    assert "accept it by name" in partly.text
    wrong = hand.send(url, url, status=401, **{**given, "password": "no"}, remark="seen by me")
    assert "seen by me" in wrong.text
    unread = hand.send(url, url, status=422, **{**given, "trail_seen": []})
    assert "Read the trail of this sheet before you sign" in unread.text
    done = hand.send(url, url, **given)
    return str(done.headers["location"])


def test_next_version_of_a_recipe_begins_with_what_the_last_one_says(app: Any) -> None:
    _set_up(app)
    kit, url = Hand(app, "kit"), "/stores/recipes/new"
    first = _id(kit.send(url, url, **RECIPE))
    page = kit.page(f"{url}?from={first}")
    assert 'name="version" value="1"' in page
    assert 'value="2.1e-4"' in page
    assert "each: Swirled until dissolved" in page
    assert "spread_percent 0.20" in page

    blind = kit.send(url, url, status=409, **{**RECIPE, "limits": "spread_percent 0.1"})
    assert 'name="version" value="1"' in blind.text
    assert "spread_percent 0.1" in blind.text
    again = kit.send(f"{url}?from={first}", url, **{**RECIPE, "version": "1"})

    assert "version 2" in kit.page(again.headers["location"])


def test_sheet_is_sent_back_abandoned_and_kept_readable(app: Any, clock: Any) -> None:
    _set_up(app)
    ana, kit = Hand(app, "ana"), Hand(app, "kit")
    things = _stock(kit)
    lot = _id(ana.send("/lots/new", "/lots/new", titrant="NaOH", nominal="0.1"))
    sheet = ana.send(
        f"/bench/begin?lot={lot}", "/bench", standard_lot_id=things["standard_lot_id"],
        balance_id=things["balance"], burette_id=things["burette"],
        thermometer_id=things["thermometer"],
    ).headers["location"]  # fmt: skip
    kit.send(sheet, f"{sheet}/let-be-used", what="burette", reason="checked with water today")
    assert "checked with water today" in ana.page(sheet)

    _write_quam_a2(ana, sheet, clock)
    _hand_in(ana, sheet)
    url = f"/countersign/{sheet.rpartition('/')[2]}"
    Hand(app, "cor").send(url, f"{url}/send-back", remark="was the burette read at rest?")
    assert "was the burette read at rest?" in ana.page(sheet)
    ana.send(sheet, f"{sheet}/abandon", reason="burette leaked")

    assert "abandoned" in ana.page(sheet)


def test_fifty_taps_at_once_make_one_lot_on_either_engine(app: Any) -> None:
    """R087, R088: one that comes while the first is under way waits and gets the same answer."""
    _set_up(app)
    ana = Hand(app, "ana")
    token = ana.client.get("/api/session").json()["form_token"]
    headers = {"X-Form-Token": token, "Idempotency-Key": "one tap"}
    lot = {"titrant": "NaOH", "nominal": "0.1"}

    with ThreadPoolExecutor(8) as pool:
        answers = list(
            pool.map(lambda _: ana.client.post("/api/lots", json=lot, headers=headers), range(50))
        )

    assert {one.status_code for one in answers} == {201}
    assert len({one.text for one in answers}) == 1
    assert len(ana.client.get("/api/sheets").json()["lots"]) == 1


def test_roles_and_account_are_changed_on_the_people_page(app: Any) -> None:
    _set_up(app)
    steward = Hand(app, "una")
    card = r'>ana</span>.*?action="/people/([^"]+)/roles"'
    person = re.search(card, steward.page("/people"), re.DOTALL)
    assert person is not None
    url = f"/people/{person[1]}"
    steward.send("/people", f"{url}/roles", roles=["analyst", "reader"])
    refused = steward.send("/people", f"{url}/roles", status=422, roles=["steward", "reader"])
    assert "holds no other role" in refused.text
    steward.send("/people", f"{url}/close")
    assert "closed" in steward.page("/people")


def _typed(**fields: str) -> Typed:
    return Typed({name: (value,) for name, value in fields.items()})


@pytest.mark.parametrize(
    ("field", "wanted"),
    [
        (None, None),
        ("name", "name"),
        ("document.linearity.half_width", "linearity_bound"),
        ("mass_fraction.U", "mass_fraction_bound"),
        ("mass_fraction.value", "mass_fraction_value"),
        ("titrant.nominal", "titrant_nominal"),
        ("steps[2].key", "steps"),
        ("limits.spread", "limits"),
        ("document.error_table[3]", "error_table"),
    ],
)
def test_path_in_a_document_is_the_name_of_its_field(field: str | None, wanted: str | None) -> None:
    assert form_field(field) == wanted


def test_table_is_read_a_row_a_line_with_either_decimal_sign() -> None:
    typed = _typed(error_table="0  0.000\n 5,00;-0,003 \n\n10\t0.006")

    assert table(typed, "error_table") == [["0", "0.000"], ["5.00", "-0.003"], ["10", "0.006"]]


def test_table_with_a_line_of_three_numbers_is_refused_by_its_line() -> None:
    with pytest.raises(Exception, match="Line 2"):
        table(_typed(error_table="0 0\n5 1 2"), "error_table")


def test_steps_get_keys_of_their_own_from_their_words() -> None:
    command = read_recipe_form(_typed(steps="Dry it!\nDry it\n2 h at rest\neach: Swirl", name="x"))

    steps = command.document["steps"]
    assert [one["key"] for one in steps] == ["dry-it", "dry-it-2", "step-2-h-at-rest", "swirl"]
    assert [one["when"] for one in steps] == ["before", "before", "before", "replicate"]

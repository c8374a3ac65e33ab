"""A burette calibrated weighing by weighing in the browser, and what follows from it."""

import re
from uuid import uuid4

import pytest

pytestmark = pytest.mark.browser

PASSWORD = "meadow willow heron 4"
#: Made up: reading, g before, g after, water at 20.0 °C; about 30 µL too much at 20 mL.
WEIGHINGS = [
    ("10", "31.0000", "40.9860"), ("10", "31.2000", "41.1864"), ("18", "30.5000", "48.4710"),
    ("18", "30.7000", "48.6706"), ("20", "30.1000", "50.0730"), ("20", "30.3000", "50.2726"),
]  # fmt: skip
#: EURACHEM/CITAC CG 4 (QUAM:2012), example A2; the two container weighings are from memory.
LINES = [
    (0, "indicator", "phenolphthalein"), (0, "temperature", "20.0"),
    (1, "container_and_standard", "60.5450"), (1, "container_less_standard", "60.1562"),
    (1, "burette_start", "0.00"), (1, "burette_end", "18.64"),
]  # fmt: skip


class Api:
    """Somebody's requests with the token of the session that the browser has."""

    def __init__(self, desk):
        self._request = desk.page.request
        self._token = self.get("/api/session")["form_token"]

    def get(self, url):
        answer = self._request.get(url)
        assert answer.ok, answer.text()
        return answer.json()

    def post(self, url, body):
        answer = self._request.post(url, data=body, headers={"X-Form-Token": self._token})
        assert answer.ok, answer.text()
        return answer.json()


def begun_sheet(hand, laboratory):
    """A sheet with one replicate of QUAM A2 written on it, with what serves today."""
    instruments = {one["kind"]: one["id"] for one in hand.get("/api/instruments")["instruments"]}
    stores = hand.get("/api/stores")
    sheet = hand.post("/api/sheets", {
        "lot_code": laboratory.lot, "recipe_id": stores["recipes"][0]["id"],
        "standard_lot_id": stores["standard_lots"][0]["id"], "balance_id": instruments["balance"],
        "burette_id": instruments["burette"], "thermometer_id": instruments["thermometer"],
    })["id"]  # fmt: skip
    entries = [
        {"id": str(uuid4()), "replicate": number, "slot": slot, "text": text}
        for number, slot, text in LINES
    ]
    hand.post(f"/api/sheets/{sheet}/entries", {"entries": entries})
    return sheet


def certified(hand, second, sheet):
    """The issued certificate of a sheet, with a reason for all that fails."""
    before = hand.get(f"/api/sheets/{sheet}/hand-in")
    failing = [one["name"] for one in before["findings"] if one["verdict"] == "fails"]
    reasons = dict.fromkeys(failing, "one weighing was left")
    revision = before["sheet"]["revision"]
    body = {"revision": revision, "reasons": reasons, "name": "ida", "password": PASSWORD}
    hand.post(f"/api/sheets/{sheet}/hand-in", body)
    page = second.get(f"/api/sheets/{sheet}/countersign")
    body = {
        "revision": page["revision"], "accepted": failing, "trail_seen": page["trail_last"],
        "name": "lene", "password": PASSWORD,
    }  # fmt: skip
    number = second.post(f"/api/sheets/{sheet}/countersign", body)["certificate"]
    return number, second.get(f"/api/certificates/{number}")


def calibrate(page, burette):
    """Weigh a piston burette at three readings, twice each, as on a tablet."""
    page.goto(f"/instruments/{burette}")
    page.get_by_role("link", name="Calibrate it, weighing by weighing").click()
    page.get_by_label("It is a").select_option("piston burette")
    page.get_by_label("Water", exact=True).select_option("degassed")
    for name, value in (
        ("Air temperature", "21,3"), ("Air pressure", "1003.1"), ("Air humidity", "46"),
    ):  # fmt: skip
        page.get_by_label(re.compile(f"^{name} in")).first.fill(value)
    for i, (point, before, after) in enumerate(WEIGHINGS):
        page.locator(f"#w{i}_point").fill(point)
        page.locator(f"#w{i}_before").fill(before)
        page.locator(f"#w{i}_after").fill(after)
        page.locator(f"#w{i}_water").fill("20.0")
        page.locator(f"#w{i}_water").blur()
        # the volume stands beside the row without anything being sent by hand
        page.locator(f"#v{i}", has_text=re.compile(r"\d\.\d{5}")).wait_for()
    page.locator("#outcome .verdict").first.wait_for()


def test_run_with_rows_that_were_added_outlives_a_reload(desks, laboratory):
    page = desks("nils", width=820, height=1180).page
    instruments = page.request.get("/api/instruments").json()["instruments"]
    burette = next(one["id"] for one in instruments if one["kind"] == "burette")
    page.goto(f"/instruments/{burette}/runs/new")
    page.get_by_role("button", name="Room for five more").click()
    page.get_by_role("button", name="Air at each weighing").click()
    page.locator("#w12_before").fill("30.1234")
    page.locator("#w12_air_pressure").fill("1001.7")
    page.goto(f"/instruments/{burette}/runs/new")
    page.locator("#w12_air_pressure").wait_for()
    assert page.locator("#w12_before").input_value() == "30.1234"
    assert page.locator("#w12_air_pressure").input_value() == "1001.7"


def test_burette_run_changes_the_next_volume_by_its_table_and_no_older_certificate(
    desks, laboratory
):
    ida, lene, nils = desks("ida"), desks("lene"), desks("nils", width=820, height=1180)
    hand, second = Api(ida), Api(lene)
    number, old = certified(hand, second, begun_sheet(hand, laboratory))
    was = old["document"]["result"]
    plain = was["replicates"][0]["volume_mL"]

    page = nils.page
    instruments = {one["kind"]: one["id"] for one in hand.get("/api/instruments")["instruments"]}
    burette = instruments["burette"]
    calibrate(page, burette)
    # what was typed outlives a reload
    page.reload()
    page.get_by_text("What was typed on this tablet before stands here again.").wait_for()
    assert page.locator("#w5_after").input_value() == WEIGHINGS[5][2]
    page.locator("#v5", has_text=re.compile(r"\d\.\d{5}")).wait_for()

    page.get_by_role("button", name="Record this calibration").click()
    page.get_by_text("Not taken").wait_for()
    assert page.locator("#w5_after").input_value() == WEIGHINGS[5][2]
    page.get_by_label("Due on").fill("2026-11-03")
    page.get_by_label("Basis of the due date").fill("6 months, own plan")
    page.get_by_role("button", name="Record this calibration").click()
    page.wait_for_url(f"**/instruments/{burette}")
    page.get_by_text("R-2026-0001").first.wait_for()
    page.get_by_role("link", name="Every reading of this run").click()
    page.get_by_text("50.2726").first.wait_for()

    told = hand.get(f"/api/instruments/{burette}")["calibrations"]
    assert [one["version"] for one in told] == [2, 1]
    table = [(float(at), float(added)) for at, added in told[0]["table"]["rows"]]
    (low, first), (high, last) = table[-2:]
    assert (low, high) == (18.0, 20.0)
    added = first + (last - first) * (18.64 - low) / (high - low)
    assert added > 0.02

    sheet = begun_sheet(hand, laboratory)
    now = certified(hand, second, sheet)[1]["document"]["result"]
    # the same readings at 20.0 °C: only the table lies between the two
    moved = now["replicates"][0]["volume_mL"]
    assert moved / plain == pytest.approx((18.64 + added) / 18.64, rel=1e-9)
    # more was delivered than was read: so much less concentrated is the lot
    lower = now["concentration"]["value"] / was["concentration"]["value"]
    assert lower == pytest.approx(18.64 / (18.64 + added), rel=1e-9)

    again = second.get(f"/api/certificates/{number}")
    # its state says that another one took its place; not a letter of it was changed
    assert (old["state"], again["state"]) == ("standing", "replaced")
    assert again["document"] == old["document"]
    assert again["document_digest"] == old["document_digest"]
    assert again["document_holds"]

"""The shelf in a browser: held, released, pulled, each page right at the next load; scanned."""

import re
from uuid import uuid4

import pytest

from server.evaluation.from_sheet import evaluate_sheet
from server.lab.actor import Proof
from server.procedures.bench import BeginSheet, begin_sheet
from server.procedures.countersign import Countersign, countersign_sheet
from server.procedures.entries import NewEntry, WriteEntries, write_entries
from server.procedures.hand_in import HandIn, failing, hand_in_sheet, prepare_hand_in
from server.records.queries.load_sheet import load_sheet_facts
from server.records.queries.sheet_trail import last_act_of_sheet
from server.records.tables.stores import Instrument, Recipe, StandardLot

pytestmark = pytest.mark.browser

NUMBER = "0.10214"  # QUAM:2012, example A2
LINES = (
    (0, "indicator", "phenolphthalein"),
    (0, "temperature", "20.0"),
    (1, "container_and_standard", "60.5450"),
    (1, "container_less_standard", "60.1562"),
    (1, "burette_start", "0.00"),
    (1, "burette_end", "18.64"),
)
#: A camera that shows nothing, and a reader of codes that reads what the test put there.
CAMERA = """
navigator.mediaDevices.getUserMedia = async () => document.createElement("canvas").captureStream(1);
window.BarcodeDetector = class {
  static async getSupportedFormats() { return ["qr_code"]; }
  async detect() { return window.seen ? [{ rawValue: window.seen }] : []; }
};
"""


def certify(laboratory):
    """Issue the certificate of QUAM A2 through the procedures; the browser begins at the shelf."""
    people = laboratory.people

    def act(procedure, command, who, *more, **named):
        return laboratory.transactions.write(
            lambda session: procedure(
                session, command, *more, actor=people[who], now=laboratory.clock(), **named
            )
        )

    def papers(session):
        kinds = {one.kind: one.id for one in session.query(Instrument)}
        return kinds, session.query(Recipe).one().id, session.query(StandardLot).one().id

    kinds, recipe, standard_lot = laboratory.transactions.read(papers)
    begin = BeginSheet(
        laboratory.lot, recipe, standard_lot, kinds["balance"], kinds["burette"],
        thermometer_id=kinds["thermometer"],
    )  # fmt: skip
    sheet = act(begin_sheet, begin, "ida")
    entries = tuple(NewEntry(str(uuid4()), *line) for line in LINES)
    act(write_entries, WriteEntries(sheet, entries), "ida")
    prepared = laboratory.transactions.read(
        lambda session: prepare_hand_in(session, sheet, actor=people["ida"], now=laboratory.clock())
    )
    evaluated = evaluate_sheet(prepared, trials=0)
    reasons = dict.fromkeys(failing(evaluated.result["findings"]), "one weighing was left")
    command = HandIn(sheet, evaluated.revision, reasons)
    proof = Proof(people["ida"].person_id, laboratory.clock())
    act(hand_in_sheet, command, "ida", evaluated, proof=proof)
    facts = laboratory.transactions.read(lambda session: load_sheet_facts(session, sheet))
    seen = laboratory.transactions.read(lambda session: last_act_of_sheet(session, sheet))
    signing = Countersign(sheet, facts.revision, tuple(reasons), trail_seen=seen)
    proof = Proof(people["lene"].person_id, laboratory.clock())
    act(countersign_sheet, signing, "lene", proof=proof)


def number_of(page):
    """Return whether a card shows the number, and what stands beside it."""
    page.reload()
    text = page.inner_text("main")
    return NUMBER in text, text


def test_bottle_held_released_and_pulled_is_right_at_every_next_load(desks, laboratory):
    certify(laboratory)
    bottle, lot = laboratory.bottle, laboratory.lot
    phone, ida, nils, lene = desks(width=390), desks("ida"), desks("nils"), desks("lene")

    # the address on a label is in capitals
    phone.page.goto(f"/B/{bottle}")
    assert number_of(phone.page)[0]
    assert phone.page.get_by_role("button", name="Scan").count() == 0  # nothing here reads codes

    # a typo in the field of the shelf: the nearest code leads on
    ida.page.goto("/")
    ida.page.get_by_label("Bottle code, or words").fill(bottle[:3] + bottle[4] + bottle[3:])
    ida.page.get_by_role("button", name="Look up").click()
    ida.page.get_by_role("main").get_by_role("link", name=bottle, exact=True).first.click()
    ida.page.get_by_text(NUMBER).first.wait_for()
    ida.page.get_by_role("button", name="Watch this bottle").click()
    ida.page.get_by_role("button", name="Watch it no longer").wait_for()
    ida.page.get_by_text("Write down a use").click()
    ida.page.get_by_label("Result or sample").fill("W-2026-0417")
    ida.page.get_by_role("button", name="Write it down").click()
    ida.page.get_by_role("rowheader", name="W-2026-0417").wait_for()

    ida.page.get_by_label("What you saw").fill("cloudy")
    ida.page.get_by_role("button", name="Hold this bottle").click()
    ida.page.get_by_text("Ida Mohnke holds this bottle").wait_for()
    assert ida.page.get_by_role("button", name="Release this bottle").count() == 0  # her own
    shown, text = number_of(phone.page)
    assert not shown
    assert "Do not use" in text
    assert "Mohnke" not in phone.page.content()

    nils.page.goto(f"/b/{bottle}")
    nils.page.get_by_label("Why it may be used again").fill("filtered, clear")
    nils.page.get_by_role("button", name="Release this bottle").click()
    nils.page.get_by_text(NUMBER).first.wait_for()
    assert number_of(phone.page)[0]

    nils.page.goto(f"/lots/{lot}")
    nils.page.get_by_label("Why the lot should go out of use for good").fill("wrong standard")
    nils.page.get_by_role("button", name="Propose to pull it").click()
    nils.page.get_by_text("A countersigner confirms it").wait_for()
    assert nils.page.get_by_role("button", name="Confirm: pull this lot").count() == 0
    assert number_of(phone.page)[0]  # proposed is not pulled

    lene.page.goto(f"/lots/{lot}")
    lene.page.get_by_role("button", name="Confirm: pull this lot").click()
    lene.page.locator("main .state", has_text="pulled").first.wait_for()
    lene.page.locator("#uses").get_by_text("1 use since").wait_for()
    shown, text = number_of(phone.page)
    assert not shown
    assert "out of use for good" in text
    answer = phone.page.request.get(f"/api/bottles/{bottle}").json()
    assert (answer["state"], answer["in_force"], answer["concentration"]) == ("pulled", False, None)
    phone.page.goto("/")
    assert bottle not in phone.page.content()

    read_the_notices(ida)


def read_the_notices(ida):
    """One notice for each of the three changes, counted until they are read."""
    ida.page.reload()
    ida.page.get_by_role("link", name=re.compile("Notices 3 not read")).click()
    states = ida.page.locator(".notices .state").all_inner_texts()
    assert states == ["pulled", "in force", "held"]
    ida.page.get_by_role("button", name="I have read them").click()
    ida.page.get_by_text("All read").wait_for()
    assert ida.page.get_by_role("link", name=re.compile("not read")).count() == 0


def test_scan_opens_the_card_where_the_browser_reads_codes(desks, laboratory):
    desk = desks(width=390, height=844)
    page = desk.page
    page.add_init_script(CAMERA)
    page.goto("/")
    page.get_by_role("button", name="Scan").click()
    page.get_by_role("dialog").wait_for()
    page.evaluate("window.seen = 'https://elsewhere.example/poster'")
    page.get_by_text("none of a bottle").wait_for()
    page.evaluate("window.seen = 'https://label.example/b/" + laboratory.bottle + "'")
    page.wait_for_url(f"**/b/{laboratory.bottle}")

    # closed, it leaves the camera alone, and the field is there as before
    page.goto("/")
    page.get_by_role("button", name="Scan").click()
    page.get_by_role("button", name="Close").click()
    page.get_by_label("Bottle code, or words").fill(laboratory.bottle)
    page.get_by_role("button", name="Look up").click()
    page.wait_for_url(f"**/b/{laboratory.bottle}")

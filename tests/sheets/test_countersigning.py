"""The countersigner's page: number, why, what was written; and whether it is what was signed."""

import pytest
import sqlalchemy as sa

from server.lab.refusal import NotAllowed
from server.records.queries.load_sheet import load_sheet_facts
from server.records.tables.bench import Entry, Evaluation, Sheet
from server.sheets.countersigning import open_countersign
from server.sheets.instruments_page import open_instrument
from server.sheets.standard_lot_page import open_standard_lot


@pytest.fixture
def page(demo):
    return demo.read(open_countersign, demo.summary.waiting_sheet_id, who="ottilie")


@pytest.fixture
def result(demo):
    facts = demo.transactions.read(lambda s: load_sheet_facts(s, demo.summary.waiting_sheet_id))
    return facts.evaluation.result


def test_countersign_number_is_the_one_reported(page, result) -> None:
    shown = f"{page.value} ± {page.uncertainty} {page.unit} (k = {page.k})"
    assert shown == result["concentration"]["reported"]
    assert page.valid_for == "visual, phenolphthalein"
    assert page.handed_in == "handed in 1 Dec 2026, 03:45 by Bashir Oduya"


def test_countersign_findings_stand_in_order_of_gravity_with_reasons(page) -> None:
    order = ["fails", "look", "holds"]
    places = [order.index(one.verdict) for one in page.findings]
    assert places == sorted(places)
    failing = [one for one in page.findings if one.verdict == "fails"]
    assert page.to_accept == tuple(one.name for one in failing)
    assert all(one.reason for one in failing)
    assert all(one.accepted_by is None for one in page.findings)


def test_countersign_budget_stands_by_share_and_is_whole(page, result) -> None:
    assert len(page.budget) == len(result["budget"])
    ordered = sorted(result["budget"], key=lambda one: -one["share_percent"])
    assert [row.source for row in page.budget] == [one["source"] for one in ordered]
    assert sum(one["share_percent"] for one in result["budget"]) == pytest.approx(100)
    assert page.budget[0].source in page.budget_says


def test_countersign_budget_roots_lead_to_pages_that_are_there(demo, page) -> None:
    roots = {row.root for row in page.budget if row.root}
    assert len(roots) >= 5
    for root in roots:
        room, key = root.rsplit("/", 1)
        opened = open_standard_lot if room == "/stores/standard-lots" else open_instrument
        assert demo.read(opened, key, who="ottilie").id == key


def test_countersign_replicates_dots_and_bars_show_the_same_values(page, result) -> None:
    assert [row.value for row in page.replicates] == [
        f"{one['value']:.5f}" for one in result["replicates"]
    ]
    for row in page.replicates:
        assert f"{row.label}: {row.value}" in page.dots
    assert page.budget[0].source in page.bars


def test_countersign_formula_and_constants_are_those_of_the_route(page) -> None:
    assert page.formula.startswith("c = r · 1000 · m · B · w / (M · V)")
    constants = dict(page.constants)
    assert constants["ratio, titrant per standard"] == "1 (table of reactions)"
    assert constants["molar mass"].startswith("204.22")
    assert "trials" in page.monte_carlo


def test_countersign_trail_tells_every_act_on_the_sheet_newest_last(page) -> None:
    acts = [line.act for line in page.trail]
    assert acts[0] == "began a bench sheet"
    assert acts[-1] == "handed in a bench sheet"
    assert acts.count("wrote entries") == 6
    assert [line.seq for line in page.trail] == sorted(line.seq for line in page.trail)
    assert "sheet, indicator: phenolphthalein" in page.trail[1].details


def test_countersign_compares_with_the_last_certificate(demo) -> None:
    second = demo.transactions.read(
        lambda s: s.scalar(sa.select(Sheet.id).where(Sheet.number == "S-2026-0005"))
    )
    page = demo.read(open_countersign, second, who="ottilie")
    captions = {one.caption: one for one in page.figures}
    assert "TL-2026-0004" in captions["Against the last certificate"].says
    assert captions["Last time"].says == "Certificate TL-2026-0004"
    assert page.certificate_url == "/certificates/TL-2026-0005"
    assert page.corrections == 1
    assert [one.holds for one in page.signatures] == [True, True]
    assert page.refused == "This sheet is countersigned; it does not wait for a second person."


def test_countersign_one_who_may_not_sign_still_reads(demo) -> None:
    page = demo.read(open_countersign, demo.summary.waiting_sheet_id, who="imke")
    assert page.refused == "To countersign you need the role countersigner."
    assert page.value


def test_countersign_of_an_open_sheet_is_refused(demo) -> None:
    with pytest.raises(NotAllowed, match="not handed in"):
        demo.read(open_countersign, demo.summary.open_sheet_id, who="ottilie")


def test_countersign_after_an_entry_was_tampered_with_no_signature_holds(own_demo) -> None:
    own_demo.without_triggers()
    sheet_id = own_demo.summary.waiting_sheet_id
    where = (Entry.sheet_id == sheet_id, Entry.slot == "burette_end", Entry.replicate == 2)
    own_demo.write(lambda s: s.execute(sa.update(Entry).where(*where).values(text="19.99")))
    page = own_demo.read(open_countersign, sheet_id, who="ottilie")
    assert [one.holds for one in page.signatures] == [False]
    assert "not what was handed in" in page.refused


def test_countersign_after_the_snapshot_was_tampered_with_no_signature_holds(own_demo) -> None:
    own_demo.without_triggers()
    sheet_id = own_demo.summary.waiting_sheet_id

    def tamper(session):
        row = session.scalar(sa.select(Evaluation).where(Evaluation.sheet_id == sheet_id))
        row.snapshot = row.snapshot.replace('"reported":"0.1', '"reported":"0.2')

    own_demo.write(tamper)
    page = own_demo.read(open_countersign, sheet_id, who="ottilie")
    assert [one.holds for one in page.signatures] == [False]

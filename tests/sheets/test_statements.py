"""The number of statements does not grow with the rows of a list."""

from uuid import uuid4

import pytest
import sqlalchemy as sa
from sqlalchemy.orm import Session

from server.records.tables.bench import Certificate, Entry
from server.records.tables.lots import Bottle, Lot
from server.records.tables.people import Person
from server.records.tables.stores import Calibration, Hold, Instrument, Recipe, StandardLot
from server.sheets.bench_home import open_begin, open_bench_home
from server.sheets.bench_sheet import open_bench_sheet
from server.sheets.countersigning import open_countersign
from server.sheets.instruments_page import open_instrument, open_instruments
from server.sheets.labels_page import open_labels
from server.sheets.lot_page import open_lot
from server.sheets.lots_page import open_lots
from server.sheets.people import open_people
from server.sheets.planner_page import PlanAsked, open_planner
from server.sheets.queue import open_queue
from server.sheets.shelf_page import open_shelf
from server.sheets.standard_lot_page import open_standard_lot
from server.sheets.stores_page import open_recipe, open_stores


def grow(demo, session: Session) -> None:
    """Put two more beside everything of which there is one."""
    for turn in ("X", "Y"):
        for sheet_id in (demo.summary.waiting_sheet_id, demo.summary.open_sheet_id):
            demo.twin_sheet(session, sheet_id)
        lot = session.scalar(sa.select(Lot).where(Lot.titrant == "HCl").order_by(Lot.made_at))
        new = demo.twin(session, lot, code=f"LOT0000{turn}", name=f"{lot.name} {turn}")
        certificate = session.scalar(sa.select(Certificate).where(Certificate.lot_id == lot.id))
        numbers = {"number": f"{certificate.number} {turn}", "replaces_id": None}
        demo.twin(session, certificate, lot_id=new.id, **numbers)
        bottle = session.scalar(sa.select(Bottle).where(Bottle.lot_id == lot.id))
        number = 50 + ord(turn)
        demo.twin(session, bottle, code=f"BOT0000{turn}", lot_id=new.id)
        demo.twin(session, bottle, code=f"BOT0001{turn}", number=number)
        hold = session.scalar(sa.select(Hold))
        for table, kind in ((StandardLot, "standard lot"), (Instrument, "instrument")):
            for row in session.scalars(sa.select(table).where(table.name.not_like("% X"))).all():
                if row.name.endswith(turn):
                    continue
                again = demo.twin(session, row, name=f"{row.name} {turn}")
                demo.twin(session, hold, kind=kind, thing_id=again.id)
                if table is Instrument:
                    kept = session.scalar(
                        sa.select(Calibration).where(Calibration.instrument_id == row.id)
                    )
                    demo.twin(session, kept, instrument_id=again.id)
                    demo.twin(session, kept, version=kept.version + ord(turn))
        for recipe in session.scalars(sa.select(Recipe).where(Recipe.version == 1)).all():
            demo.twin(session, recipe, version=ord(turn))
        person = session.scalar(sa.select(Person))
        demo.twin(session, person, sign_in_name=str(uuid4()))


@pytest.fixture
def grown(own_demo):
    own_demo.write(lambda session: grow(own_demo, session))
    return own_demo


def keys_of(demo):
    def load(session):
        return {
            "lot": session.scalar(sa.select(Lot.code).where(Lot.titrant == "HCl")),
            "instrument": session.scalar(sa.select(Instrument.id)),
            "standard lot": session.scalar(sa.select(StandardLot.id)),
            "recipe": session.scalar(sa.select(Recipe.id)),
        }

    return demo.transactions.read(load)


def test_lists_take_the_same_statements_for_one_row_and_for_three(demo, grown) -> None:
    keys = keys_of(demo)
    pages = {
        "bench": (open_bench_home, (), {"who": "bashir"}),
        "begin": (open_begin, (keys["lot"],), {"who": "bashir", "recipe_id": None}),
        "queue": (open_queue, (), {"who": "ottilie"}),
        "shelf": (open_shelf, (), {"who": "bashir", "words": "", "state": ""}),
        "visitor's shelf": (open_shelf, (), {"who": None, "words": "", "state": ""}),
        "stores": (open_stores, (), {"who": "jonas"}),
        "recipe": (open_recipe, (keys["recipe"],), {"who": "jonas"}),
        "standard lot": (open_standard_lot, (keys["standard lot"],), {"who": "jonas"}),
        "instruments": (open_instruments, (), {"who": "jonas"}),
        "instrument": (open_instrument, (keys["instrument"],), {"who": "jonas"}),
        "lot": (open_lot, (keys["lot"],), {"who": "jonas"}),
        "labels": (open_labels, (keys["lot"],), {"who": "jonas"}),
        "lots": (open_lots, (), {"who": "jonas", "state": ""}),
        "planner": (open_planner, (PlanAsked(),), {"who": "jonas"}),
        "people": (open_people, (), {"who": "marisol"}),
    }
    for name, (opened, given, more) in pages.items():
        few, many = demo.read(opened, *given, **more), grown.read(opened, *given, **more)
        assert len(repr(many)) > len(repr(few)), f"{name} has not grown"
        counted = [lab.statements(opened, *given, **more) for lab in (demo, grown)]
        assert counted[0] == counted[1], f"{name}: {counted}"


def test_bench_sheet_takes_the_same_statements_for_few_entries_and_for_many(own_demo) -> None:
    sheet_id = own_demo.summary.open_sheet_id
    few = own_demo.statements(open_bench_sheet, sheet_id, who="bashir")

    def add(session):
        where = (Entry.sheet_id == sheet_id, Entry.replicate > 0)
        for row in session.scalars(sa.select(Entry).where(*where)).all():
            more = {"replicate": row.replicate + 3, "position": row.position + 100}
            own_demo.twin(session, row, **more, strikes=None)

    own_demo.write(add)
    assert own_demo.statements(open_bench_sheet, sheet_id, who="bashir") == few


def test_countersign_takes_the_same_statements_for_few_entries_and_for_many(demo) -> None:
    # five replicates wait for a second person; four, one of them doubted, were sent back
    waiting, back = demo.summary.waiting_sheet_id, demo.summary.sent_back_sheet_id
    few, many = (demo.statements(open_countersign, one, who="ottilie") for one in (back, waiting))
    assert few == many

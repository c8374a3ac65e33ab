"""What the database itself refuses, whoever sends the statement: R058 and the ink."""

from uuid import uuid4

import pytest
import sqlalchemy as sa
from sqlalchemy import text
from sqlalchemy.exc import DBAPIError

from server.procedures.holds import HoldThing, hold_thing
from server.procedures.lots import ProposePull, propose_pull

INK = ("entry", "evaluation", "signature", "certificate", "trail", "recipe", "calibration")
KEPT = ("sheet", "lot", "bottle", "pull", "hold", "person", "instrument", "standard_lot")


def run(lab, statement, **values):
    """Run SQL on the database's own connection, past every rule of the program."""
    with lab.transactions.database.engine.begin() as connection:
        return connection.execute(text(statement), values)


def refused(lab, statement, words, **values):
    with pytest.raises(DBAPIError, match=words):
        run(lab, statement, **values)


@pytest.fixture
def full(lab):
    """A laboratory with at least one row in every table of ink."""
    lab.certify()
    lab.act(hold_thing, HoldThing("bottle", lab.bottle, "cloudy"), "analyst")
    lab.act(propose_pull, ProposePull(lab.lot, "wrong salt"), "keeper")
    return lab


def test_ink_is_neither_changed_nor_deleted(full):
    for table in INK:
        column = "seq" if table == "trail" else "id"
        assert run(full, f"SELECT count(*) FROM {table}").scalar_one() > 0
        refused(full, f"UPDATE {table} SET {column} = {column}", f"{table} is in ink: no UPDATE")
        refused(full, f"DELETE FROM {table}", f"{table} is in ink: no DELETE")


def test_what_is_kept_is_not_deleted(full):
    for table in (*KEPT, "trail_head"):
        assert run(full, f"SELECT count(*) FROM {table}").scalar_one() > 0
        refused(full, f"DELETE FROM {table}", f"{table} is kept: no DELETE")


def test_tables_are_not_emptied_at_once(full):
    if full.transactions.database.is_sqlite:
        # SQLite has no TRUNCATE; its DELETE meets the triggers row by row
        refused(full, "DELETE FROM entry", "no DELETE")
        return
    for table in (*INK, *KEPT, "trail_head"):
        refused(full, f"TRUNCATE {table} CASCADE", "no TRUNCATE")


# who signs, by direct SQL

SIGN = (
    "INSERT INTO signature (id, sheet_id, person_id, printed_name, meaning, at, zone, "
    "evaluation_id, signed_digest, reasons) SELECT :id, sheet_id, :person, 'x', :meaning, at, "
    "zone, evaluation_id, 'x', '[]' FROM signature WHERE meaning = 'measured'"
)


def sign(lab, who, meaning="countersigned"):
    return {"id": str(uuid4()), "person": lab.people[who].person_id, "meaning": meaning}


@pytest.fixture
def waiting(lab):
    """A sheet that waits: made up by one analyst, written and handed in by others."""
    lines = [(0, "step:mixed", "done"), (0, "indicator", "phenolphthalein")]
    readings = ("60.4084", "60.0000", "0.00", "20.00")
    slots = ("container_and_standard", "container_less_standard", "burette_start", "burette_end")
    lab.write_lines([*lines, *((1, s, t) for s, t in zip(slots, readings, strict=True))])
    lab.write_lines([(0, "temperature", "20.4")], who="all hands")
    lab.hand_in()
    return lab


@pytest.mark.parametrize(
    ("who", "part"),
    [("second analyst", "made up"), ("analyst", "handed in"), ("all hands", "wrote")],
)
def test_own_work_is_not_countersigned_by_direct_sql(waiting, who, part):
    refused(waiting, SIGN, "nobody countersigns the own work", **sign(waiting, who))


def test_somebody_elses_work_is_countersigned_by_direct_sql(waiting):
    assert run(waiting, SIGN, **sign(waiting, "countersigner")).rowcount == 1


def test_who_let_something_be_used_does_not_countersign_by_direct_sql(waiting):
    words = f'[{{"by":"{waiting.people["keeper"].person_id}","what":"burette"}}]'
    run(waiting, "UPDATE sheet SET overrides = :words", words=words)
    refused(waiting, SIGN, "nobody countersigns the own work", **sign(waiting, "keeper"))


@pytest.mark.parametrize("meaning", ["countersigned", "measured"])
def test_steward_signs_nothing_by_direct_sql(waiting, meaning):
    refused(waiting, SIGN, "a steward signs nothing", **sign(waiting, "steward", meaning))


def test_own_signature_setting_opens_the_second_signature_only_to_ones_own(waiting):
    run(waiting, "UPDATE laboratory SET own_signature = :yes", yes=True)
    assert run(waiting, SIGN, **sign(waiting, "analyst")).rowcount == 1
    refused(waiting, SIGN, "a steward signs nothing", **sign(waiting, "steward"))


def test_hold_is_not_released_by_who_held_it_by_direct_sql(full):
    by_self = "UPDATE hold SET released_by = held_by, released_at = 1, release_reason = 'x'"
    refused(full, by_self, "nobody releases the own hold")


def test_pull_is_not_confirmed_by_who_proposed_it_by_direct_sql(full):
    refused(
        full,
        "UPDATE pull SET confirmed_by = proposed_by, confirmed_at = 1",
        "nobody confirms the own pull",
    )


@pytest.mark.parametrize(
    ("statement", "words"),
    [
        ("UPDATE lot SET made_by = :person", "who made up a lot stays"),
        ("UPDATE hold SET held_by = :person", "who held a thing stays"),
        ("UPDATE pull SET proposed_by = :person", "who proposed a pull stays"),
        ("UPDATE sheet SET lot_id = :person", "a sheet stays with its lot"),
    ],
)
def test_first_person_is_not_exchanged_to_get_round_the_second(full, statement, words):
    refused(full, statement, words, person=full.people["reader"].person_id)


def test_hold_and_pull_are_not_written_down_as_done_by_one_person(full):
    person = full.people["keeper"].person_id
    hold = (
        "INSERT INTO hold (id, kind, thing_id, held_by, held_at, reason, released_by, released_at)"
        " VALUES (:id, 'lot', 'x', :person, 1, 'x', :person, 2)"
    )
    refused(full, hold, "nobody releases the own hold", id=str(uuid4()), person=person)
    pull = (
        "INSERT INTO pull (id, lot_id, reason, proposed_by, proposed_at, confirmed_by, "
        "confirmed_at) SELECT :id, id, 'x', :person, 1, :person, 2 FROM lot"
    )
    refused(full, pull, "nobody confirms the own pull", id=str(uuid4()), person=person)


def test_certificate_is_not_issued_without_a_second_signature_by_direct_sql(waiting):
    issue = (
        "INSERT INTO certificate (id, number, lot_id, sheet_id, evaluation_id, issued_at, "
        "valid_until, document, document_digest, trail_seq, trail_hash) SELECT :id, 'TL-1', "
        "lot_id, id, evaluation_id, 1, 2, '{}', 'x', 0, 'x' FROM sheet WHERE id = :sheet"
    )
    values = {"id": str(uuid4()), "sheet": waiting.sheet}
    refused(waiting, issue, "a certificate rests on a second signature", **values)
    run(waiting, SIGN, **sign(waiting, "countersigner"))
    assert run(waiting, issue, **values).rowcount == 1


def test_every_table_refuses_deletion_but_those_that_hold_no_record(full):
    free = {
        "laboratory", "sign_in", "sign_in_failure", "device", "counter", "idempotency_key",
        "curve_columns", "mailbox",
        "alembic_version",
    }  # fmt: skip
    database = full.transactions.database
    of_sqlite = "SELECT tbl_name FROM sqlite_master WHERE name LIKE '%~_no~_delete' ESCAPE '~'"
    of_postgresql = (
        "SELECT event_object_table FROM information_schema.triggers "
        "WHERE trigger_name LIKE '%~_no~_delete' ESCAPE '~'"
    )
    guarded = run(full, of_sqlite if database.is_sqlite else of_postgresql).scalars().all()
    assert set(guarded) == set(sa.inspect(database.engine).get_table_names()) - free

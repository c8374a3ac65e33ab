"""What the check names, one forgery at a time, and what it can say of older releases' rows."""

import hashlib
import json
from collections.abc import Callable
from typing import Any

import pytest
import sqlalchemy as sa
from sqlalchemy.orm import Session

from server.lab.canonical import canonical, digest
from server.records.tables.bench import Certificate, Entry, Evaluation, Sheet, Signature
from server.records.tables.lots import Bottle, Lot, Pull
from server.records.tables.stores import File, Hold
from server.records.tables.trail import TrailRow
from server.upkeep.trail_check import check_trail, read_known

Forgery = Callable[[Session], Any]


def first(table: Any, **where: Any) -> Any:
    """A query for the first row of a table."""
    return sa.select(table).filter_by(**where).order_by(*table.__table__.primary_key).limit(1)


def change(table: Any, column: str, value: Any, **where: Any) -> Forgery:
    """A forgery that writes a value into the first row."""
    return lambda session: setattr(session.scalars(first(table, **where)).one(), column, value)


def remove(table: Any, **where: Any) -> Forgery:
    """A forgery that deletes the first row."""
    return lambda session: session.delete(session.scalars(first(table, **where)).one())


def test_record_that_nobody_touched_holds_and_says_how_much(forger: Any) -> None:
    found = check_trail(forger.transactions)
    assert found.holds
    with forger.transactions.database.reader.connect() as connection:
        count = connection.scalar(sa.select(sa.func.count()).select_from(Entry))
    assert f"The chain holds over {found.rows} rows." in found.says
    assert f"{count} entries" in found.says
    assert "earlier release" not in found.says


@pytest.mark.parametrize(
    ("forgery", "says"),
    [
        (change(Signature, "printed_name", "Nobody"), "The signature of Nobody"),
        (change(Signature, "remark", "seen"), "does not belong to what stands there"),
        (change(Signature, "meaning", "countersigned", meaning="measured"), "does not belong"),
        (remove(Signature), "The signature ("),
        (change(Evaluation, "snapshot", "{}"), "is not the one that was signed in row"),
        (change(Evaluation, "calculation", "standardization 7"), "is not the one that was signed"),
        (change(Evaluation, "input_digest", "0" * 64), "is not the one that was signed"),
        (remove(Evaluation), "The evaluation of sheet"),
        (change(Hold, "reason", "no doubt at all"), "was never noted so"),
        (remove(Hold), "noted that somebody held a"),
        (change(File, "content", b"another paper"), "is not as it came: its SHA-256 is another"),
        (change(File, "sha256", "0" * 64), "is not as it came: its SHA-256 is another"),
        (change(Sheet, "number", "S-1999-0001"), "is not the one that row"),
        (remove(Sheet), "is not there"),
        (change(Certificate, "document_digest", digest("{}")), "is not the text that was issued"),
    ],
)
def test_forgery_is_named(forger: Any, forgery: Forgery, says: str) -> None:
    found = forger.check_after(forgery)
    assert not found.holds
    assert says in found.says


def test_bottle_that_was_emptied_cannot_be_filled_again_unseen(forger: Any) -> None:
    def refill(session: Session) -> None:
        emptied = sa.select(Bottle).where(Bottle.used_up_at.is_not(None)).limit(1)
        bottle = session.scalars(emptied).one()
        bottle.used_up_at = bottle.used_up_by = None

    found = forger.check_after(refill)
    assert not found.holds
    assert "noted that somebody used up a bottle" in found.says


@pytest.mark.parametrize(
    ("forgery", "says"),
    [
        (change(Bottle, "code", "22222222"), "The bottle 22222222 is not the one that row"),
        (change(Bottle, "number", 7), "is not the one that row"),
        (change(Bottle, "filled_by", "nobody"), "is not the one that row"),
        (remove(Bottle), "is not there"),
        (change(Lot, "code", "22222222"), "is not the one that row"),
        (change(Lot, "nominal", "0.5"), "is not the one that row"),
        (change(Lot, "medium", "ethanol"), "is not the one that row"),
        (change(Lot, "document", {"use_by": "2099-01-01"}), "is not the one that row"),
        (change(Lot, "document", ["no object"]), "cannot be read"),
        (change(Lot, "made_by", "nobody"), "is not the one that row"),
    ],
)
def test_bottle_or_lot_that_is_another_than_noted_is_named(
    forger: Any, forgery: Forgery, says: str
) -> None:
    found = forger.check_after(forgery)
    assert not found.holds
    assert says in found.says


def test_bottle_that_was_put_to_another_lot_is_named(forger: Any) -> None:
    """On the shelf it would show the other lot's number."""

    def exchange(session: Session) -> None:
        bottle = session.scalars(first(Bottle)).one()
        other = sa.select(Lot.id).where(Lot.id != bottle.lot_id).limit(1)
        bottle.lot_id, bottle.number = session.scalars(other).one(), 99

    assert "is not the one that row" in forger.check_after(exchange).says


def test_bottle_that_was_never_filled_is_named(forger: Any) -> None:
    def slip_in(session: Session) -> None:
        row = session.scalars(first(Bottle)).one()
        columns = {one.name: getattr(row, one.name) for one in Bottle.__table__.columns}
        new = {"id": "slipped in", "code": "22222222", "number": 98}
        session.add(Bottle(**columns | new))

    assert "The bottle 22222222 was never noted" in forger.check_after(slip_in).says


def test_file_that_was_exchanged_with_its_hash_is_named(forger: Any) -> None:
    def exchange(session: Session) -> None:
        paper = session.scalars(first(File)).one()
        paper.content = b"a certificate that was never received"
        paper.sha256 = hashlib.sha256(paper.content).hexdigest()

    found = forger.check_after(exchange)
    assert not found.holds
    assert "was never noted in the trail" in found.says


def test_pull_that_nobody_confirmed_is_named(forger: Any) -> None:
    def pull(session: Session) -> None:
        sheet = session.scalars(first(Sheet)).one()
        session.add(
            Pull(
                id="slipped in", lot_id=sheet.lot_id, reason="cloudy", proposed_by=sheet.begun_by,
                proposed_at=sheet.begun_at,
            )
        )  # fmt: skip

    assert "somebody proposed a pull at" in forger.check_after(pull).says


def test_sheet_that_was_never_begun_is_named(forger: Any) -> None:
    def slip_in(session: Session) -> None:
        row = session.scalars(first(Sheet)).one()
        columns = {one.name: getattr(row, one.name) for one in Sheet.__table__.columns}
        session.add(Sheet(**columns | {"id": "slipped in", "number": "S-2026-0999"}))

    assert "S-2026-0999 was never noted" in forger.check_after(slip_in).says


def test_certificate_that_takes_another_ones_anchor_is_named(forger: Any) -> None:
    def exchange(session: Session) -> None:
        late, early = session.scalars(
            sa.select(Certificate).order_by(Certificate.trail_seq.desc()).limit(2)
        )
        late.trail_seq, late.trail_hash = early.trail_seq, early.trail_hash

    assert "is anchored to another row than row" in forger.check_after(exchange).says


def _line(session: Session, entry: Entry) -> tuple[TrailRow, dict[str, Any], dict[str, Any]]:
    """The row of the trail that notes an entry, what it says, and the entry's line in it."""
    rows = session.scalars(sa.select(TrailRow).where(TrailRow.thing_id == entry.sheet_id))
    for row in rows:
        body = json.loads(row.body)
        for line in body.get("entries", ()):
            if line["id"] == entry.id:
                return row, body, line
    raise LookupError(entry.id)


def test_entry_forged_with_its_trail_and_all_anchors_breaks_the_signatures(forger: Any) -> None:
    def forge(session: Session) -> None:
        signed = sa.select(Entry).where(Entry.sheet_id == Signature.sheet_id, Entry.text != "")
        entry = session.scalars(signed.order_by(Entry.id).limit(1)).one()
        row, body, line = _line(session, entry)
        entry.text = line["text"] = "9.9999"
        del line["digest"]
        row.body = canonical(body)
        session.flush()
        forger.rehash(session, row.seq, anchors=True)

    found = forger.check_after(forge)
    assert not found.holds
    assert found.says.startswith("The signature of ")


def test_body_that_is_no_text_of_an_object_is_named(forger: Any) -> None:
    def forge(session: Session) -> None:
        row = session.scalars(first(TrailRow, kind="sheet")).one()
        row.body = row.body[:-1]
        session.flush()
        forger.rehash(session, row.seq, anchors=True)

    assert "cannot be read" in forger.check_after(forge).says


def test_row_whose_bytes_are_no_text_any_more_is_named(forger: Any) -> None:
    def damage(session: Session) -> None:
        session.execute(sa.text("UPDATE trail SET why = CAST(x'C328' AS TEXT) WHERE seq = 12"))

    found = forger.check_after(damage)
    assert not found.holds
    assert found.says.endswith("cannot be read: it is damaged.")


@pytest.mark.parametrize("kept", [{1: "0" * 64}, {10_000: "0" * 64}])
def test_hash_that_was_kept_elsewhere_must_agree(forger: Any, kept: dict[int, str]) -> None:
    found = check_trail(forger.transactions, known=kept)
    assert not found.holds
    assert "kept" in found.says


def test_known_rows_are_read_from_what_the_check_printed() -> None:
    told = f"The chain holds over 7 rows.\nRow 7: {'a' * 64}\n\nRow 5: {'B' * 64}\n"
    assert read_known(told) == {7: "a" * 64, 5: "b" * 64}
    with pytest.raises(ValueError, match="two hashes of row 7"):
        read_known(told + f"Row 7: {'c' * 64}")
    with pytest.raises(ValueError, match="no line such as"):
        read_known("Row 7: abc")


def _as_of_an_earlier_release(forger: Any) -> Forgery:
    """The record as it would be if entries had been noted without the digest of their rows."""

    def strip(session: Session) -> None:
        for row in session.scalars(sa.select(TrailRow).where(TrailRow.kind == "sheet")):
            body = json.loads(row.body)
            for line in body.get("entries", ()):
                line.pop("digest")
            row.body = canonical(body)
        session.flush()
        forger.rehash(session, 1, anchors=True)

    return strip


def test_entries_of_an_earlier_release_are_held_as_far_as_they_were_noted(forger: Any) -> None:
    earlier = _as_of_an_earlier_release(forger)
    found = forger.check_after(earlier)
    assert found.holds, found.says
    assert "an earlier release noted text, unit" in found.says

    assert not forger.check_after(earlier, change(Entry, "text", "1.0")).holds
    assert not forger.check_after(earlier, change(Entry, "posted_by", "nobody")).holds
    assert forger.check_after(earlier, change(Entry, "raw", "+  1.0 g")).holds
    assert not forger.check_after(change(Entry, "raw", "+  1.0 g")).holds

"""R025: one flipped byte of an entry, signature or certificate shows on every page of it."""

from datetime import timedelta

import pytest
import sqlalchemy as sa

from server.records.tables.bench import Certificate, Entry, Evaluation, Sheet, Signature
from server.sheets.bench_sheet import open_bench_sheet
from server.sheets.certificate_page import open_certificate
from server.sheets.countersigning import open_countersign


def pages_of(demo, number: str) -> list[str]:
    """What the three pages of a certificate's sheet say was altered."""
    find = sa.select(Certificate.sheet_id).where(Certificate.number == number)
    sheet = demo.transactions.read(lambda s: s.scalar(find))
    return [
        demo.read(open_certificate, number, who="ottilie").altered,
        demo.read(open_countersign, sheet, who="ottilie").altered,
        demo.read(open_bench_sheet, sheet, who="ottilie").altered,
    ]


def test_nothing_of_the_demonstration_is_altered(demo) -> None:
    numbers = demo.transactions.read(lambda s: s.scalars(sa.select(Certificate.number)).all())
    assert {says for number in numbers for says in pages_of(demo, number)} == {""}
    sheets = demo.transactions.read(lambda s: s.scalars(sa.select(Sheet.id)).all())
    assert {demo.read(open_bench_sheet, one, who="ottilie").altered for one in sheets} == {""}


def _text(session, sheet_id):
    entry = session.scalars(
        sa.select(Entry).where(Entry.sheet_id == sheet_id, Entry.text != "").limit(1)
    ).one()
    entry.text = chr(ord(entry.text[0]) ^ 1) + entry.text[1:]


def _raw(session, sheet_id):
    session.scalars(sa.select(Entry).where(Entry.sheet_id == sheet_id).limit(1)).one().raw = "18.6"


def _signer(session, sheet_id):
    found = sa.select(Signature).where(Signature.sheet_id == sheet_id).limit(1)
    session.scalars(found).one().printed_name = "Somebody Else"


def _snapshot(session, sheet_id):
    one = session.scalars(sa.select(Evaluation).where(Evaluation.sheet_id == sheet_id)).first()
    one.snapshot = one.snapshot.replace('"value":', '"value": ', 1)


def _valid_until(session, sheet_id):
    found = sa.select(Certificate).where(Certificate.sheet_id == sheet_id)
    session.scalars(found).one().valid_until += timedelta(days=365)


@pytest.mark.parametrize(
    ("forge", "says"),
    [
        (_text, "Entry "),
        (_raw, "what came with its text was changed"),
        (_signer, "The signature of Somebody Else"),
        (_snapshot, "The evaluation of sheet"),
        (_valid_until, "What stands beside certificate TL-2026-0004"),
    ],
)
def test_what_was_altered_shows_on_the_certificate_and_on_its_sheet(own_demo, forge, says) -> None:
    own_demo.without_triggers()
    find = sa.select(Certificate.sheet_id).where(Certificate.number == "TL-2026-0004")
    own_demo.write(lambda s: forge(s, s.scalar(find)))
    for told in pages_of(own_demo, "TL-2026-0004"):
        assert says in told
    assert set(pages_of(own_demo, "TL-2026-0002")) == {""}

"""Gathering all of a lot from the record."""

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import replace
from datetime import datetime
from typing import Any

from sqlalchemy.orm import Session

from server.lab.actor import Actor
from server.lab.codes import read_code
from server.lab.refusal import NotFound
from server.lab.sheet_facts import SheetFacts
from server.records.queries.list_certificates import certificates_of_lot
from server.records.queries.list_sheets import sheets_of_lot
from server.records.queries.list_shelf import bottles_of_lot, lot_on_shelf
from server.records.queries.list_trail import TrailFilter, trail_of_sheet, trail_rows
from server.records.queries.load_lots import lot_of_code
from server.records.queries.load_papers import load_laboratory_fact
from server.records.queries.load_sheet import load_sheet_facts
from server.records.tables.lots import Bottle
from server.records.tables.stores import File
from server.records.tables.trail import TrailRow
from server.reports.certificate.gathering import Paper, gather_issued, papers_of
from server.reports.lot.bundle import LotBundle, OriginalFile, WrittenSheet
from server.sheets.parts.doors import need_reader

_PAGE = 500


def gather_lot(session: Session, code: str, *, actor: Actor | None, now: datetime) -> LotBundle:
    """Return all of a lot, by its own code or one of its bottles'.

    Raises:
        NotFound: there is no such lot.
        NotSignedIn: a visitor; people's names stand on it.
    """
    reader = need_reader(actor)
    lot = lot_of_code(session, read_code(code))
    if lot is None:
        raise NotFound(f"There is no lot or bottle {code[:40]}.", field="code")
    kept = certificates_of_lot(session, lot.id)
    certificates = [gather_issued(session, one.row.number, actor=reader, now=now) for one in kept]
    by_number = {one.number: one.document for one in certificates}
    certificates = [
        replace(one, previous=by_number.get(one.document["replaces"] or "")) for one in certificates
    ]
    sheets = [load_sheet_facts(session, one.sheet.id) for one in sheets_of_lot(session, lot.id)]
    bottles = bottles_of_lot(session, lot_on_shelf(session, lot.id))
    laboratory = load_laboratory_fact(session)
    papers = list(papers_of(session, certificates))
    things = [lot.id, *(one.bottle.id for one in bottles)]
    return LotBundle(
        code=lot.code,
        name=lot.name,
        titrant=lot.titrant,
        laboratory=laboratory.name,
        country=str(laboratory.settings.get("country") or ""),
        as_of=now,
        certificates=certificates,
        sheets=[WrittenSheet(one.number, one.state, tuple(one.entries)) for one in sheets],
        bottles=[_bottle(one.bottle) for one in bottles],
        trail=_trail(session, things, [one.id for one in sheets]),
        files=_files(papers, [*_curves(session, sheets)]),
        paper_hashes={paper.thing_id: paper.file.sha256 for paper in papers},
    )


def _files(papers: Sequence[Paper], curves: Sequence[tuple[str, File]]) -> list[OriginalFile]:
    """Return each file once, with all papers and curves that it belongs to."""
    belongs = [*((paper.name, paper.file) for paper in papers), *curves]
    files = {file.id: file for _, file in belongs}
    return [
        OriginalFile(
            name=file.name,
            media_type=file.media_type,
            sha256=file.sha256,
            content=file.content,
            papers=tuple(dict.fromkeys(name for name, one in belongs if one.id == file.id)),
        )
        for file in files.values()
    ]


def _curves(session: Session, sheets: Sequence[SheetFacts]) -> Iterator[tuple[str, File]]:
    """Yield the originals of all curves, struck through or not, and whose they are in words."""
    for sheet in sheets:
        struck = {entry.strikes for entry in sheet.entries if entry.strikes}
        for entry in sheet.entries:
            file = session.get(File, entry.file_id) if entry.file_id else None
            if file is not None:
                note = ", struck through" if entry.id in struck else ""
                yield f"curve of sheet {sheet.number}, replicate {entry.replicate}{note}", file


def _trail(
    session: Session, things: Iterable[str], sheet_ids: Iterable[str]
) -> list[dict[str, Any]]:
    """Return what was done to a lot, its bottles, sheets and certificates, oldest first."""
    rows: dict[int, TrailRow] = {}
    for sheet_id in sheet_ids:
        rows |= {row.seq: row for row in trail_of_sheet(session, sheet_id)}
    for thing_id in things:
        rows |= {row.seq: row for row in _rows_of(session, thing_id)}
    return [_line(rows[seq]) for seq in sorted(rows)]


def _rows_of(session: Session, thing_id: str) -> Iterator[TrailRow]:
    offset = 0
    while found := trail_rows(session, TrailFilter(thing=thing_id), offset=offset, most=_PAGE):
        yield from (row for row in found if row.thing_id == thing_id)
        offset += _PAGE


def _line(row: TrailRow) -> dict[str, Any]:
    """Return a row with all that its hash is made of; its body stays the text that was hashed."""
    return {
        "seq": row.seq,
        "at": row.at.isoformat(),
        "zone": row.zone,
        "person_id": row.person_id,
        "person_name": row.person_name,
        "act": row.act,
        "kind": row.kind,
        "thing_id": row.thing_id,
        "thing_name": row.thing_name,
        "why": row.why,
        "body": row.body,
        "previous_hash": row.previous_hash,
        "hash": row.hash,
    }


def _bottle(row: Bottle) -> Mapping[str, Any]:
    return {
        "code": row.code,
        "number": row.number,
        "place": row.place,
        "volume_mL": row.volume_mL,
        "filled_at": row.filled_at.isoformat(),
        "used_up_at": row.used_up_at.isoformat() if row.used_up_at else None,
    }

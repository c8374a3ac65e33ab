"""Bench sheets with all they rest on, as plain values, in a fixed number of selects."""

import json
from collections.abc import Iterable, Mapping, Sequence
from dataclasses import replace
from datetime import datetime
from typing import Any

from sqlalchemy import Select, select
from sqlalchemy.orm import Session

from server.lab.calibration.check_log import CHARTS
from server.lab.canonical import digest
from server.lab.ink import WrittenEntry
from server.lab.recipe import read_recipe
from server.lab.refusal import NotFound
from server.lab.sheet_facts import (
    INSTRUMENT_KINDS,
    STANDARD_LOT,
    CertificateFact,
    EvaluationFact,
    InstrumentFact,
    LotFact,
    OverrideFact,
    PersonFact,
    RecipeFact,
    SheetFacts,
    SignatureFact,
    StandardLotFact,
    logs_count_at,
)
from server.records.queries.by_ids import IDS, any_of, rows_by
from server.records.queries.list_log import log_lines
from server.records.queries.list_stores import (
    CHECK_SPAN,
    checks_since,
    holds_by_thing,
    instrument_fact,
)
from server.records.queries.load_papers import load_laboratory_fact, load_people
from server.records.queries.load_standard_lots import standard_lot_fact
from server.records.queries.sheet_trail import load_returns
from server.records.tables.bench import Certificate, Entry, Evaluation, Sheet, Signature
from server.records.tables.lots import Lot, Pull
from server.records.tables.stores import Calibration, Instrument, Recipe, StandardLot

_SHEETS = rows_by(Sheet.id)
_LOTS, _RECIPES, _STANDARDS = rows_by(Lot.id), rows_by(Recipe.id), rows_by(StandardLot.id)
_EVALUATIONS, _CERTIFICATES = rows_by(Evaluation.id), rows_by(Certificate.lot_id)
_PULLED = select(Pull.lot_id).where(Pull.lot_id.in_(any_of()), Pull.confirmed_at.is_not(None))
_ENTRIES = rows_by(Entry.sheet_id, Entry.position, Entry.id)
_SIGNATURES = rows_by(Signature.sheet_id, Signature.at, Signature.meaning.desc(), Signature.id)
_INSTRUMENTS = (
    select(Instrument, Calibration)
    .join(Calibration, Calibration.instrument_id == Instrument.id)
    .where(Calibration.id.in_(any_of()))
)


def load_sheet_facts(session: Session, sheet_id: str) -> SheetFacts:
    """Return everything a bench sheet rests on and holds.

    Raises:
        NotFound: there is no such sheet.
    """
    found = load_many_sheet_facts(session, [sheet_id])
    if not found:
        raise NotFound("There is no such bench sheet.", field="sheet_id")
    return found[0]


def load_many_sheet_facts(session: Session, sheet_ids: Sequence[str]) -> tuple[SheetFacts, ...]:
    """Return the facts of several sheets, in the order asked; unknown ones are left out."""
    rows = session.scalars(_SHEETS, {IDS: list(sheet_ids)}).all()
    sheets = {row.id: row for row in rows}
    found = [sheets[one] for one in sheet_ids if one in sheets]
    return _Loaded(session, found).facts(found)


class _Loaded:
    """All rows that some sheets need, by their ids."""

    def __init__(self, session: Session, sheets: Sequence[Sheet]) -> None:
        ids = [sheet.id for sheet in sheets]
        lot_ids = {sheet.lot_id for sheet in sheets}
        self.laboratory = load_laboratory_fact(session)
        self.lots = _by_id(session, _LOTS, lot_ids)
        self.pulled = set(session.scalars(_PULLED, {IDS: list(lot_ids)}))
        self.recipes = _by_id(session, _RECIPES, {sheet.recipe_id for sheet in sheets})
        self.standard_lots = _by_id(
            session, _STANDARDS, {sheet.standard_lot_id for sheet in sheets}
        )
        self.lot_holds = holds_by_thing(session, STANDARD_LOT, list(self.standard_lots))
        self.lot_logs = log_lines(session, STANDARD_LOT, list(self.standard_lots))
        used = {one for sheet in sheets for one in sheet.calibrations.values()}
        since = min((sheet.begun_at for sheet in sheets), default=None)
        self.instruments = _instruments(session, used, since)
        self.entries = _by_sheet(session, _ENTRIES, ids)
        self.signatures = _by_sheet(session, _SIGNATURES, ids)
        self.evaluations = _by_id(session, _EVALUATIONS, {sheet.evaluation_id for sheet in sheets})
        self.certificates = session.scalars(_CERTIFICATES, {IDS: list(lot_ids)}).all()
        self.people = load_people(session, self._named(sheets))
        self.returns = load_returns(session, [sheet.id for sheet in sheets])

    def facts(self, sheets: Iterable[Sheet]) -> tuple[SheetFacts, ...]:
        return tuple(self._facts(sheet) for sheet in sheets)

    def _named(self, sheets: Sequence[Sheet]) -> set[str]:
        names = {sheet.begun_by for sheet in sheets} | {lot.made_by for lot in self.lots.values()}
        names |= {one["by"] for sheet in sheets for one in sheet.overrides}
        return names | {row.person_id for rows in self.entries.values() for row in rows}

    def _facts(self, sheet: Sheet) -> SheetFacts:
        recipe = self.recipes[sheet.recipe_id]
        evaluation = self.evaluations.get(sheet.evaluation_id or "")
        used = [sheet.calibrations.get(kind) for kind in INSTRUMENT_KINDS]
        return SheetFacts(
            id=sheet.id,
            number=sheet.number,
            revision=sheet.revision,
            lot=_lot(self.lots[sheet.lot_id], self.people, pulled=sheet.lot_id in self.pulled),
            recipe=RecipeFact(recipe.id, recipe.name, recipe.version, read_recipe(recipe.document)),
            standard_lot=self._standard_lot(sheet),
            instruments=tuple(_as_of(self.instruments[one], sheet) for one in used if one),
            overrides=tuple(_override(one, self.people) for one in sheet.overrides),
            begun_by=self.people[sheet.begun_by],
            begun_at=sheet.begun_at,
            handed_in_at=sheet.handed_in_at,
            sent_back_at=sheet.sent_back_at,
            sent_back_remark=sheet.sent_back_remark,
            countersigned_at=sheet.countersigned_at,
            abandoned_at=sheet.abandoned_at,
            entries=tuple(_entry(row, self.people) for row in self.entries.get(sheet.id, ())),
            signatures=tuple(_signature(row) for row in self.signatures.get(sheet.id, ())),
            evaluation=_evaluation(evaluation) if evaluation else None,
            laboratory=self.laboratory,
            last_certificate=self._last_certificate(sheet),
            returns=tuple(self.returns.get(sheet.id, ())),
        )

    def _standard_lot(self, sheet: Sheet) -> StandardLotFact | None:
        """Return the standard that a sheet weighs, its log as it counts for the sheet."""
        row = self.standard_lots.get(sheet.standard_lot_id or "")
        if row is None:
            return None
        holds, log = self.lot_holds.get(row.id, ()), self.lot_logs.get(row.id, ())
        at = logs_count_at(sheet.handed_in_at, sheet.sent_back_at)
        return standard_lot_fact(row, holds, log, zone=self.laboratory.zone, as_of=at)

    def _last_certificate(self, sheet: Sheet) -> CertificateFact | None:
        """Return the lot's certificate before this sheet's own."""
        of_lot = {row.id: row for row in self.certificates if row.lot_id == sheet.lot_id}
        own = next((row for row in of_lot.values() if row.sheet_id == sheet.id), None)
        replaced = {row.replaces_id for row in of_lot.values()}
        standing = next((row for row in of_lot.values() if row.id not in replaced), None)
        row = standing if own is None else of_lot.get(own.replaces_id or "")
        if row is None:
            return None
        document = json.loads(row.document)
        return CertificateFact(row.id, row.number, row.issued_at, row.valid_until, document)


def _by_id(session: Session, asked: Select[Any], ids: Iterable[str | None]) -> dict[str, Any]:
    wanted = [one for one in ids if one]
    return {row.id: row for row in session.scalars(asked, {IDS: wanted})}


def _by_sheet(
    session: Session, asked: Select[Any], sheet_ids: Sequence[str]
) -> dict[str, list[Any]]:
    found: dict[str, list[Any]] = {}
    for row in session.scalars(asked, {IDS: list(sheet_ids)}):
        found.setdefault(row.sheet_id, []).append(row)
    return found


def _instruments(
    session: Session, calibration_ids: set[Any], since: datetime | None
) -> dict[str, InstrumentFact]:
    """Return instruments by their calibrations, with the checks of a month before the sheets."""
    wanted = [one for one in calibration_ids if one]
    rows = session.execute(_INSTRUMENTS, {IDS: wanted}).all()
    ids = list({row.id for row, _ in rows})
    holds = holds_by_thing(session, "instrument", ids)
    logs = checks_since(session, ids, since - CHECK_SPAN) if since else {}
    return {
        calibration.id: instrument_fact(
            row, calibration, holds.get(row.id, ()), logs.get(row.id, ())
        )
        for row, calibration in rows
    }


def _as_of(one: InstrumentFact, sheet: Sheet) -> InstrumentFact:
    """Return an instrument with the checks that a sheet may look at, whatever else was loaded."""
    since = sheet.begun_at - CHECK_SPAN
    log = tuple(line for line in one.log if line.at >= since or line.what in CHARTS)
    return replace(one, log=log)


def _lot(row: Lot, people: Mapping[str, PersonFact], *, pulled: bool) -> LotFact:
    return LotFact(
        id=row.id,
        code=row.code,
        name=row.name,
        titrant=row.titrant,
        nominal=row.nominal,
        medium=row.medium,
        document=row.document,
        made_by=people[row.made_by],
        made_at=row.made_at,
        pulled=pulled,
    )


def _override(stored: Mapping[str, str], people: Mapping[str, PersonFact]) -> OverrideFact:
    at = datetime.fromisoformat(stored["at"])
    return OverrideFact(stored["what"], stored["reason"], people[stored["by"]], at)


def _entry(row: Entry, people: Mapping[str, PersonFact]) -> WrittenEntry:
    person = people[row.person_id]
    kept = (
        "id", "position", "replicate", "slot", "segment", "text", "unit", "raw", "strikes",
        "reason", "person_id", "posted_by", "device_id", "device_sequence", "device_at",
        "device_zone", "received_at", "late", "file_id",
    )  # fmt: skip
    return WrittenEntry(
        **{name: getattr(row, name) for name in kept},
        printed_name=person.printed_name,
        initials=person.initials,
    )


def _signature(row: Signature) -> SignatureFact:
    kept = ("id", "person_id", "printed_name", "meaning", "at", "zone", "evaluation_id",
            "signed_digest", "reasons", "remark")  # fmt: skip
    return SignatureFact(**{name: getattr(row, name) for name in kept})


def _evaluation(row: Evaluation) -> EvaluationFact:
    """Return an evaluation as its snapshot tells it: what is shown is what was signed."""
    return EvaluationFact(
        id=row.id,
        calculation=row.calculation,
        input_digest=row.input_digest,
        snapshot=row.snapshot,
        snapshot_digest=digest(row.snapshot),
        result=json.loads(row.snapshot)["result"],
        made_at=row.made_at,
    )

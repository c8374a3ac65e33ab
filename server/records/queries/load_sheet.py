"""A bench sheet and all it rests on, loaded as plain values."""

import json
from collections.abc import Iterable, Mapping
from datetime import datetime

from sqlalchemy import select
from sqlalchemy.orm import Session

from server.lab.ink import WrittenEntry
from server.lab.recipe import read_recipe
from server.lab.refusal import NotFound
from server.lab.sheet_facts import (
    INSTRUMENT_KINDS,
    CertificateFact,
    EvaluationFact,
    HoldFact,
    InstrumentFact,
    LaboratoryFact,
    LotFact,
    OverrideFact,
    PersonFact,
    RecipeFact,
    SheetFacts,
    SignatureFact,
    StandardLotFact,
)
from server.records.queries.load_lots import lot_is_pulled, standing_certificate
from server.records.queries.loading import holds_of, laboratory_row
from server.records.tables.bench import Certificate, Entry, Evaluation, Sheet, Signature
from server.records.tables.lots import Lot
from server.records.tables.people import Person
from server.records.tables.stores import Calibration, Instrument, Recipe, StandardLot


def load_sheet_facts(session: Session, sheet_id: str) -> SheetFacts:
    """Return everything a bench sheet rests on and holds.

    Raises:
        NotFound: there is no such sheet.
    """
    sheet = session.get(Sheet, sheet_id)
    if sheet is None:
        raise NotFound("There is no such bench sheet.", field="sheet_id")
    entries = session.scalars(
        select(Entry).where(Entry.sheet_id == sheet.id).order_by(Entry.position)
    ).all()
    lot = session.get_one(Lot, sheet.lot_id)
    ids = {sheet.begun_by, lot.made_by, *(one["by"] for one in sheet.overrides)}
    for entry in entries:
        ids |= {entry.person_id, entry.posted_by}
    people = load_people(session, ids)
    return SheetFacts(
        id=sheet.id,
        number=sheet.number,
        revision=sheet.revision,
        lot=_lot_fact(session, lot, people),
        recipe=load_recipe_fact(session, sheet.recipe_id),
        standard_lot=_standard_lot(session, sheet.standard_lot_id),
        instruments=_instruments(session, sheet.calibrations),
        overrides=tuple(_override(one, people) for one in sheet.overrides),
        begun_by=people[sheet.begun_by],
        begun_at=sheet.begun_at,
        handed_in_at=sheet.handed_in_at,
        sent_back_at=sheet.sent_back_at,
        sent_back_remark=sheet.sent_back_remark,
        countersigned_at=sheet.countersigned_at,
        abandoned_at=sheet.abandoned_at,
        entries=tuple(_entry(one, people) for one in entries),
        signatures=_signatures(session, sheet.id),
        evaluation=_evaluation(session, sheet.evaluation_id),
        laboratory=load_laboratory_fact(session),
        last_certificate=_last_certificate(session, sheet),
    )


def load_people(session: Session, ids: Iterable[str]) -> dict[str, PersonFact]:
    """Return people by id."""
    rows = session.scalars(select(Person).where(Person.id.in_(set(ids))))
    return {row.id: PersonFact(row.id, row.printed_name, row.initials) for row in rows}


def load_laboratory_fact(session: Session) -> LaboratoryFact:
    """Return the laboratory and its settings."""
    row = laboratory_row(session)
    return LaboratoryFact(row.name, row.address, row.zone, row.settings, row.own_signature)


def load_recipe_fact(session: Session, recipe_id: str) -> RecipeFact:
    """Return one version of a recipe.

    Raises:
        NotFound: there is no such recipe.
    """
    row = session.get(Recipe, recipe_id)
    if row is None:
        raise NotFound("There is no such recipe.", field="recipe_id")
    return RecipeFact(row.id, row.name, row.version, read_recipe(row.document))


def load_standard_lot_fact(session: Session, standard_lot_id: str) -> StandardLotFact:
    """Return one standard lot with its holds.

    Raises:
        NotFound: there is no such standard lot.
    """
    row = session.get(StandardLot, standard_lot_id)
    if row is None:
        raise NotFound("There is no such standard lot.", field="standard_lot_id")
    return StandardLotFact(
        id=row.id,
        name=row.name,
        substance=row.substance,
        certificate_number=row.certificate_number,
        issuer=row.issuer,
        due_at=row.due_at,
        due_basis=row.due_basis,
        document=row.document,
        holds=_holds(session, "standard lot", row.id),
    )


def load_instrument_fact(session: Session, calibration_id: str) -> InstrumentFact:
    """Return an instrument with one version of its calibration."""
    calibration = session.get_one(Calibration, calibration_id)
    instrument = session.get_one(Instrument, calibration.instrument_id)
    return InstrumentFact(
        kind=instrument.kind,
        instrument_id=instrument.id,
        name=instrument.name,
        identity=instrument.document,
        calibration_id=calibration.id,
        version=calibration.version,
        certificate_number=calibration.certificate_number,
        issuer=calibration.issuer,
        done_on=calibration.done_on,
        due_at=calibration.due_at,
        due_basis=calibration.due_basis,
        document=calibration.document,
        holds=_holds(session, "instrument", instrument.id),
    )


def _holds(session: Session, kind: str, thing_id: str) -> tuple[HoldFact, ...]:
    rows = holds_of(session, kind, thing_id)
    return tuple(HoldFact(row.held_at, row.released_at, row.reason) for row in rows)


def _lot_fact(session: Session, lot: Lot, people: Mapping[str, PersonFact]) -> LotFact:
    return LotFact(
        id=lot.id,
        code=lot.code,
        name=lot.name,
        titrant=lot.titrant,
        nominal=lot.nominal,
        medium=lot.medium,
        document=lot.document,
        made_by=people[lot.made_by],
        made_at=lot.made_at,
        pulled=lot_is_pulled(session, lot.id),
    )


def _standard_lot(session: Session, standard_lot_id: str | None) -> StandardLotFact | None:
    return None if standard_lot_id is None else load_standard_lot_fact(session, standard_lot_id)


def _instruments(
    session: Session, calibrations: Mapping[str, str | None]
) -> tuple[InstrumentFact, ...]:
    ids = [calibrations.get(kind) for kind in INSTRUMENT_KINDS]
    return tuple(load_instrument_fact(session, one) for one in ids if one)


def _override(stored: Mapping[str, str], people: Mapping[str, PersonFact]) -> OverrideFact:
    at = datetime.fromisoformat(stored["at"])
    return OverrideFact(stored["what"], stored["reason"], people[stored["by"]], at)


def _entry(row: Entry, people: Mapping[str, PersonFact]) -> WrittenEntry:
    person = people[row.person_id]
    return WrittenEntry(
        id=row.id,
        position=row.position,
        replicate=row.replicate,
        slot=row.slot,
        segment=row.segment,
        text=row.text,
        unit=row.unit,
        raw=row.raw,
        strikes=row.strikes,
        reason=row.reason,
        person_id=row.person_id,
        printed_name=person.printed_name,
        initials=person.initials,
        posted_by=row.posted_by,
        device_id=row.device_id,
        device_sequence=row.device_sequence,
        device_at=row.device_at,
        device_zone=row.device_zone,
        received_at=row.received_at,
        late=row.late,
    )


def _signatures(session: Session, sheet_id: str) -> tuple[SignatureFact, ...]:
    rows = session.scalars(
        select(Signature).where(Signature.sheet_id == sheet_id).order_by(Signature.at, Signature.id)
    )
    return tuple(
        SignatureFact(
            id=row.id,
            person_id=row.person_id,
            printed_name=row.printed_name,
            meaning=row.meaning,
            at=row.at,
            zone=row.zone,
            evaluation_id=row.evaluation_id,
            signed_digest=row.signed_digest,
            reasons=row.reasons,
            remark=row.remark,
        )
        for row in rows
    )


def _evaluation(session: Session, evaluation_id: str | None) -> EvaluationFact | None:
    row = session.get(Evaluation, evaluation_id) if evaluation_id else None
    if row is None:
        return None
    return EvaluationFact(
        id=row.id,
        calculation=row.calculation,
        input_digest=row.input_digest,
        snapshot=row.snapshot,
        snapshot_digest=row.snapshot_digest,
        result=row.result,
        made_at=row.made_at,
    )


def _last_certificate(session: Session, sheet: Sheet) -> CertificateFact | None:
    """Return the lot's certificate before this sheet's own; both stay readable for ever."""
    own = session.scalar(select(Certificate).where(Certificate.sheet_id == sheet.id))
    if own is None:
        row = standing_certificate(session, sheet.lot_id)
    else:
        row = session.get(Certificate, own.replaces_id) if own.replaces_id else None
    if row is None:
        return None
    document = json.loads(row.document)
    return CertificateFact(row.id, row.number, row.issued_at, row.valid_until, document)

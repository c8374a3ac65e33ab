"""Everything that a bench sheet rests on and holds, as plain values at one instant."""

from collections.abc import Mapping
from dataclasses import dataclass
from datetime import datetime
from typing import Any

from server.lab.ink import WrittenEntry
from server.lab.recipe import RecipeDocument
from server.lab.states import sheet_state

BALANCE, BURETTE, THERMOMETER, ROOM = "balance", "burette", "thermometer", "room monitor"
PIPETTE, FLASK, PROBE = "pipette", "flask", "probe"
INSTRUMENT_KINDS = (BALANCE, BURETTE, PIPETTE, FLASK, PROBE, THERMOMETER, ROOM)
STANDARD_LOT = "standard lot"


@dataclass(frozen=True, slots=True)
class PersonFact:
    """A person as named on the record."""

    id: str
    printed_name: str
    initials: str


@dataclass(frozen=True, slots=True)
class LaboratoryFact:
    """The laboratory and its settings."""

    name: str
    address: str
    zone: str
    settings: Mapping[str, Any]
    own_signature: bool


@dataclass(frozen=True, slots=True)
class HoldFact:
    """A doubt: from when, until when (None: still), and why."""

    held_at: datetime
    released_at: datetime | None
    reason: str


@dataclass(frozen=True, slots=True)
class StrikeFact:
    """A line of a log struck through: who, when, why."""

    by: PersonFact
    at: datetime
    reason: str


@dataclass(frozen=True, slots=True)
class LogFact:
    """One line in the log of a standard lot or instrument, in ink; ``struck`` where it was."""

    id: str
    what: str
    document: Mapping[str, Any]
    by: PersonFact
    at: datetime
    struck: StrikeFact | None = None


@dataclass(frozen=True, slots=True)
class LotFact:
    """The titrant lot that is standardized."""

    id: str
    code: str
    name: str
    titrant: str
    nominal: str
    medium: str
    document: Mapping[str, Any]
    made_by: PersonFact
    made_at: datetime
    pulled: bool


@dataclass(frozen=True, slots=True)
class RecipeFact:
    """The version of the recipe with which the sheet began."""

    id: str
    name: str
    version: int
    document: RecipeDocument


@dataclass(frozen=True, slots=True)
class StandardLotFact:
    """The delivery of the primary standard that is weighed.

    ``due_at`` and ``due_basis`` are the earliest of its rules: certificate, opening, re-test.
    """

    id: str
    name: str
    substance: str
    certificate_number: str
    issuer: str
    due_at: datetime
    due_basis: str
    document: Mapping[str, Any]
    holds: tuple[HoldFact, ...]
    log: tuple[LogFact, ...] = ()


@dataclass(frozen=True, slots=True)
class InstrumentFact:
    """An instrument with the version of its calibration that serves this sheet.

    ``identity`` is the instrument's own document (resolution, capacity, serial number);
    ``document`` the calibration's record fragment. ``failing`` says what of the calibration does
    not hold; ``log`` holds the checks between two calibrations, oldest first; ``recorded_at`` is
    when the calibration was entered.
    """

    kind: str
    instrument_id: str
    name: str
    identity: Mapping[str, Any]
    calibration_id: str
    version: int
    certificate_number: str
    issuer: str
    done_on: str
    due_at: datetime
    due_basis: str
    document: Mapping[str, Any]
    holds: tuple[HoldFact, ...]
    failing: tuple[str, ...] = ()
    log: tuple[LogFact, ...] = ()
    recorded_at: datetime | None = None


@dataclass(frozen=True, slots=True)
class OverrideFact:
    """A keeper's word that something may be used out of date; ``what`` is a kind."""

    what: str
    reason: str
    by: PersonFact
    at: datetime


@dataclass(frozen=True, slots=True)
class EvaluationFact:
    """The evaluation that was signed."""

    id: str
    calculation: str
    input_digest: str
    snapshot: str
    snapshot_digest: str
    result: Mapping[str, Any]
    made_at: datetime


@dataclass(frozen=True, slots=True)
class SignatureFact:
    """A signature on the sheet; ``reasons`` as ``server.lab.signing`` reads them."""

    id: str
    person_id: str
    printed_name: str
    meaning: str
    at: datetime
    zone: str
    evaluation_id: str
    signed_digest: str
    reasons: Any
    remark: str | None


@dataclass(frozen=True, slots=True)
class RowRemark:
    """A countersigner's remark on one row; replicate 0 is the sheet."""

    replicate: int
    slot: str
    text: str
    segment: int = 1


@dataclass(frozen=True, slots=True)
class ReturnFact:
    """A sheet sent back: when, by whom, with which remark and which remarks on rows."""

    at: datetime
    by: str
    remark: str
    rows: tuple[RowRemark, ...] = ()


@dataclass(frozen=True, slots=True)
class CertificateFact:
    """The lot's standing certificate before this sheet's own."""

    id: str
    number: str
    issued_at: datetime
    valid_until: datetime
    document: Mapping[str, Any]


@dataclass(frozen=True, slots=True)
class SheetFacts:
    """A bench sheet and all it rests on.

    ``signatures`` and ``returns`` stand oldest first; ``entries`` by position.
    """

    id: str
    number: str
    revision: int
    lot: LotFact
    recipe: RecipeFact
    standard_lot: StandardLotFact | None
    instruments: tuple[InstrumentFact, ...]
    overrides: tuple[OverrideFact, ...]
    begun_by: PersonFact
    begun_at: datetime
    handed_in_at: datetime | None
    sent_back_at: datetime | None
    sent_back_remark: str | None
    countersigned_at: datetime | None
    abandoned_at: datetime | None
    entries: tuple[WrittenEntry, ...]
    signatures: tuple[SignatureFact, ...]
    evaluation: EvaluationFact | None
    laboratory: LaboratoryFact
    last_certificate: CertificateFact | None
    returns: tuple[ReturnFact, ...] = ()

    @property
    def state(self) -> str:
        """The sheet's state in a word."""
        return sheet_state(
            handed_in_at=self.handed_in_at,
            sent_back_at=self.sent_back_at,
            countersigned_at=self.countersigned_at,
            abandoned_at=self.abandoned_at,
        )

    @property
    def log_as_of(self) -> datetime | None:
        """Return the instant whose logs count: of the standing hand in; None while it is open."""
        return logs_count_at(self.handed_in_at, self.sent_back_at)

    def instrument(self, kind: str) -> InstrumentFact | None:
        """Return the instrument of a kind, or None where the sheet uses none."""
        return next((one for one in self.instruments if one.kind == kind), None)

    @property
    def measured_signature(self) -> SignatureFact | None:
        """The *measured* signature of the evaluation that stands, or None."""
        if self.evaluation is None:
            return None
        found = [
            one
            for one in self.signatures
            if one.meaning == "measured" and one.evaluation_id == self.evaluation.id
        ]
        return found[-1] if found else None


def logs_count_at(handed_in_at: datetime | None, sent_back_at: datetime | None) -> datetime | None:
    """Return the instant at which logs counted for a sheet; what is written later changes nothing.

    While the sheet is open, or was sent back, they count as they stand (None).
    """
    return None if sent_back_at is not None else handed_in_at

"""A certificate as it is read: the issued document and its state today."""

from dataclasses import dataclass

from server.sheets.bench import FindingView, RestsOn, SignatureView
from server.sheets.countersign import BudgetRow, ReplicateRow


@dataclass(frozen=True, slots=True)
class CertificateFile:
    """A file of the certificate: its address, its kind, and what it is for."""

    url: str
    kind: str
    says: str


@dataclass(frozen=True, slots=True)
class CertificateChanges:
    """Why a certificate replaces the one before it, and what it says otherwise.

    A line holds what changed, what stood there, and what stands now.
    """

    reason: str
    lines: tuple[tuple[str, str, str], ...]


@dataclass(frozen=True, slots=True)
class CertificatePage:
    """The issued statement of a lot's concentration.

    ``reviewed`` False: nobody but whoever did the work has signed it.
    """

    number: str
    state: str
    state_says: str
    replaced_by: str | None
    replaces: str | None
    title: str
    laboratory: str
    address: str
    titrant: str
    nominal: str
    lot_code: str
    lot_name: str
    item: str
    customer: str
    end_point: str
    sheet_number: str
    value: str
    uncertainty: str
    unit: str
    k: str
    beside: str
    coverage: str
    factor: str
    temperature: str
    valid_for: str
    valid_until: str
    valid_until_rule: str
    measured_on: str
    issued_on: str
    method: str
    traceability: tuple[RestsOn, ...]
    findings: tuple[FindingView, ...]
    corrections: tuple[str, ...]
    remarks: tuple[str, ...]
    replicates: tuple[ReplicateRow, ...]
    budget: tuple[BudgetRow, ...]
    bars: str
    dots: str
    signatures: tuple[SignatureView, ...]
    calculation: str
    input_digest: str
    document_digest: str
    document_holds: bool
    trail_anchor: str
    statements: tuple[str, ...]
    files: tuple[CertificateFile, ...]
    no_dcc: str
    changes: CertificateChanges | None
    reviewed: bool
    #: What is no longer as the trail noted it; empty where all is.
    altered: str = ""

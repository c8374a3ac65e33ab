"""What is to be written on a bench sheet, as its writer sends it, and the checks of its form."""

from dataclasses import asdict, dataclass
from datetime import datetime
from uuid import UUID

from server.intake.curve_upload import SentCurve
from server.lab.canonical import canonical, digest
from server.lab.device_clock import read_instant
from server.lab.free_text import check_text
from server.lab.refusal import KeyMissing, Unacceptable
from server.lab.validity import read_zone

_MOST_TEXT = 2000
#: What the columns hold: a device counts up to this, and its clock runs up to this.
_MOST = {"device_sequence": 2**31 - 1, "base_revision": 2**31 - 1, "monotonic_ms": 2**53}


@dataclass(frozen=True, slots=True)
class NewEntry:
    """One thing to write. ``id`` is a UUID made by the writer: the entry's idempotency key.

    ``text`` stays as typed; an empty one only strikes. ``strikes`` is the entry that this one
    replaces, with ``reason``. Replicate 0 is the sheet. A row of kind *curve* takes its original in
    ``curve``: its points become ``raw`` here, and its ``text`` the words for them.
    """

    id: str
    replicate: int
    slot: str
    text: str
    segment: int = 1
    unit: str | None = None
    raw: str | None = None
    strikes: str | None = None
    reason: str | None = None
    device_id: str | None = None
    device_sequence: int | None = None
    device_at: str | None = None
    device_zone: str | None = None
    monotonic_ms: int | None = None
    base_revision: int | None = None
    curve: SentCurve | None = None


@dataclass(frozen=True, slots=True)
class Written:
    """Where an entry stands now; ``repeated`` where it had come before."""

    id: str
    position: int
    repeated: bool


def check_key(entry: NewEntry) -> None:
    """Refuse an entry without a UUID, or with a field that no column holds.

    Raises:
        KeyMissing: it has no UUID.
        Unacceptable: a field cannot be kept; it is named.
    """
    if not entry.id:
        raise KeyMissing("An entry needs its own UUID.", field="id", example=_EXAMPLE_UUID)
    for field in ("id", "strikes", "device_id"):
        value = getattr(entry, field)
        if value is not None and not _is_uuid(value):
            raise Unacceptable(f"{field} must be a UUID.", field=field, example=_EXAMPLE_UUID)
    for field in ("slot", "text", "raw", "reason"):
        check_text(getattr(entry, field) or "", field, most=_MOST_TEXT)
    for field, most in _MOST.items():
        value = getattr(entry, field)
        if value is not None and not 0 <= value <= most:
            says = f"{field} must be a whole number from 0 to {most}."
            raise Unacceptable(says, field=field, example="1")


EXAMPLE_CURVE = '{"pasted": "0.00; 4.01"}'
_EXAMPLE_UUID = "7f0f3b1e-2f57-4c0c-9d62-0c6f8c1c9a11"


def _is_uuid(text: str) -> bool:
    try:
        return str(UUID(text)) == text
    except ValueError:
        return False


def body_digest(sheet_id: str, entry: NewEntry) -> str:
    """Return the digest of all that was sent of an entry: a repeat has the same."""
    body = {"sheet_id": sheet_id, **asdict(entry)}
    if entry.curve is None:
        # entries without one keep the digest that they had before there were curves
        del body["curve"]
    return digest(canonical(body))


def instant_of(entry: NewEntry) -> datetime | None:
    """Return the device's time; it is kept beside the server's, which rules."""
    if entry.device_zone is not None:
        read_zone(entry.device_zone)
    return read_instant(entry.device_at, "device_at")

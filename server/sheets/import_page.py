"""A calibration from outside: the values of its file, for a person to confirm."""

from collections.abc import Mapping
from dataclasses import asdict, dataclass
from datetime import datetime

from sqlalchemy.orm import Session

from server.intake.calibration_file import Asked, ListRead, ReadCalibration, read_calibration_file
from server.lab.actor import Actor
from server.lab.refusal import NotFound, Unacceptable
from server.lab.roles import Act
from server.records.queries.load_files import file_fact
from server.records.tables.stores import File
from server.sheets.instruments_page import find_instrument
from server.sheets.parts.doors import need_reader
from server.sheets.parts.kept_files import file_view
from server.sheets.standard_lots import FileView
from server.sheets.stores import Fact

#: So much of what no field holds is shown on the page; the rest is in the file.
MOST_LEFT_OVER = 200


@dataclass(frozen=True, slots=True)
class ImportStart:
    """The instrument that a calibration's file is handed over for."""

    id: str
    kind: str
    name: str


@dataclass(frozen=True, slots=True)
class ReadOriginal:
    """An original read from the records, not understood yet."""

    start: ImportStart
    serial: str
    file: FileView
    content: bytes


@dataclass(frozen=True, slots=True)
class ImportPage:
    """What a file says, to be confirmed.

    ``filled`` is what the form proposes; ``another`` says that the certificate names another serial
    number; ``problem`` says why the file cannot be read as it is asked. ``left_over`` are (where,
    refType, text); ``more_left_over`` how many are not shown.
    """

    id: str
    kind: str
    name: str
    file_id: str
    file: FileView
    asked: Asked
    source: str
    facts: tuple[Fact, ...]
    another: str
    heads: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]
    sign: str
    says: tuple[str, ...]
    lists: tuple[ListRead, ...]
    chosen: int | None
    left_over: tuple[tuple[str, str, str], ...]
    more_left_over: int
    unknown_ref_types: tuple[str, ...]
    filled: dict[str, str]
    problem: str


def open_import_start(
    session: Session, instrument_id: str, *, actor: Actor | None, now: datetime
) -> ImportStart:
    """Return the instrument that a file is handed over for.

    Raises:
        NotFound: there is no such instrument.
        NotSignedIn: a visitor.
        NotAllowed: somebody who does not keep instruments.
    """
    del now
    need_reader(actor).need(Act.KEEP)
    row = find_instrument(session, instrument_id)
    return ImportStart(row.id, row.kind, row.name)


def read_original_of(
    session: Session, instrument_id: str, file_id: str, *, actor: Actor | None, now: datetime
) -> ReadOriginal:
    """Return a kept original; close the transaction before understanding it.

    Raises:
        NotFound: there is no such instrument or file.
        NotSignedIn: a visitor.
        NotAllowed: somebody who does not keep instruments.
    """
    start = open_import_start(session, instrument_id, actor=actor, now=now)
    reader = need_reader(actor)
    row, fact = session.get(File, file_id), file_fact(session, file_id)
    if row is None or fact is None:
        raise NotFound("There is no such file.", field="file_id")
    serial = str(find_instrument(session, instrument_id).document.get("serial") or "")
    return ReadOriginal(start, serial, file_view(fact, reader.zone), row.content)


def import_page(read: ReadOriginal, asked: Asked) -> ImportPage:
    """Return the page of an original: its values, what is not known, and what is proposed."""
    found, problem = ReadCalibration(source=""), ""
    try:
        found = read_calibration_file(read.content, read.start.kind, asked)
    except Unacceptable as refused:
        problem = refused.says
    left_over = found.left_over[:MOST_LEFT_OVER]
    return ImportPage(
        id=read.start.id,
        kind=read.start.kind,
        name=read.start.name,
        file_id=read.file.url.rpartition("/")[2],
        file=read.file,
        asked=asked,
        source=found.source,
        facts=tuple(Fact(label, value) for label, value in found.facts),
        another=_another(read.serial, found.serials),
        heads=found.heads,
        rows=found.rows,
        sign=found.sign,
        says=found.says,
        lists=found.lists,
        chosen=found.chosen,
        left_over=tuple((one.path, one.ref_type, one.text) for one in left_over),
        more_left_over=len(found.left_over) - len(left_over),
        unknown_ref_types=found.unknown_ref_types,
        filled=_filled(found),
        problem=problem,
    )


def _another(serial: str, serials: tuple[str, ...]) -> str:
    if not serials or serial in serials:
        return ""
    own = serial or "none"
    return (
        f"The certificate is for serial number {', '.join(serials)}; this instrument's is {own}. "
        "Look whether it is the same one."
    )


def _filled(found: ReadCalibration) -> dict[str, str]:
    """Return the fields of the calibration's form that the file fills."""
    filled = dict(found.papers)
    for key, value in found.fragment.items():
        if key == "error_table":
            filled[key] = "\n".join(f"{at}  {added}" for at, added in value)
        elif isinstance(value, dict):
            filled |= _quantity(key, value)
    return filled


def _quantity(key: str, stated: Mapping[str, str]) -> dict[str, str]:
    """Return a quantity's fields: its value, and how its uncertainty is stated."""
    filled = {f"{key}_value": stated["value"]} if stated.get("value") else {}
    for statement in ("u", "U"):
        if stated.get(statement):
            filled |= {f"{key}_statement": statement, f"{key}_bound": stated[statement]}
    if stated.get("k"):
        filled[f"{key}_k"] = stated["k"]
    return filled


def asked_query(asked: Asked) -> dict[str, str]:
    """Return how a file is to be read as the query of its page's address."""
    return {key: value for key, value in asdict(asked).items() if value}

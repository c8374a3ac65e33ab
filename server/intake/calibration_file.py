"""A calibration from outside, whatever its format: its values for a person to confirm."""

from collections.abc import Iterator, Mapping
from dataclasses import asdict, dataclass, field
from typing import Any

from server.intake.calibration_table import read_calibration_table
from server.intake.dcc import CalibrationCertificate, Shown, Table, read_dcc
from server.intake.dcc_errors import MASS, TEMPERATURE, Scale, error_proposal, error_tables
from server.intake.dcc_volumes import burette_proposal, volume_proposal, volume_tables
from server.intake.table_columns import BASE_UNITS
from server.intake.workbook import is_workbook
from server.lab.refusal import Unacceptable
from server.lab.sheet_facts import BALANCE, BURETTE, FLASK, PIPETTE, THERMOMETER

#: How a person may say what a column of a table means where the header does not tell.
MEANS = ("", "correction", "error")
_SCALES: Mapping[str, Scale] = {BALANCE: MASS, THERMOMETER: TEMPERATURE}
_VOLUMES = {PIPETTE: "delivery", FLASK: "volume"}


@dataclass(frozen=True, slots=True)
class Asked:
    """How a file is to be read: the sheet of a workbook, what its column means, which list.

    ``table`` is the place of a certificate's list; empty is the first that fits.
    """

    sheet: str = ""
    means: str = ""
    table: str = ""


@dataclass(frozen=True, slots=True)
class ListRead:
    """A list of a certificate, column by column as text; ``usable`` where it is read by itself."""

    index: int
    name: str
    usable: bool
    heads: tuple[str, ...]
    rows: tuple[tuple[str, ...], ...]


@dataclass(frozen=True, slots=True)
class ReadCalibration:
    """What a file says, all as text; nothing of it counts before a person has confirmed it.

    ``papers`` are number, issuer and days as far as it states them; ``serials`` the numbers of what
    was calibrated. ``heads`` and ``rows`` are the table that was read, ``fragment`` what it becomes
    in a calibration. ``lists`` are all lists of a certificate; ``left_over`` what no field holds.
    """

    source: str
    facts: tuple[tuple[str, str], ...] = ()
    serials: tuple[str, ...] = ()
    papers: Mapping[str, str] = field(default_factory=dict)
    heads: tuple[str, ...] = ()
    rows: tuple[tuple[str, ...], ...] = ()
    sign: str = ""
    says: tuple[str, ...] = ()
    fragment: Mapping[str, Any] = field(default_factory=dict)
    lists: tuple[ListRead, ...] = ()
    chosen: int | None = None
    left_over: tuple[Shown, ...] = ()
    unknown_ref_types: tuple[str, ...] = ()


def read_calibration_file(data: bytes, kind: str, asked: Asked | None = None) -> ReadCalibration:
    """Return what a file says of the calibration of an instrument of a kind.

    A Digital Calibration Certificate (XML), a workbook (XLSX) or a table as text (CSV) is read.

    Raises:
        Unacceptable: it cannot be read, or is not safe to read; the sentence says why.
    """
    asked = asked or Asked()
    if asked.means not in MEANS:
        says = "means is correction, error, or empty: as the header says."
        raise Unacceptable(says, field="means", example="error")
    if data.lstrip(b"\xef\xbb\xbf \t\r\n").startswith(b"<"):
        return _of_certificate(read_dcc(data), kind, asked)
    if kind not in BASE_UNITS:
        says = (
            f"A table is read for a {', '.join(BASE_UNITS)}; type what the certificate of a {kind} "
            "states, and hand its file over there."
        )
        raise Unacceptable(says, field="file")
    return _of_table(data, kind, asked)


def _of_table(data: bytes, kind: str, asked: Asked) -> ReadCalibration:
    table = read_calibration_table(data, kind, sheet=asked.sheet or None, means=asked.means or None)
    unit = "°C" if table.unit == "Cel" else table.unit
    return ReadCalibration(
        source="XLSX workbook" if is_workbook(data) else "table as text (CSV)",
        heads=(f"reading, {unit}", f"added, {unit}", f"u, {unit}"),
        rows=tuple((one.reading, one.correction, one.u or "") for one in table.rows),
        sign=table.sign,
        says=(*table.columns, *table.says),
        fragment=table.fragment,
    )


def _of_certificate(found: CalibrationCertificate, kind: str, asked: Asked) -> ReadCalibration:
    usable = _usable(found.tables, kind)
    lists = tuple(_list(one, i, usable=i in usable) for i, one in enumerate(found.tables))
    common: dict[str, Any] = {
        "source": f"Digital Calibration Certificate {found.schema_version}",
        "facts": tuple(_facts(found)),
        "serials": tuple(one.serial for one in found.items if one.serial),
        "papers": _papers(found),
        "lists": lists,
        "left_over": found.left_over,
        "unknown_ref_types": found.unknown_ref_types,
    }
    chosen = _chosen(asked.table, len(lists), usable)
    if chosen is None:
        says = (
            f"No list of this certificate is read by itself as the corrections of a {kind}: "
            "type what it states."
        )
        return ReadCalibration(**common, says=(says,))
    return ReadCalibration(**common, chosen=chosen, **_proposed(found.tables[chosen], kind))


def _usable(tables: tuple[Table, ...], kind: str) -> tuple[int, ...]:
    """Return which lists are read by themselves for a kind of instrument, by their place."""
    if kind in _SCALES:
        return error_tables(tables, _SCALES[kind])
    if kind == BURETTE or kind in _VOLUMES:
        return volume_tables(tables, several=kind == BURETTE)
    return ()


def _proposed(table: Table, kind: str) -> dict[str, Any]:
    """Return what a list becomes for a kind of instrument.

    Raises:
        Unacceptable: it makes no such calibration; the sentence says why.
    """
    if kind in _SCALES:
        scale = _SCALES[kind]
        found = error_proposal(table, scale)
        return {
            "heads": tuple(
                f"{head}, {scale.shown}" for head in ("indication", "error", "added", "u")
            ),
            "rows": tuple((*row[:3], row[3] or "") for row in found.rows),
            "sign": "error of indication, taken away from a reading",
            "says": found.says,
            "fragment": found.fragment,
        }
    if kind == BURETTE:
        return asdict(burette_proposal(table))
    if kind in _VOLUMES:
        return asdict(volume_proposal(table, _VOLUMES[kind]))
    says = f"No list of a certificate is read for a {kind}: type what it states."
    raise Unacceptable(says, field="table")


def _chosen(text: str, count: int, usable: tuple[int, ...]) -> int | None:
    if not text:
        return usable[0] if usable else None
    if not (text.isascii() and text.isdigit() and len(text) < 5 and int(text) < count):
        says = f"table is the place of one of the certificate's {count} lists, from 0."
        raise Unacceptable(says, field="table", example="0")
    return int(text)


def _papers(found: CalibrationCertificate) -> dict[str, str]:
    stated = {
        "certificate_number": found.unique_identifier,
        "issuer": found.laboratory,
        "done_on": found.ended_on[:10],
        "due_on": (found.recalibration or "")[:10],
        "due_basis": "recalibration day on the certificate" if found.recalibration else "",
    }
    return {key: value for key, value in stated.items() if value}


def _facts(found: CalibrationCertificate) -> Iterator[tuple[str, str]]:
    code = f" ({found.laboratory_code})" if found.laboratory_code else ""
    stated = [
        ("Number", found.unique_identifier),
        ("Laboratory", f"{found.laboratory}{code}"),
        ("Received", found.received_on),
        ("Done", f"{found.begun_on} to {found.ended_on}"),
        ("Issued", found.issued_on),
        ("To be calibrated again", found.recalibration or ""),
        ("Responsible", ", ".join(found.responsible)),
        ("Customer", found.customer),
        ("Written by", ", ".join(found.software)),
    ]
    for item in found.items:
        numbers = ", ".join(
            f"{one.value} ({one.issuer or one.name})" for one in item.identifications
        )
        parts = (item.name, item.maker, item.model, numbers)
        stated.append(("Calibrated", ", ".join(one for one in parts if one)))
    yield from ((label, value) for label, value in stated if value.strip())


def _list(table: Table, index: int, *, usable: bool) -> ListRead:
    """Return a certificate's list as text: a number with its unit and uncertainty in each cell."""
    length = max((len(one.amounts) for one in table.columns), default=0)
    rows = []
    for place in range(max(length, 1)):
        cells = []
        for column in table.columns:
            if place < len(column.amounts):
                one = column.amounts[place]
                U = f" ± {one.U}" + (f" (k = {one.k})" if one.k else "") if one.U else ""
                cells.append(f"{one.value}{U} {one.unit}".strip())
            else:
                cells.append(column.text if place == 0 else "")
        rows.append(tuple(cells))
    heads = tuple(
        f"{one.name} [{' '.join(one.ref_types)}]".strip() if one.ref_types else one.name
        for one in table.columns
    )
    return ListRead(index, table.name, usable, heads, tuple(rows))

"""A curve as it is sent: a file or pasted text, how to read it, and what becomes of it."""

import base64
import binascii
from collections.abc import Mapping
from dataclasses import dataclass, field
from decimal import Decimal
from typing import Any

from server.intake.curve_columns import RememberedColumns, mapping_from
from server.intake.curve_table import Asked, CurveTable, Drop
from server.intake.curve_workbook import read_curve_file
from server.intake.kept_files import TEXT, XLSX, Original, media_type_of, plain_name, sha256_of
from server.lab.curve_entry import (
    MOST_POINTS,
    CurveDrop,
    CurveEntry,
    CurveFile,
    CurveRow,
    positive_text,
    read_curve_entry,
    write_curve_entry,
)
from server.lab.refusal import Unacceptable

#: R106: 5 MB packed, and not a byte more is decoded.
MOST_BYTES = 5_000_000
PASTED = "pasted.txt"
_MOST_LEFT_OUT = 20


@dataclass(frozen=True, slots=True)
class SentCurve:
    """A curve's original and how to read it.

    Either ``content_base64`` with ``file_name``, or ``pasted`` text. ``mapping`` says which column
    (from 0) holds what; without it the header or the instrument's last file tells. ``sheet`` names
    a workbook's sheet. ``drop_mL`` is the calibrated volume of a drop where drops were counted,
    ``drop_u_mL`` its standard uncertainty, shared by all points. ``leave_out`` are rows without
    numbers that are passed over.
    """

    file_name: str | None = None
    content_base64: str | None = field(default=None, repr=False)
    pasted: str | None = field(default=None, repr=False)
    mapping: dict[str, Any] | None = None
    sheet: str | None = None
    drop_mL: str | None = None
    drop_u_mL: str | None = None
    leave_out: tuple[int, ...] = ()


@dataclass(frozen=True, slots=True)
class ReadCurve:
    """A curve that was read: its table, its original, and the entry that it would be."""

    table: CurveTable
    original: Original
    entry: CurveEntry

    @property
    def columns(self) -> RememberedColumns:
        """What is remembered for the instrument."""
        shape = self.table.shape
        return RememberedColumns(self.table.mapping, shape.header, shape.width)


def read_sent_curve(
    sent: SentCurve,
    *,
    remembered: RememberedColumns | None = None,
    instrument: str | None = None,
) -> ReadCurve:
    """Return the curve that was sent; ``instrument`` is whose drops were counted.

    Raises:
        Unacceptable: nothing or both was sent, it is too large or of another kind, or no curve.
    """
    content, name = _content(sent)
    drop = _drop(sent)
    if len(sent.leave_out) > _MOST_LEFT_OUT:
        says = f"{len(sent.leave_out)} rows are to be left out; at most {_MOST_LEFT_OUT} can be."
        raise Unacceptable(says, field="leave_out")
    asked = Asked(
        mapping=None if sent.mapping is None else mapping_from(_object(sent.mapping)),
        remembered=remembered,
        drop=drop,
        leave_out=tuple(sent.leave_out),
        most_points=MOST_POINTS,
    )
    table = read_curve_file(content, sheet=sent.sheet or None, asked=asked)
    original = Original(name, _kind(content), table.sha256, content)
    counted = drop is not None and table.mapping.volume_unit == "drops"
    entry = CurveEntry(
        kind=table.kind,
        volume_mL=table.volume_mL,
        reading=table.reading,
        seconds=table.seconds,
        mapping=table.mapping.to_document(),
        set_aside=tuple(CurveRow(one.row, one.says) for one in table.set_aside),
        drop=_drop_kept(sent, instrument) if counted else None,
        file=CurveFile(name, sha256_of(content)),
    )
    read_curve_entry(write_curve_entry(entry))  # what is kept can be read again, or is refused now
    return ReadCurve(table, original, entry)


def _content(sent: SentCurve) -> tuple[bytes, str]:
    if (sent.content_base64 is None) == (sent.pasted is None):
        says = "Send a file (content_base64 with file_name) or pasted text, one of the two."
        raise Unacceptable(says, field="content_base64", example="Vg==")
    if sent.pasted is not None:
        content = sent.pasted.encode("utf-8")
        name = plain_name(sent.file_name or PASTED)
    else:
        name = plain_name(sent.file_name or "")
        content = _decoded(sent.content_base64 or "")
    if not content.strip():
        raise Unacceptable("There is nothing in it.", field="file", example="0.00; 4.01")
    if len(content) > MOST_BYTES:
        raise _too_large(len(content))
    return content, name


def _decoded(text: str) -> bytes:
    if len(text) > MOST_BYTES * 4 // 3 + 4:
        raise _too_large(len(text) * 3 // 4)
    try:
        return base64.b64decode(text, validate=True)
    except (binascii.Error, ValueError) as problem:
        says = "The file's content must be base64 text."
        raise Unacceptable(says, field="content_base64", example="Vjtw") from problem


def _too_large(size: int) -> Unacceptable:
    says = f"The file has {size / 1e6:.1f} MB; at most {MOST_BYTES / 1e6:g} MB are read."
    return Unacceptable(says, field="file")


def _kind(content: bytes) -> str:
    """Return the media type: a workbook, or text in whichever encoding it was read in."""
    try:
        return XLSX if media_type_of(content) == XLSX else TEXT
    except Unacceptable:
        return TEXT


def _drop(sent: SentCurve) -> Drop | None:
    if not sent.drop_mL:
        if sent.drop_u_mL:
            says = "Give the volume of one drop beside its uncertainty."
            raise Unacceptable(says, field="drop_mL", example="0.0487")
        return None
    stated = {"drop_mL": sent.drop_mL, "drop_u_mL": sent.drop_u_mL}
    volume = Decimal(positive_text(stated, "drop_mL", "", example="0.0487"))
    if not sent.drop_u_mL:
        return Drop(volume)
    u = Decimal(positive_text(stated, "drop_u_mL", "", example="0.0002"))
    if u >= volume:
        says = "The uncertainty of one drop is not less than the drop itself."
        raise Unacceptable(says, field="drop_u_mL", example="0.0002")
    return Drop(volume, u)


def _drop_kept(sent: SentCurve, instrument: str | None) -> CurveDrop:
    return CurveDrop(sent.drop_mL or "", sent.drop_u_mL or None, instrument)


def _object(mapping: Any) -> Mapping[str, Any]:
    if not isinstance(mapping, Mapping):
        raise Unacceptable("mapping must be an object.", field="mapping")
    return mapping

"""An original that somebody hands over: what it is by its bytes, its name made plain, its hash."""

import base64
import binascii
import hashlib
import re
import unicodedata
from dataclasses import dataclass

from server.lab.refusal import Unacceptable

MOST_BYTES = 1_900_000
PDF, PNG, JPEG = "application/pdf", "image/png", "image/jpeg"
XLSX = "application/vnd.openxmlformats-officedocument.spreadsheetml.sheet"
XML, TEXT = "application/xml", "text/plain"
_BEGINS = ((b"%PDF-", PDF), (b"\x89PNG\r\n\x1a\n", PNG), (b"\xff\xd8\xff", JPEG))
_MOST_NAME, _MOST_END = 120, 8
_KNOWN = "PDF, PNG, JPEG, XML, XLSX or plain text"


@dataclass(frozen=True, slots=True)
class Original:
    """The bytes of an original with a plain name, its media type by content, and its SHA-256."""

    name: str
    media_type: str
    sha256: str
    content: bytes


def read_original(name: str, content_base64: str, *, field: str = "content_base64") -> Original:
    """Return an original that travelled as base64 text.

    Raises:
        Unacceptable: no base64, nothing in it, too large, or of a kind that is not kept.
    """
    try:
        content = base64.b64decode(content_base64, validate=True)
    except (binascii.Error, ValueError) as problem:
        says = "The file's content must be base64 text."
        raise Unacceptable(says, field=field, example="JVBERi0xLjcK") from problem
    if not content:
        raise Unacceptable("The file is empty.", field=field)
    if len(content) > MOST_BYTES:
        says = f"The file has {len(content)} bytes; up to {MOST_BYTES} are kept."
        raise Unacceptable(says, field=field)
    return Original(
        name=plain_name(name),
        media_type=media_type_of(content, field=field),
        sha256=sha256_of(content),
        content=content,
    )


def sha256_of(content: bytes) -> str:
    """Return the SHA-256 of bytes as hexadecimal text."""
    return hashlib.sha256(content).hexdigest()


def media_type_of(content: bytes, *, field: str = "content_base64") -> str:
    """Return what a file is by its bytes, never by its name.

    Raises:
        Unacceptable: it is nothing that is kept here.
    """
    for begins, kind in _BEGINS:
        if content.startswith(begins):
            return kind
    if content.startswith(b"PK\x03\x04") and b"[Content_Types].xml" in content:
        return XLSX
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError:
        text = "\0"
    if any(one < " " and one not in "\t\r\n\f" for one in text):
        says = f"This file is none of the kinds that are kept: {_KNOWN}."
        raise Unacceptable(says, field=field, example="certificate.pdf")
    return XML if text.lstrip().startswith("<?xml") else TEXT


def plain_name(name: str) -> str:
    """Return a file's name without folders and without characters that a system may stumble over.

    Raises:
        Unacceptable: nothing of it is left.
    """
    last = re.split(r"[/\\]", unicodedata.normalize("NFC", name))[-1]
    kept = "".join(one for one in last if one.isprintable() and one not in '<>:"|?*')
    plain = " ".join(kept.split()).strip(". ")
    if not plain:
        raise Unacceptable("The file has no name.", field="file_name", example="certificate.pdf")
    stem, dot, end = plain.rpartition(".")
    if len(plain) <= _MOST_NAME:
        return plain
    if dot and len(end) < _MOST_END:
        return f"{stem[: _MOST_NAME - 1 - len(end)]}.{end}"
    return plain[:_MOST_NAME]

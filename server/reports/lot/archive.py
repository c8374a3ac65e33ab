"""A lot as one ZIP archive: certificates, record, trail, files, and a manifest with hashes."""

import io
import json
import re
import zipfile
from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from datetime import UTC, datetime
from hashlib import sha256
from typing import Any

from server.credentials.signing_keys import SigningKeys
from server.lab.canonical import canonical
from server.reports.certificate.pdf import certificate_pdf
from server.reports.dcc.certificate import About, dcc_xml
from server.reports.issued import Issued
from server.reports.lot.bundle import LotBundle, OriginalFile
from server.reports.lot.entries import entries_csv
from server.reports.lot.guide import guide_text
from server.reports.signed_certificate import sign_certificate

FORMAT = "lot-archive/1"
MANIFEST, SUMS, GUIDE = "manifest.json", "SHA256SUMS", "READ-ME.txt"
_SAFE = re.compile(r"[^A-Za-z0-9._-]+")
_FIRST_DAY = datetime(1980, 1, 1, tzinfo=UTC)
_MOST_NAME = 80


@dataclass(frozen=True, slots=True)
class Made:
    """With what an archive is made: the signing keys, and what a DCC must say besides.

    Without a country (``about`` is None) no DCC is made; the guide says so.
    """

    keys: SigningKeys
    about: About | None


def lot_archive(bundle: LotBundle, made: Made) -> bytes:
    """Return a lot as a ZIP archive. The same input gives the same bytes.

    A certificate whose text is not the one that was issued comes along, marked as altered, but is
    neither signed nor exported as a DCC.
    """
    parts = dict(_parts(bundle, made))
    parts[GUIDE] = guide_text(bundle, with_dcc=made.about is not None).encode()
    parts[MANIFEST] = _json(
        {
            "format": FORMAT,
            "lot": bundle.code,
            "as_of": bundle.as_of.isoformat(),
            "files": [
                {"path": path, "bytes": len(parts[path]), "sha256": sha256(parts[path]).hexdigest()}
                for path in sorted(parts)
            ],
        }
    )
    sums = (f"{sha256(parts[path]).hexdigest()}  {path}\n" for path in sorted(parts))
    parts[SUMS] = "".join(sums).encode()
    return _zipped(parts, bundle.as_of)


def _parts(bundle: LotBundle, made: Made) -> Iterator[tuple[str, bytes]]:
    yield "lot.json", _json(_summary(bundle))
    for one in bundle.certificates:
        yield from _certificate_parts(one, bundle, made)
    yield "entries.csv", entries_csv(bundle.sheets)
    yield "trail.jsonl", "".join(f"{canonical(row)}\n" for row in bundle.trail).encode()
    yield "keys.json", _json(made.keys.jwks())
    for file in bundle.files:
        yield f"files/{_file_name(file)}", file.content


def _certificate_parts(
    issued: Issued, bundle: LotBundle, made: Made
) -> Iterator[tuple[str, bytes]]:
    start = f"certificates/{_safe(issued.number)}"
    jws = sign_certificate(issued, made.keys.current) if issued.holds else None
    pdf = certificate_pdf(issued, jws=jws)
    yield f"{start}.pdf", pdf
    yield f"{start}.json", issued.text.encode()
    if jws is not None:
        yield f"{start}.jws", jws.encode()
    if issued.holds and made.about is not None:
        about = replace(made.about, paper_hashes=bundle.paper_hashes)
        yield f"{start}.dcc.xml", dcc_xml(issued, about)
    if issued.snapshot is not None:
        yield f"{start}.evaluation.json", issued.snapshot.encode()
        yield f"{start}.bench-record.json", _json(json.loads(issued.snapshot)["record"])


def _summary(bundle: LotBundle) -> dict[str, Any]:
    return {
        "format": FORMAT,
        "lot": {"code": bundle.code, "name": bundle.name, "titrant": bundle.titrant},
        "laboratory": bundle.laboratory,
        "as_of": bundle.as_of.isoformat(),
        "certificates": [_certificate_line(one) for one in bundle.certificates],
        "sheets": [
            {"number": one.number, "state": one.state, "entries": len(one.entries)}
            for one in bundle.sheets
        ],
        "bottles": [dict(one) for one in bundle.bottles],
        "files": [
            {"path": f"files/{_file_name(one)}", "name": one.name, "media_type": one.media_type,
             "sha256": one.sha256, "papers": list(one.papers)}
            for one in bundle.files
        ],
    }  # fmt: skip


def _certificate_line(issued: Issued) -> dict[str, Any]:
    return {
        "number": issued.number,
        "state": issued.state,
        "state_says": issued.state_says,
        "replaced_by": issued.replaced_by,
        "reported": issued.document["result"]["concentration"]["reported"],
        "valid_until": issued.document["validity"]["until"],
        "document_digest": issued.document_digest,
        "document_holds": issued.holds,
        "signatures_hold": list(issued.signatures_hold),
        "trail": {"seq": issued.anchor.seq, "hash": issued.anchor.hash},
    }


def _file_name(file: OriginalFile) -> str:
    """Return a name that no other file has and that leads to no other folder."""
    return f"{file.sha256[:16]}-{_safe(file.name)}"


def _safe(name: str) -> str:
    return _SAFE.sub("_", name).lstrip(".")[-_MOST_NAME:] or "file"


def _json(value: Mapping[str, Any]) -> bytes:
    return (json.dumps(value, ensure_ascii=False, indent=1, allow_nan=False) + "\n").encode()


def _zipped(parts: Mapping[str, bytes], at: datetime) -> bytes:
    local = max(at.astimezone(UTC), _FIRST_DAY)
    held = io.BytesIO()
    with zipfile.ZipFile(held, "w", zipfile.ZIP_DEFLATED) as archive:
        for path in sorted(parts):
            info = zipfile.ZipInfo(path, local.timetuple()[:6])
            info.compress_type = zipfile.ZIP_DEFLATED
            info.external_attr = 0o644 << 16
            archive.writestr(info, parts[path])
    return held.getvalue()

import base64
import hashlib
import io
import zipfile

import pytest

from server.intake.kept_files import (
    JPEG,
    MOST_BYTES,
    PDF,
    PNG,
    TEXT,
    XLSX,
    XML,
    media_type_of,
    plain_name,
    read_original,
)
from server.lab.refusal import Unacceptable


def as_base64(content: bytes) -> str:
    return base64.b64encode(content).decode("ascii")


def workbook() -> bytes:
    held = io.BytesIO()
    with zipfile.ZipFile(held, "w") as archive:
        archive.writestr("[Content_Types].xml", "<Types/>")
    return held.getvalue()


@pytest.mark.parametrize(
    ("content", "kind"),
    [
        (b"%PDF-1.7\n\xff", PDF),
        (b"\x89PNG\r\n\x1a\n\x00", PNG),
        (b"\xff\xd8\xff\xe0\x00", JPEG),
        (workbook(), XLSX),
        (b'\xef\xbb\xbf<?xml version="1.0"?><a/>', XML),
        ("Massenanteil 0,9999 ± 0,0003".encode(), TEXT),
        (b"<html><script>", TEXT),
    ],
)
def test_original_kind_is_told_by_its_bytes(content, kind):
    found = read_original("certificate.exe", as_base64(content))
    assert found.media_type == kind
    assert found.content == content
    assert found.sha256 == hashlib.sha256(content).hexdigest()


@pytest.mark.parametrize(
    "content",
    [b"MZ\x90\x00\x03", b"\x7fELF\x02", b"PK\x03\x04 no workbook \xff", b"a\0b", b"\x1b[31m"],
)
def test_original_of_another_kind_is_refused(content):
    with pytest.raises(Unacceptable, match="none of the kinds"):
        media_type_of(content)


@pytest.mark.parametrize(
    ("text", "says"),
    [
        ("", "empty"),
        ("no base64!", "base64"),
        ("JVBERi0xLjc", "base64"),
        (as_base64(b"%PDF-" + b"x" * MOST_BYTES), "bytes"),
    ],
)
def test_original_that_cannot_be_kept_is_refused_by_field(text, says):
    with pytest.raises(Unacceptable, match=says) as refused:
        read_original("a.pdf", text)
    assert refused.value.field == "content_base64"


@pytest.mark.parametrize(
    ("name", "plain"),
    [
        ("certificate.pdf", "certificate.pdf"),
        ("../../etc/passwd", "passwd"),
        ("C:\\papers\\KHP 7.pdf", "KHP 7.pdf"),
        ('a<b>"c".pdf', "abc.pdf"),
        ("a\r\nSet-Cookie: x.pdf", "aSet-Cookie x.pdf"),
        ("x" * 200 + ".pdf", "x" * 116 + ".pdf"),
        ("Zertifikat für KHP.pdf", "Zertifikat für KHP.pdf"),
    ],
)
def test_original_name_is_made_plain(name, plain):
    assert plain_name(name) == plain


@pytest.mark.parametrize("name", ["", "...", "a/", "\0", "///"])
def test_original_without_a_name_is_refused(name):
    with pytest.raises(Unacceptable, match="no name"):
        plain_name(name)

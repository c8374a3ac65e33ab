"""Files that leave the laboratory through the web: certificates, keys, archives of lots."""

import csv
import hashlib
import io
import json
import os
import stat
import subprocess
import sys
import zipfile
from pathlib import Path
from typing import Any

import numpy as np
import pypdf
import pypdfium2
import pytest
import zxingcpp
from joserfc import jws as jose
from joserfc.jwk import KeySet
from lxml import etree

from server.credentials.signing_keys import KeyProblem, open_signing_keys, retire_signing_key
from server.lab.canonical import canonical

ROOT = Path(__file__).resolve().parents[2]
KINDS = ("pdf", "json", "jws", "dcc.xml", "bench-record.json")
STANDS, REPLACED = "TL-2026-0005", "TL-2026-0004"
DCC = "{https://ptb.de/dcc}"


@pytest.fixture(scope="module")
def rosa(shared_web: Any) -> Any:
    """A reader."""
    return shared_web.client("rosa")


def _text(pdf: bytes) -> str:
    pages = pypdf.PdfReader(io.BytesIO(pdf)).pages
    return " ".join(" ".join(page.extract_text() for page in pages).split())


@pytest.mark.parametrize("number", [STANDS, REPLACED])
def test_pdf_attaches_the_document_of_the_api_and_its_signature(rosa: Any, number: str) -> None:
    pdf = rosa.get(f"/certificates/{number}.pdf")
    told = rosa.get(f"/api/certificates/{number}").json()
    attached = pypdf.PdfReader(io.BytesIO(pdf.content)).attachments

    assert pdf.headers["content-type"] == "application/pdf"
    assert f'filename="{number}.pdf"' in pdf.headers["content-disposition"]
    (document,), (jws,) = attached[f"{number}.json"], attached[f"{number}.jws"]
    assert document == canonical(told["document"]).encode()
    assert hashlib.sha256(document).hexdigest() == told["document_digest"]
    assert document == rosa.get(f"/certificates/{number}.json").content
    assert jws == rosa.get(f"/certificates/{number}.jws").content


@pytest.mark.parametrize("kind", KINDS)
def test_file_is_the_same_from_page_and_api(rosa: Any, kind: str) -> None:
    page = rosa.get(f"/certificates/{STANDS}.{kind}")
    api = rosa.get(f"/api/certificates/{STANDS}.{kind}")

    assert page.status_code == api.status_code == 200
    assert page.content == api.content
    assert page.headers["certificate-state"] == "standing"


def test_signed_certificate_is_verified_by_joserfc_with_the_published_keys(
    shared_web: Any, rosa: Any
) -> None:
    """A visitor gets the keys; the library knows nothing of this program."""
    published = shared_web.visitor().get("/.well-known/jwks.json")
    keys = KeySet.import_key_set(published.json())
    signed = rosa.get(f"/certificates/{STANDS}.jws").text

    found = jose.deserialize_compact(signed, keys, algorithms=["ES256"])

    payload = json.loads(found.payload)
    document = rosa.get(f"/api/certificates/{STANDS}").json()["document"]
    assert payload["certificate"] == _numbers_as_text(document)
    assert payload["certificate"]["result"]["concentration"]["temperature_C"] == "20"
    assert published.headers["content-type"] == "application/jwk-set+json"
    assert all("d" not in key for key in published.json()["keys"])


def _numbers_as_text(value: Any) -> Any:
    if isinstance(value, dict):
        return {key: _numbers_as_text(one) for key, one in value.items()}
    if isinstance(value, list):
        return [_numbers_as_text(one) for one in value]
    is_number = isinstance(value, int | float) and not isinstance(value, bool)
    return repr(value) if is_number else value


def test_key_lies_beside_the_database_for_its_owner_alone(shared_web: Any) -> None:
    database = shared_web.transactions.database.engine.url.database
    folder = Path(database).parent / "keys"
    (file,) = folder.iterdir()

    assert stat.S_IMODE(folder.stat().st_mode) == 0o700
    assert stat.S_IMODE(file.stat().st_mode) == 0o600


def test_key_that_others_may_read_stops_the_program_from_starting(web: Any, tmp_path: Path) -> None:
    from server.app import build_app
    from server.settings import Settings

    open_signing_keys(tmp_path / "keys", now=web.clock())
    next((tmp_path / "keys").iterdir()).chmod(0o640)
    settings = Settings(tmp_path, str(web.transactions.database.engine.url))

    with pytest.raises(KeyProblem, match="chmod 600"):
        build_app(settings, transactions=web.transactions, clock=web.clock)


def test_key_that_is_retired_still_verifies_what_it_signed(web: Any) -> None:
    from server.app import build_app
    from server.settings import Settings

    signed = web.client("rosa").get(f"/certificates/{STANDS}.jws").text
    data = Path(web.transactions.database.engine.url.database).parent
    retire_signing_key(data / "keys", now=web.clock())
    settings = Settings(data, str(web.transactions.database.engine.url))
    later = build_app(settings, transactions=web.transactions, clock=web.clock)

    published = later.state.parts.keys.jwks()

    assert len(published["keys"]) == 2
    assert published["keys"][0]["kid"] == later.state.parts.keys.current.kid
    jose.deserialize_compact(signed, KeySet.import_key_set(published), algorithms=["ES256"])
    assert len(open_signing_keys(data / "keys", now=web.clock()).keys) == 2


def test_dcc_of_the_laboratorys_country_is_one_document_with_its_number(rosa: Any) -> None:
    root = etree.fromstring(rosa.get(f"/certificates/{REPLACED}.dcc.xml").content)

    assert root.findtext(f".//{DCC}uniqueIdentifier") == REPLACED
    assert root.findtext(f".//{DCC}countryCodeISO3166_1") == "CH"
    says = [one.text or "" for one in root.iterfind(f".//{DCC}statement//{DCC}content")]
    assert any(f"replaced by {STANDS}" in one for one in says)


def test_dcc_without_a_country_is_refused_by_field_and_not_offered(web: Any) -> None:
    marisol, rosa = web.client("marisol"), web.client("rosa")
    kept = marisol.get("/api/laboratory").json()
    given = {"name": kept["laboratory"], "zone": kept["zone"], "address": "", "country": ""}
    marisol.post("/api/laboratory", {**given, "shelf_open": True, "revision": kept["revision"]})

    answer = rosa.get(f"/api/certificates/{STANDS}.dcc.xml")

    assert answer.status_code == 422
    assert answer.json()["field"] == "country"
    page = rosa.get(f"/certificates/{STANDS}").text
    assert ".dcc.xml" not in page
    assert "No DCC: the laboratory&#39;s country is not set." in page


def test_pdf_leads_by_its_qr_code_to_where_its_state_is_told(web: Any) -> None:
    """Without an own address it has none; with one the code is read by zxing-cpp."""
    rosa, marisol = web.client("rosa"), web.client("marisol")
    assert _codes(rosa.get(f"/certificates/{STANDS}.pdf").content) == []
    kept = marisol.get("/api/laboratory").json()
    given = {"name": kept["laboratory"], "zone": kept["zone"], "address": kept["address"]}
    given |= {"base_url": "https://testserver/", "revision": kept["revision"]}
    assert marisol.post("/api/laboratory", given).status_code == 200

    (address,) = _codes(rosa.get(f"/certificates/{STANDS}.pdf").content)

    assert address == f"https://testserver/certificates/{STANDS}"
    assert rosa.get(address).status_code == 200


def _codes(pdf: bytes) -> list[str]:
    found: list[str] = []
    document = pypdfium2.PdfDocument(pdf)
    for page in document:
        drawn = page.render(scale=200 / 72, grayscale=True).to_numpy().squeeze()
        found += [one.text for one in zxingcpp.read_barcodes(np.ascontiguousarray(drawn))]
    document.close()
    return found


@pytest.mark.parametrize("kind", KINDS)
@pytest.mark.parametrize("number", ["TL-2026-9999", "..%2F..%2Fetc", "<b>", "x" * 300])
def test_file_of_an_unknown_certificate_is_not_found(rosa: Any, number: str, kind: str) -> None:
    answer = rosa.get(f"/api/certificates/{number}.{kind}")

    assert answer.status_code == 404


@pytest.mark.parametrize("kind", ["", *(f".{kind}" for kind in KINDS)])
def test_certificate_that_was_issued_is_edited_by_no_method(rosa: Any, kind: str) -> None:
    """ISO/IEC 17025:2017, 7.8.8: an amendment is a new document."""
    headers = {"X-Form-Token": rosa.token}
    for prefix in ("", "/api"):
        for method in ("POST", "PUT", "PATCH", "DELETE"):
            url = f"{prefix}/certificates/{STANDS}{kind}"
            assert rosa.client.request(method, url, headers=headers).status_code in {403, 405}


def test_replaced_certificate_says_so_on_page_paper_and_in_json(rosa: Any) -> None:
    told = rosa.get(f"/api/certificates/{REPLACED}").json()
    page = " ".join(rosa.get(f"/certificates/{REPLACED}").text.split())
    pdf = rosa.get(f"/certificates/{REPLACED}.pdf")

    assert (told["state"], told["replaced_by"]) == ("replaced", STANDS)
    assert told["state_says"].startswith("Since ")
    assert f'is replaced by <a href="/certificates/{STANDS}">{STANDS}</a>' in page
    assert told["state_says"] in page
    assert pdf.headers["certificate-state"] == f"replaced by {STANDS}"
    for sheet in pypdf.PdfReader(io.BytesIO(pdf.content)).pages:
        assert "REPLACED" in sheet.extract_text()
    assert f"Replaced by certificate {STANDS}. {told['state_says']}" in _text(pdf.content)


def test_pulled_lot_turns_every_file_at_the_next_request(web: Any) -> None:
    jonas, cleo, rosa = (web.client(name) for name in ("jonas", "cleo", "rosa"))
    told = rosa.get(f"/api/certificates/{STANDS}").json()
    lot = told["document"]["lot"]["code"]
    jonas.post(f"/api/lots/{lot}/propose-pull", {"reason": "the flask was not clean"})
    assert cleo.post(f"/api/lots/{lot}/confirm-pull").status_code == 200

    told = rosa.get(f"/api/certificates/{STANDS}").json()
    pdf = rosa.get(f"/certificates/{STANDS}.pdf")

    assert told["state"] == "pulled"
    assert "the flask was not clean" in told["state_says"]
    assert "the flask was not clean" in rosa.get(f"/certificates/{STANDS}").text
    assert "PULLED" in _text(pdf.content)
    assert "the flask was not clean" in _text(pdf.content)
    assert pdf.headers["certificate-state"] == "pulled"
    archive = _zip(rosa.get(f"/lots/{lot}/export.zip"))
    states = [one["state"] for one in json.loads(archive.read("lot.json"))["certificates"]]
    assert states == ["pulled", "replaced"]


def _zip(answer: Any) -> zipfile.ZipFile:
    assert answer.status_code == 200
    assert answer.headers["content-type"] == "application/zip"
    return zipfile.ZipFile(io.BytesIO(answer.content))


def test_lot_leaves_in_one_archive_whose_hashes_and_digits_hold(rosa: Any, tmp_path: Path) -> None:
    document = rosa.get(f"/api/certificates/{STANDS}").json()["document"]
    lot = document["lot"]["code"]
    archive = _zip(rosa.get(f"/lots/{lot}/export.zip"))
    archive.extractall(tmp_path)

    sums = subprocess.run(
        ["sha256sum", "-c", "SHA256SUMS"], cwd=tmp_path, capture_output=True, text=True, check=False
    )
    assert sums.returncode == 0, sums.stdout
    manifest = json.loads((tmp_path / "manifest.json").read_text("utf-8"))
    assert len(manifest["files"]) == len(archive.namelist()) - 2
    assert (tmp_path / f"certificates/{STANDS}.pdf").read_bytes().startswith(b"%PDF-1.7")
    rows = list(csv.reader(io.StringIO((tmp_path / "entries.csv").read_text("utf-8-sig"))))
    assert len(rows) > 50
    trail = (tmp_path / "trail.jsonl").read_text("utf-8").splitlines()
    acts = {json.loads(line)["act"] for line in trail}
    assert {"made up a lot", "countersigned", "issued a certificate"} <= acts
    assert list((tmp_path / "files").iterdir())

    record = tmp_path / f"certificates/{STANDS}.bench-record.json"
    assert record.read_bytes() == rosa.get(f"/certificates/{STANDS}.bench-record.json").content
    done = subprocess.run(
        [sys.executable, "-m", "server", "evaluate", str(record)],
        cwd=ROOT, capture_output=True, text=True, check=False,
        env={**os.environ, "PYTHONPATH": str(ROOT), "PYTHONUTF8": "1"},
    )  # fmt: skip
    assert done.returncode == 0, done.stderr
    again, stated = json.loads(done.stdout)["concentration"], document["result"]["concentration"]
    for key in ("reported", "value", "u", "U", "k", "dof"):
        assert again[key] == stated[key], key


def test_archive_of_a_lot_is_found_by_the_code_of_a_bottle(rosa: Any, shared_web: Any) -> None:
    code = shared_web.demo.bottles_in_force[1]
    by_bottle = rosa.get(f"/api/lots/{code.lower()}/export.zip")

    told = json.loads(_zip(by_bottle).read("lot.json"))
    assert code in [one["code"] for one in told["bottles"]]
    assert rosa.get("/api/lots/00000000/export.zip").status_code == 404


def test_certificate_page_carries_what_the_paper_carries(rosa: Any) -> None:
    """ISO/IEC 17025:2017, 7.8.2.1 a to p, as far as they apply to a laboratory's own lot."""
    page = " ".join(rosa.get(f"/certificates/{STANDS}").text.split()).replace("&#39;", "'")
    for says in (
        "Titrant standardization certificate (in-house)",
        "Tarnbeck Waterworks, Laboratory",
        "performed at its own address",
        f"End of {STANDS}",
        "Prepared for",
        "recipe NaOH 0.1 against KHP, version 1",
        "made by Imke Thorvald",
        "The result relates only to lot",
        "mol/L",
        "struck through",
        "countersigned",
        "No result from outside the laboratory enters",
        "To be reproduced only in full.",
        "Traceability: the value rests on",
        "Decision rule of the findings",
        f'Replaces <a href="/certificates/{REPLACED}">',
    ):
        assert says in page, says
    for never in ("CRM", "certified reference material", "ISO 17025", "ISO 17034", "accredit"):
        assert never not in page, never

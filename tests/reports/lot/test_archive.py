"""A lot's archive, opened and checked with other tools than those that made it."""

import csv
import hashlib
import io
import json
import subprocess
import sys
import zipfile
from dataclasses import replace
from uuid import uuid4

import pypdf
import pytest
from joserfc import jws as jose
from joserfc.jwk import KeySet
from lxml import etree
from sqlalchemy.orm import Session

from server.lab.refusal import NotFound, NotSignedIn
from server.records.tables.stores import Calibration, File
from server.reports.dcc.certificate import About
from server.reports.lot.archive import Made, lot_archive
from server.reports.lot.bundle import OriginalFile
from server.reports.lot.gathering import gather_lot

NUMBERS = ("TL-2026-0004", "TL-2026-0005")
PAPER = b"%PDF-1.4 a calibration certificate, invented"


@pytest.fixture(scope="module")
def bundle(laboratory):
    """The lot of the fixtures' certificates: its code is drawn from the demonstration's seed."""
    code = laboratory.issued("TL-2026-0005").document["lot"]["code"]
    return laboratory.read(gather_lot, code)


@pytest.fixture(scope="module")
def made(keys):
    return Made(keys, About("CH", "0.1.0"))


@pytest.fixture(scope="module")
def archive(bundle, made):
    return zipfile.ZipFile(io.BytesIO(lot_archive(bundle, made)))


def test_archive_holds_every_kind_of_file(archive) -> None:
    kinds = ("pdf", "json", "jws", "dcc.xml", "evaluation.json", "bench-record.json")
    wanted = {f"certificates/{number}.{kind}" for number in NUMBERS for kind in kinds}
    wanted |= {"lot.json", "entries.csv", "trail.jsonl", "keys.json", "READ-ME.txt"}
    names = set(archive.namelist())
    papers = {name for name in names if name.startswith("files/")}
    assert papers
    assert names - papers == wanted | {"manifest.json", "SHA256SUMS"}
    assert archive.testzip() is None


def test_archive_manifest_has_the_hash_of_every_file(archive) -> None:
    manifest = json.loads(archive.read("manifest.json"))
    listed = {one["path"]: one for one in manifest["files"]}
    assert set(archive.namelist()) - set(listed) == {"manifest.json", "SHA256SUMS"}
    for path, one in listed.items():
        content = archive.read(path)
        assert one["sha256"] == hashlib.sha256(content).hexdigest()
        assert one["bytes"] == len(content)


def test_archive_sums_are_checked_by_sha256sum(archive, tmp_path) -> None:
    archive.extractall(tmp_path)
    checked = subprocess.run(
        ["sha256sum", "-c", "--strict", "SHA256SUMS"],
        cwd=tmp_path, capture_output=True, text=True, check=False,
    )  # fmt: skip
    assert checked.returncode == 0, checked.stdout
    assert checked.stdout.count(": OK") == len(archive.namelist()) - 1
    (tmp_path / "trail.jsonl").write_text("{}")
    again = subprocess.run(
        ["sha256sum", "-c", "SHA256SUMS"], cwd=tmp_path, capture_output=True, check=False
    )
    assert again.returncode != 0


@pytest.mark.parametrize("number", NUMBERS)
def test_archive_bench_record_is_evaluated_to_the_same_digits(archive, tmp_path, number) -> None:
    """By the command line, as the guide inside says."""
    path = tmp_path / "record.json"
    path.write_bytes(archive.read(f"certificates/{number}.bench-record.json"))
    run = subprocess.run(
        [sys.executable, "-m", "server", "evaluate", str(path)],
        capture_output=True, text=True, check=True,
    )  # fmt: skip
    result = json.loads(run.stdout)
    stated = json.loads(archive.read(f"certificates/{number}.json"))["result"]
    for key in ("reported", "value", "u", "U", "k"):
        assert result["concentration"][key] == stated["concentration"][key]
    assert result["input_digest"] == stated["input_digest"]


@pytest.mark.parametrize("number", NUMBERS)
def test_archive_certificate_is_one_and_the_same_in_every_form(archive, number) -> None:
    start = f"certificates/{number}"
    document = archive.read(f"{start}.json")
    pdf = pypdf.PdfReader(io.BytesIO(archive.read(f"{start}.pdf")))
    assert pdf.attachments[f"{number}.json"] == [document]
    assert pdf.attachments[f"{number}.jws"] == [archive.read(f"{start}.jws")]
    keys = KeySet.import_key_set(json.loads(archive.read("keys.json")))
    payload = json.loads(jose.deserialize_compact(archive.read(f"{start}.jws"), keys).payload)
    assert payload["document_digest"] == hashlib.sha256(document).hexdigest()
    snapshot = archive.read(f"{start}.evaluation.json")
    assert hashlib.sha256(snapshot).hexdigest() == json.loads(document)["snapshot_digest"]
    xml = etree.fromstring(archive.read(f"{start}.dcc.xml"))
    assert xml.findtext(".//{*}uniqueIdentifier") == number


def test_archive_trail_rows_carry_the_hash_that_the_guide_describes(archive) -> None:
    rows = [json.loads(line) for line in archive.read("trail.jsonl").decode().splitlines()]
    assert [row["seq"] for row in rows] == sorted({row["seq"] for row in rows})
    for row in rows:
        said = {key: row[key] for key in row if key not in {"previous_hash", "hash"}}
        spelled = json.dumps(said, sort_keys=True, separators=(",", ":"), ensure_ascii=False)
        made = hashlib.sha256(f"{row['previous_hash']}\n{spelled}".encode()).hexdigest()
        assert made == row["hash"]
    kinds = {row["kind"] for row in rows}
    assert kinds >= {"lot", "bottle", "sheet", "certificate"}
    lines = json.loads(archive.read("lot.json"))["certificates"]
    hashes = {row["seq"]: row["hash"] for row in rows}
    assert [hashes[one["trail"]["seq"]] for one in lines] == [one["trail"]["hash"] for one in lines]


def test_archive_trail_is_that_of_this_lot_alone(archive, bundle) -> None:
    rows = [json.loads(line) for line in archive.read("trail.jsonl").decode().splitlines()]
    sheets = {one.number for one in bundle.sheets}
    for row in rows:
        if row["kind"] == "sheet":
            assert row["thing_name"] in sheets
        if row["kind"] == "certificate":
            assert row["thing_name"] in NUMBERS


def test_archive_entries_hold_all_that_was_written_and_what_was_struck(archive, bundle) -> None:
    text = archive.read("entries.csv").decode("utf-8-sig")
    rows = list(csv.DictReader(io.StringIO(text, newline="")))
    assert len(rows) == sum(len(one.entries) for one in bundle.sheets)
    (struck,) = [row for row in rows if row["text"] == "20.26" and row["struck by"]]
    (by,) = [
        row
        for row in rows
        if row["sheet"] == struck["sheet"] and row["position"] == struck["struck by"]
    ]
    assert (by["text"], by["strikes"]) == ("19.26", struck["position"])
    assert by["reason"] == "misread by a whole millilitre"


def test_archive_names_the_state_of_each_certificate(archive) -> None:
    told = json.loads(archive.read("lot.json"))
    assert [(one["number"], one["state"]) for one in told["certificates"]] == [
        ("TL-2026-0005", "standing"), ("TL-2026-0004", "replaced"),
    ]  # fmt: skip
    assert all(one["document_holds"] for one in told["certificates"])
    assert len(told["bottles"]) >= 1


def test_archive_is_the_same_bytes_each_time(bundle, made) -> None:
    assert lot_archive(bundle, made) == lot_archive(bundle, made)


def test_archive_without_a_country_has_no_dcc_and_says_so(bundle, keys) -> None:
    bare = zipfile.ZipFile(io.BytesIO(lot_archive(bundle, Made(keys, None))))
    assert not [name for name in bare.namelist() if name.endswith(".dcc.xml")]
    assert b"no DCC" in bare.read("READ-ME.txt")


def test_archive_of_a_changed_certificate_marks_it_and_signs_it_not(bundle, made) -> None:
    newest = replace(bundle.certificates[0], holds=False)
    changed = replace(bundle, certificates=[newest, *bundle.certificates[1:]])
    opened = zipfile.ZipFile(io.BytesIO(lot_archive(changed, made)))
    names = opened.namelist()
    assert f"certificates/{newest.number}.jws" not in names
    assert f"certificates/{newest.number}.dcc.xml" not in names
    pdf = pypdf.PdfReader(io.BytesIO(opened.read(f"certificates/{newest.number}.pdf")))
    assert "ALTERED" in pdf.pages[0].extract_text()
    assert not json.loads(opened.read("lot.json"))["certificates"][0]["document_holds"]


@pytest.mark.parametrize(
    "name",
    ["../../etc/passwd", "/abs.pdf", "..", "a\\..\\b.pdf", "C:\\x", "Ω 100 %.pdf", "", "n" * 300],
)
def test_archive_file_names_lead_nowhere_else(bundle, made, tmp_path, name) -> None:
    file = OriginalFile(name, "application/pdf", "ab" * 32, PAPER, ("Balance B-2",))
    opened = zipfile.ZipFile(io.BytesIO(lot_archive(replace(bundle, files=[file]), made)))
    (path,) = [one for one in opened.namelist() if one.startswith("files/")]
    inner = path.removeprefix("files/")
    assert "/" not in inner
    assert "\\" not in inner
    assert not inner.startswith(".")
    assert len(inner) < 120
    told = json.loads(opened.read("lot.json"))["files"][0]
    assert (told["path"], told["name"]) == (path, name)


def test_archive_carries_the_original_file_of_a_calibration(laboratory, bundle, made) -> None:
    """A file is put to a calibration, out of ink, in a transaction that is never committed."""
    root = bundle.certificates[0].document["traceability"][1]
    sha = hashlib.sha256(PAPER).hexdigest()
    reader = laboratory.reader
    engine = laboratory.transactions.database.engine
    with engine.connect() as connection, Session(connection) as session:
        triggers = "SELECT name FROM sqlite_master WHERE type = 'trigger'"
        for name in connection.exec_driver_sql(triggers).scalars().all():
            connection.exec_driver_sql(f'DROP TRIGGER "{name}"')
        file = File(
            id=str(uuid4()),
            name="NM-B-20417.pdf",
            media_type="application/pdf",
            sha256=sha,
            content=PAPER,
            made_by=reader.person_id,
            made_at=bundle.as_of,
        )
        session.add(file)
        session.flush()
        session.get(Calibration, root["calibration_id"]).file_id = file.id
        session.flush()
        found = gather_lot(session, bundle.code, actor=reader, now=bundle.as_of)
    before = {one.sha256 for one in laboratory.read(gather_lot, bundle.code).files}
    opened = zipfile.ZipFile(io.BytesIO(lot_archive(found, made)))
    added = next(one for one in found.files if one.sha256 not in before)
    (path,) = [one for one in opened.namelist() if one.endswith("NM-B-20417.pdf")]
    assert opened.read(path) == PAPER
    assert found.paper_hashes[root["calibration_id"]] == sha
    assert sha.encode() in opened.read("certificates/TL-2026-0005.dcc.xml")
    assert added.papers == (f"{root['name']}, {root['certificate_number']}",)


def test_archive_of_a_lot_by_probe_holds_the_originals_of_its_curves(laboratory, made) -> None:
    document = laboratory.issued("TL-2026-0006").document
    found = laboratory.read(gather_lot, document["lot"]["code"])
    opened = zipfile.ZipFile(io.BytesIO(lot_archive(found, made)))
    sheet, files = document["sheet"]["number"], json.loads(opened.read("lot.json"))["files"]
    named = {one: line for line in files for one in line["papers"]}
    for replicate in range(1, 5):
        line = named[f"curve of sheet {sheet}, replicate {replicate}"]
        original = opened.read(line["path"])
        assert line["name"] == f"run{replicate}.csv"
        assert hashlib.sha256(original).hexdigest() == line["sha256"]
        assert b"," in original or b";" in original
    assert document["end_point"]["methods"] == [
        {"method": "model fit", "replicates": ["1", "2", "3", "4"]}
    ]
    text = pypdf.PdfReader(io.BytesIO(opened.read("certificates/TL-2026-0006.pdf"))).pages[0]
    assert "potentiometric, model fit" in " ".join(text.extract_text().split())
    xml = opened.read("certificates/TL-2026-0006.dcc.xml").decode()
    assert "potentiometric, model fit" in xml


def test_gathering_by_a_bottles_code_finds_its_lot(laboratory, bundle) -> None:
    by_bottle = laboratory.read(gather_lot, bundle.bottles[0]["code"].lower())
    assert by_bottle.code == bundle.code


def test_gathering_an_unknown_lot_or_as_a_visitor_is_refused(laboratory, bundle) -> None:
    with pytest.raises(NotFound):
        laboratory.read(gather_lot, "ABCDEFGH")
    with pytest.raises(NotFound):
        laboratory.read(gather_lot, "00000000")
    with pytest.raises(NotSignedIn):
        laboratory.transactions.read(
            lambda session: gather_lot(session, bundle.code, actor=None, now=bundle.as_of)
        )

"""A calibration's file of any format: read for a person to confirm, or refused in words."""

import io
import zipfile
from pathlib import Path

import pytest

from server.intake.calibration_file import Asked, read_calibration_file
from server.lab.papers import read_calibration
from server.lab.refusal import Unacceptable

#: Own content in the published structure of DCC 3.3.0 (https://ptb.de/dcc/v3.3.0/dcc.xsd).
DCC = (Path(__file__).parents[1] / "reference" / "dcc" / "balance.xml").read_bytes()
CSV = b"load, g;error, mg;U, mg;k\n50,0;0,20;0,10;2\n100,0;-0,40;0,16;2\n"
LINEAR = {"linearity": {"unit": "g", "half_width": "0.0001", "shape": "rectangular"}}


def test_certificate_proposes_papers_and_a_table_with_the_right_sign():
    found = read_calibration_file(DCC, "balance")
    assert found.source == "Digital Calibration Certificate 3.3.0"
    assert found.serials == ("00417",)
    assert dict(found.papers) == {
        "certificate_number": "WL-2026-0815", "issuer": "Weights & Levels",
        "done_on": "2026-03-13", "due_on": "2027-03-13",
        "due_basis": "recalibration day on the certificate",
    }  # fmt: skip
    # the balance reads 0.86 mg too much at 200 g: so much is taken away
    assert found.fragment["error_table"][-1] == ["200.0008", "-0.00086"]
    assert found.rows[-1][:3] == ("200.0008", "0.00086", "-0.00086")
    assert read_calibration("balance", {**LINEAR, **found.fragment})


def test_certificate_drops_nothing_that_it_does_not_know():
    found = read_calibration_file(DCC, "balance")
    assert found.unknown_ref_types == ("house_note", "house_result", "house_mood")
    assert "Sealed." in {one.text for one in found.left_over}
    (only,) = found.lists
    assert only.heads[-1] == "Mood [house_mood]"
    assert [row[-1] for row in only.rows] == [r"1 \one", r"2 \one", r"3 \one"]
    assert only.rows[0][3] == r"0.18 ± 0.10 (k = 2) \milli\gram"


def test_certificate_for_another_kind_is_shown_to_be_typed():
    found = read_calibration_file(DCC, "thermometer")
    assert found.fragment == {}
    assert found.chosen is None
    assert "type what it states" in found.says[0]
    assert found.lists


def test_certificate_list_that_does_not_fit_can_be_asked_for_and_says_why():
    odd = (
        b'<dcc:list><dcc:quantity refType="basic_measuredValue"><si:realListXMLList>'
        b"<si:valueXMLList>1 2</si:valueXMLList><si:unitXMLList>\\degreecelsius</si:unitXMLList>"
        b"</si:realListXMLList></dcc:quantity></dcc:list></dcc:data>"
    )
    head, data_end, tail = DCC.rpartition(b"</dcc:data>")
    assert data_end
    data = head + odd + tail
    assert read_calibration_file(data, "balance").chosen == 0
    with pytest.raises(Unacceptable):
        read_calibration_file(data, "balance", Asked(table="1"))
    for table in ("7", "x", "-1", "٣"):
        with pytest.raises(Unacceptable) as refused:
            read_calibration_file(data, "balance", Asked(table=table))
        assert refused.value.field == "table"


def test_table_as_text_is_read_as_its_header_or_a_person_says():
    found = read_calibration_file(CSV, "balance")
    assert found.source == "table as text (CSV)"
    assert [row[1] for row in found.rows] == ["-0.00020", "0.00040"]
    assert found.fragment["error_u"] == {"unit": "g", "u": "0.00008"}
    told = read_calibration_file(CSV, "balance", Asked(means="correction"))
    assert [row[1] for row in told.rows] == ["0.00020", "-0.00040"]
    with pytest.raises(Unacceptable) as refused:
        read_calibration_file(CSV, "balance", Asked(means="guess"))
    assert refused.value.field == "means"


@pytest.mark.parametrize("kind", ["pipette", "flask", "probe", "room monitor"])
def test_table_for_a_kind_without_one_is_refused_in_words(kind):
    with pytest.raises(Unacceptable, match="type what the certificate"):
        read_calibration_file(CSV, kind)


def bomb():
    lines = "<!ENTITY e0 'lol'>"
    lines += "".join(f"<!ENTITY e{i} '{f'&e{i - 1};' * 10}'>" for i in range(1, 10))
    return f'<?xml version="1.0"?><!DOCTYPE x [{lines}]><x>&e9;</x>'.encode()


def zip_of(name, data):
    packed = io.BytesIO()
    with zipfile.ZipFile(packed, "w", zipfile.ZIP_DEFLATED) as archive:
        archive.writestr(name, data)
    return packed.getvalue()


@pytest.mark.parametrize(
    ("data", "says"),
    [
        (bomb(), "DOCTYPE"),
        (b'<?xml version="1.0"?><!DOCTYPE x SYSTEM "file:///etc/passwd"><x/>', "DOCTYPE"),
        (b'<?xml version="1.0"?><x xmlns="https://ptb.de/dcc"/>', "no Digital Calibration"),
        (b"<x>" * 500, "deep|well-formed"),
        (b"\xff\xfe<x/>", "separator"),
        (b"load, g;error, g\n50;=1+1\n100;0", "formula"),
        (zip_of("xl/workbook.xml", b"0" * 30_000_000), "unpack"),
        (b"", "holds no table"),
    ],
)
def test_hostile_or_broken_file_is_refused_in_words(data, says):
    with pytest.raises(Unacceptable, match=says):
        read_calibration_file(data, "balance")

"""Digital Calibration Certificates: own content in the published structure, and hostile ones.

Structure: DCC schema 3.3.0 (https://ptb.de/dcc/v3.3.0/dcc.xsd) and D-SI 2.2.1 (https://ptb.de/si).
"""

import html
import re

import pytest

from server.evaluation.entrance import evaluate
from server.intake.dcc import read_dcc
from server.intake.dcc_errors import TEMPERATURE, error_proposal, error_tables
from server.intake.dcc_units import unit_of
from server.intake.dcc_volumes import burette_proposal, volume_proposal, volume_tables
from server.lab.papers import read_calibration
from server.lab.refusal import Unacceptable

UNCERTAIN = """
<si:measurementUncertaintyUnivariateXMLList><si:expandedMUXMLList>
 <si:valueExpandedMUXMLList>0.10 0.16 0.30</si:valueExpandedMUXMLList>
 <si:coverageFactorXMLList>2</si:coverageFactorXMLList>
 <si:coverageProbabilityXMLList>0.95</si:coverageProbabilityXMLList>
 <si:distributionXMLList>normal</si:distributionXMLList>
</si:expandedMUXMLList></si:measurementUncertaintyUnivariateXMLList>"""
OLD = """
<si:expandedUncXMLList><si:uncertaintyXMLList>0.10 0.16 0.30</si:uncertaintyXMLList>
<si:coverageFactorXMLList>2.00 2.00 2.00</si:coverageFactorXMLList>
<si:coverageProbabilityXMLList>0.95</si:coverageProbabilityXMLList></si:expandedUncXMLList>"""

STANDARD = """
<si:measurementUncertaintyUnivariateXMLList><si:standardMUXMLList>
<si:valueStandardMUXMLList>0.05 0.08 0.15</si:valueStandardMUXMLList>
</si:standardMUXMLList></si:measurementUncertaintyUnivariateXMLList>"""


def column(ref_type, values, unit, uncertainty="", name="column"):
    return f"""
<dcc:quantity refType="{ref_type}"><dcc:name><dcc:content lang="en">{name}</dcc:content></dcc:name>
<si:realListXMLList><si:valueXMLList>{values}</si:valueXMLList>
<si:unitXMLList>{unit}</si:unitXMLList>{uncertainty}</si:realListXMLList></dcc:quantity>"""


COLUMNS = (
    column("basic_nominalValue", "50 100 200", r"\gram", name="Nominal")
    + column("basic_referenceValue", "50.00002 100.00003 199.99994", r"\gram", name="Reference")
    + column("basic_measuredValue", "50.0002 100.0004 200.0008", r"\gram", name="Indication")
    + column("basic_measurementError", "0.18 0.37 0.86", r"\milli\gram", UNCERTAIN, name="Error")
    + column("house_mood", "1 2 3", r"\one", name="Mood")
)


def certificate(columns=COLUMNS, *, version="3.3.0", extra="", before=""):
    return f"""<?xml version="1.0" encoding="UTF-8"?>{before}
<dcc:digitalCalibrationCertificate xmlns:dcc="https://ptb.de/dcc" xmlns:si="https://ptb.de/si"
 schemaVersion="{version}">
<dcc:administrativeData>
 <dcc:dccSoftware><dcc:software><dcc:name><dcc:content>Quill</dcc:content></dcc:name>
  <dcc:release>1.4</dcc:release></dcc:software></dcc:dccSoftware>
 <dcc:coreData><dcc:countryCodeISO3166_1>DE</dcc:countryCodeISO3166_1>
  <dcc:usedLangCodeISO639_1>en</dcc:usedLangCodeISO639_1>
  <dcc:mandatoryLangCodeISO639_1>en</dcc:mandatoryLangCodeISO639_1>
  <dcc:uniqueIdentifier>WL-2026-0815</dcc:uniqueIdentifier>
  <dcc:receiptDate>2026-03-10</dcc:receiptDate>
  <dcc:beginPerformanceDate>2026-03-12</dcc:beginPerformanceDate>
  <dcc:endPerformanceDate>2026-03-13</dcc:endPerformanceDate>
  <dcc:performanceLocation>customer</dcc:performanceLocation></dcc:coreData>
 <dcc:items><dcc:item><dcc:name><dcc:content lang="en">Analytical balance</dcc:content>
   <dcc:content lang="de">Analysenwaage</dcc:content></dcc:name>
  <dcc:manufacturer><dcc:name><dcc:content>Federkiel</dcc:content></dcc:name></dcc:manufacturer>
  <dcc:model>FK 220</dcc:model>
  <dcc:identifications>
   <dcc:identification refType="basic_serialNumber"><dcc:issuer>manufacturer</dcc:issuer>
    <dcc:value>00417</dcc:value><dcc:name><dcc:content>Serial</dcc:content></dcc:name>
   </dcc:identification>
   <dcc:identification><dcc:issuer>customer</dcc:issuer><dcc:value>B-2</dcc:value>
   </dcc:identification></dcc:identifications></dcc:item></dcc:items>
 <dcc:calibrationLaboratory><dcc:calibrationLaboratoryCode>L-1</dcc:calibrationLaboratoryCode>
  <dcc:contact><dcc:name><dcc:content>Weights &amp; Levels</dcc:content></dcc:name>
  <dcc:location><dcc:city>Hinterdeich</dcc:city></dcc:location></dcc:contact>
 </dcc:calibrationLaboratory>
 <dcc:respPersons><dcc:respPerson><dcc:person><dcc:name><dcc:content>Runa Eckdal</dcc:content>
  </dcc:name></dcc:person><dcc:mainSigner>true</dcc:mainSigner></dcc:respPerson></dcc:respPersons>
 <dcc:customer><dcc:name><dcc:content>Waterworks</dcc:content></dcc:name></dcc:customer>
 <dcc:statements><dcc:statement refType="basic_recalibration"><dcc:date>2027-03-13</dcc:date>
  </dcc:statement><dcc:statement refType="house_note"><dcc:declaration>
  <dcc:content>Sealed.</dcc:content></dcc:declaration></dcc:statement></dcc:statements>
</dcc:administrativeData>
<dcc:measurementResults><dcc:measurementResult>
 <dcc:name><dcc:content>Weighing</dcc:content></dcc:name>
 <dcc:influenceConditions><dcc:influenceCondition><dcc:data><dcc:quantity><si:real>
  <si:value>21.30</si:value><si:unit>\\degreecelsius</si:unit></si:real></dcc:quantity></dcc:data>
  </dcc:influenceCondition></dcc:influenceConditions>
 <dcc:results><dcc:result refType="house_result">
 <dcc:name><dcc:content>Errors of indication</dcc:content></dcc:name>
 <dcc:data><dcc:list>{columns}</dcc:list>{extra}</dcc:data></dcc:result></dcc:results>
</dcc:measurementResult></dcc:measurementResults>
</dcc:digitalCalibrationCertificate>""".encode()


def test_certificate_tells_who_what_and_when():
    found = read_dcc(certificate())
    assert found.schema_version == "3.3.0"
    assert found.unique_identifier == "WL-2026-0815"
    assert (found.received_on, found.begun_on, found.ended_on) == (
        "2026-03-10", "2026-03-12", "2026-03-13",
    )  # fmt: skip
    assert found.laboratory == "Weights & Levels"
    assert found.laboratory_code == "L-1"
    assert found.customer == "Waterworks"
    assert found.responsible == ("Runa Eckdal",)
    assert found.software == ("Quill 1.4",)
    assert found.recalibration == "2027-03-13"
    item = found.items[0]
    assert item.name == "Analytical balance / Analysenwaage"
    assert (item.maker, item.model, item.serial) == ("Federkiel", "FK 220", "00417")
    assert [one.value for one in item.identifications] == ["00417", "B-2"]


def test_numbers_stay_the_text_that_they_were():
    table = read_dcc(certificate()).tables[0]
    assert table.name == "Weighing · Errors of indication"
    nominal, reference, _, error, _ = table.columns
    assert [one.value for one in reference.amounts] == ["50.00002", "100.00003", "199.99994"]
    assert error.amounts[0].U == "0.10"
    assert error.amounts[2].k == "2"
    assert error.amounts[1].probability == "0.95"
    assert error.amounts[1].distribution == "normal"
    assert nominal.amounts[0].unit == r"\gram"
    assert table.even


def test_what_nobody_knows_is_shown_and_nothing_is_dropped():
    data = certificate()
    found = read_dcc(data)
    assert found.unknown_ref_types == ("house_note", "house_result", "house_mood")
    left = {one.path: one.text for one in found.left_over}
    assert left["administrativeData/statements/statement/declaration/content"] == "Sealed."
    assert left["administrativeData/coreData/performanceLocation"] == "customer"
    mood = next(one for one in found.tables[0].columns if "house_mood" in one.ref_types)
    assert [one.value for one in mood.amounts] == ["1", "2", "3"]
    # every text of the file stands somewhere in what was returned
    whole = repr(found)
    words = {word for text in re.findall(r">([^<>]+)<", data.decode()) for word in text.split()}
    assert len(words) > 60
    for word in words:
        assert repr(html.unescape(word))[1:-1] in whole, word


def test_balance_takes_the_opposite_of_the_error():
    found = read_dcc(certificate())
    assert error_tables(found.tables) == (0,)
    proposal = error_proposal(found.tables[0])
    assert proposal.fragment["error_table"] == [
        ["0", "0"], ["50.0002", "-0.00018"], ["100.0004", "-0.00037"], ["200.0008", "-0.00086"],
    ]  # fmt: skip
    assert proposal.fragment["error_u"] == {"unit": "g", "u": "0.00015"}
    assert "A reading of 200.0008 g is then taken as 199.99994 g." in proposal.says


def test_imported_balance_corrects_a_mass():
    proposal = error_proposal(read_dcc(certificate()).tables[0])
    linearity = {"unit": "g", "half_width": "0.0001", "shape": "rectangular"}
    calibration = read_calibration("balance", {"linearity": linearity, **proposal.fragment})
    record = {
        "format": "bench-record/1",
        "titrant": {"substance": "NaOH", "nominal": {"value": "0.1", "unit": "mol/L"}},
        "route": "weighed",
        "standard": {"substance": "KHP", "mass_fraction": {"value": "1.0", "u": "0.0003"}},
        "balance": {**calibration, "buoyancy": False},
        "burette": {"delivery": {"unit": "mL", "u": "0.01"}},
        "repeatability": {"relative_u": "0.0005"},
        "replicates": [
            {"container_and_standard": "100.0004", "container_less_standard": "50.0002",
             "delivered": "18.64"}
        ],
    }  # fmt: skip
    mass = evaluate(record)["replicates"][0]["mass_g"]
    assert mass == pytest.approx(100.00003 - 50.00002, abs=1e-9)


@pytest.mark.parametrize(
    "uncertainty",
    [
        OLD,
        UNCERTAIN,
        STANDARD,
    ],
)
def test_uncertainty_is_read_in_its_old_and_new_spelling(uncertainty):
    columns = column("basic_nominalValue", "50 100 200", r"\gram") + column(
        "basic_measurementError_error", "0.0 -0.10 0.20", r"\milli\gram", uncertainty
    )
    proposal = error_proposal(read_dcc(certificate(columns)).tables[0])
    assert [row[3] for row in proposal.rows] == ["0.00005", "0.00008", "0.00015"]
    # the zeros that were printed stay: 0.0 mg is 0.0000 g, −0.10 mg is −0.00010 g
    assert [row[2] for row in proposal.rows] == ["0.0000", "0.00010", "-0.00020"]


def test_single_values_and_hybrids_are_read():
    hybrid = r"""
<dcc:quantity refType="basic_measuredValue"><si:hybrid>
<si:realListXMLList><si:valueXMLList>490.3 980.6</si:valueXMLList>
<si:unitXMLList>\milli\newton</si:unitXMLList></si:realListXMLList>
<si:realListXMLList><si:valueXMLList>0.0500000 0.1000001</si:valueXMLList>
<si:unitXMLList>\kilogram</si:unitXMLList></si:realListXMLList></si:hybrid></dcc:quantity>"""
    reals = "".join(
        f"<si:real><si:value>{value}</si:value><si:unit>\\gram</si:unit>"
        "<si:expandedUnc><si:uncertainty>0.0004</si:uncertainty>"
        "<si:coverageFactor>2</si:coverageFactor>"
        "<si:coverageProbability>0.95</si:coverageProbability></si:expandedUnc></si:real>"
        for value in ("0.0002", "0.0001")
    )
    error = (
        f'<dcc:quantity refType="basic_measurementError"><si:list>{reals}</si:list></dcc:quantity>'
    )
    single = r"""<dcc:quantity refType="basic_repeatability"><si:real><si:value>0.080</si:value>
<si:unit>\milli\gram</si:unit></si:real></dcc:quantity>"""
    found = read_dcc(certificate(hybrid + error, extra=single))
    assert [len(one.columns) for one in found.tables] == [1, 2]
    assert found.tables[0].columns[0].amounts[0].value == "0.080"
    listed = found.tables[1]
    assert listed.columns[0].others[0][1].value == "0.1000001"
    assert error_tables(found.tables) == (1,)
    assert error_proposal(listed).rows == (
        ("50.0000", "0.0002", "-0.0002", "0.0002"), ("100.0001", "0.0001", "-0.0001", "0.0002"),
    )  # fmt: skip


def test_words_instead_of_numbers_are_kept():
    words = """<dcc:quantity refType="basic_measuredValue"><dcc:noQuantity>
<dcc:content>not read</dcc:content></dcc:noQuantity></dcc:quantity>"""
    found = read_dcc(certificate(COLUMNS + words))
    assert found.tables[0].columns[-1].text == "not read"


@pytest.mark.parametrize(
    ("change", "says"),
    [
        ((b'schemaVersion="3.3.0"', b'schemaVersion="2.4.0"'), "version 3 is read"),
        ((b'https://ptb.de/dcc"', b'https://ptb.de/other"'), "no Digital Calibration"),
        ((b"<dcc:uniqueIdentifier>WL-2026-0815</dcc:uniqueIdentifier>", b""), "uniqueIdentifier"),
        ((b"2026-03-12", b"in March"), "is no day"),
        ((b"0.18 0.37 0.86", b"0.18 0,37 0.86"), "not a decimal number"),
        ((b"0.18 0.37 0.86", b""), "0 values"),
        ((b"0.10 0.16 0.30", b"0.10 0.16"), "2 texts of U for 3 values"),
        ((b"</dcc:items>", b""), "not well-formed XML"),
    ],
)
def test_certificate_that_cannot_be_read_is_refused_in_words(change, says):
    data = certificate()
    assert change[0] in data
    with pytest.raises(Unacceptable, match=says):
        read_dcc(data.replace(*change))


@pytest.mark.parametrize(
    ("change", "says"),
    [
        (("0.18 0.37 0.86", "-0.18 -0.37 -0.86"), r"Row 1: indication less reference is 0.00018 g"),
        (("0.18 0.37 0.86", "0.18 0.37"), "texts of U"),
        (("50.0002 100.0004 200.0008", "50.0002 100.0004"), "different lengths"),
        (("50.0002 100.0004 200.0008", "100.0004 50.0002 200.0008"), "Row 1|must rise"),
        ((r"\milli\gram", r"\milli\newton"), "not in a unit of mass"),
        (("<si:coverageFactorXMLList>2</si:coverageFactorXMLList>", ""), "without its coverage"),
        (("basic_measuredValue", "x_a"), None),
        (("basic_measurementError", "x_b"), None),
    ],
)
def test_list_that_makes_no_error_table_is_refused(change, says):
    text = certificate().decode()
    assert change[0] in text
    data = text.replace(*change).encode()
    if says is None:  # two of the three columns are enough
        assert len(error_proposal(read_dcc(data).tables[0]).rows) == 3
        return
    with pytest.raises(Unacceptable, match=says):
        error_proposal(read_dcc(data).tables[0])


def test_list_without_loads_or_errors_is_refused():
    only = column("basic_measurementError", "0.1 0.2", r"\milli\gram")
    with pytest.raises(Unacceptable, match="without the loads"):
        error_proposal(read_dcc(certificate(only)).tables[0])
    loads = column("basic_nominalValue", "1 2", r"\gram")
    with pytest.raises(Unacceptable, match="neither errors nor"):
        error_proposal(read_dcc(certificate(loads)).tables[0])


def test_thermometer_takes_the_opposite_of_the_error_and_no_zero_is_made_up():
    columns = column("basic_referenceValue", "9.97 20.03 30.10", r"\degreecelsius") + column(
        "basic_measuredValue", "10.0 20.1 30.2", r"\degreecelsius", STANDARD
    )
    (table,) = read_dcc(certificate(columns)).tables
    assert error_tables((table,)) == ()
    assert error_tables((table,), TEMPERATURE) == (0,)
    proposal = error_proposal(table, TEMPERATURE)
    assert proposal.fragment == {
        "error_table": [["10.0", "-0.03"], ["20.1", "-0.07"], ["30.2", "-0.10"]],
        "reading": {"unit": "Cel", "u": "0.15"},
    }
    assert read_calibration("thermometer", proposal.fragment) == proposal.fragment


def test_burette_adds_what_was_delivered_beyond_the_reading():
    columns = column("basic_nominalValue", "5 10 20", r"\milli\litre") + column(
        "basic_measuredValue", "5003.1 10004.0 19990.0", r"\micro\litre",
        UNCERTAIN.replace("0.10 0.16 0.30", "3.0 4.0 6.0"),
    )  # fmt: skip
    (table,) = read_dcc(certificate(columns)).tables
    assert volume_tables((table,), several=True) == (0,)
    assert volume_tables((table,), several=False) == ()
    found = burette_proposal(table)
    assert found.fragment == {
        "error_table": [["0", "0"], ["5", "0.0031"], ["10", "0.0040"], ["20", "-0.0100"]],
        "delivery": {"unit": "mL", "u": "0.003"},
    }
    assert "A reading of 20 mL is then taken as 19.9900 mL." in found.says
    with pytest.raises(Unacceptable, match="beside the readings"):
        burette_proposal(read_dcc(certificate()).tables[0])


@pytest.mark.parametrize(
    ("uncertainty", "stated"),
    [
        (UNCERTAIN.replace("0.10 0.16 0.30", "0.0040"), {"U": "0.0040", "k": "2"}),
        (STANDARD.replace("0.05 0.08 0.15", "0.0020"), {"u": "0.002"}),
        ("", {}),
    ],
)
@pytest.mark.parametrize(("kind", "key"), [("pipette", "delivery"), ("flask", "volume")])
def test_pipette_and_flask_take_their_one_volume(uncertainty, stated, kind, key):
    columns = column("basic_nominalValue", "10", r"\milli\litre") + column(
        "basic_measuredValue", "10.0030", r"\milli\litre", uncertainty
    )
    (table,) = read_dcc(certificate(columns)).tables
    assert volume_tables((table,), several=False) == (0,)
    found = volume_proposal(table, key)
    assert found.fragment == {key: {"value": "10.0030", "unit": "mL", **stated}}
    assert any("state it yourself" in one for one in found.says) is not bool(stated)
    if stated:
        assert read_calibration(kind, found.fragment)[key]["value"] == "10.0030"


def entity_bomb():
    """Return the classic: ten entities, each ten of the one before."""
    lines = ['<!ENTITY a "ha">']
    lines += [f'<!ENTITY {chr(98 + i)} "{f"&{chr(97 + i)};" * 10}">' for i in range(12)]
    return certificate(before=f"<!DOCTYPE x [{''.join(lines)}]>", extra="&m;")


def hostile():
    outside = '<!DOCTYPE x [<!ENTITY e SYSTEM "file:///etc/hostname">]>'
    parameter = '<!DOCTYPE x [<!ENTITY % p SYSTEM "http://127.0.0.1:9/x.dtd"> %p;]>'
    deep = certificate(extra="<a>" * 200_000)
    return {
        "entity bomb": entity_bomb(),
        "external entity": certificate(before=outside, extra="&e;"),
        "external parameter entity": certificate(before=parameter),
        "lower case": certificate(before="<!doctype x>"),
        "UTF-16": entity_bomb().decode().replace("UTF-8", "UTF-16").encode("utf-16"),
        "UTF-7 said": certificate(before="<!DOCTYPE x []>").replace(b"UTF-8", b"UTF-7"),
        "3 MB": certificate(extra=f"<!-- {'x' * 3_000_000} -->"),
        "many elements": certificate(extra="<a/>" * 400_000),
        "deep": deep,
        "many attributes": certificate(
            extra="<a " + " ".join(f'b{i}="1"' for i in range(150_000)) + "/>"
        ),
        "long list": certificate(column("basic_nominalValue", "1 " * 900_000, r"\gram")),
        "undeclared entity": certificate(extra="&m;"),
    }


@pytest.mark.parametrize("name", list(hostile()))
def test_hostile_certificate_is_refused_in_little_time_and_memory(name, tmp_path, refused_by):
    path = tmp_path / "hostile.xml"
    path.write_bytes(hostile()[name])
    seconds, megabytes, says = refused_by(path, "server.intake.dcc", "read_dcc")
    print(name, round(seconds, 3), "s", round(megabytes), "MB", says)
    assert says
    assert seconds < 2.0
    assert megabytes < 100.0


@pytest.mark.parametrize(
    ("text", "unit"),
    [
        (r"\milli\gram", ("g", -3)), (r"\kilogram", ("g", 3)), (r"\micro\litre", ("mL", -3)),
        (r"\degreecelsius", ("Cel", 0)), (r" \milli \gram", ("g", -3)), (r"\kelvin", None),
        (r"\newton", None), ("g", None),
    ],
)  # fmt: skip
def test_units_of_d_si_are_told(text, unit):
    # D-SI 2.2.1: units as the certificates of DCC 3 write them
    assert unit_of(text) == unit

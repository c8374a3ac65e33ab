"""The DCC: its structure by the published schema's order, its numbers, its units.

The schema (dcc.xsd 3.3.0, Physikalisch-Technische Bundesanstalt, https://ptb.de/dcc/v3.3.0) is not
in any package, and the tests ask no network: ``CHILDREN`` repeats which children it allows, in
which order, for the elements that are used here, with those that must be there marked.
"""

import base64
import json
import re
import warnings
from copy import deepcopy
from dataclasses import replace

import pytest
from lxml import etree

from server.lab.canonical import canonical, digest
from server.lab.refusal import Unacceptable
from server.reports.certificate.pdf import certificate_pdf
from server.reports.dcc.certificate import About, dcc_xml
from server.reports.dcc.elements import UNITS
from server.sheets.parts.outcome import printed

ABOUT = About("CH", "0.1.0")
NAMES = {"dcc": "https://ptb.de/dcc", "si": "https://ptb.de/si"}

#: Element (by the path's end): its children in order, "!" for those that must be there.
CHILDREN = {
    "digitalCalibrationCertificate": "administrativeData! measurementResults! comment document",
    "administrativeData": "dccSoftware! refTypeDefinitions coreData! items! "
    "calibrationLaboratory! respPersons! customer! statements",
    "dccSoftware": "software!",
    "usedSoftware": "software!",
    "software": "name! release! type description",
    "coreData": "countryCodeISO3166_1! usedLangCodeISO639_1! mandatoryLangCodeISO639_1! "
    "uniqueIdentifier! identifications receiptDate beginPerformanceDate! endPerformanceDate! "
    "performanceLocation! issueDate reportAmendedSubstituted previousReport",
    "reportAmendedSubstituted": "typeOfChange! replacedUniqueIdentifier!",
    "previousReport": "referral! referralID! procedure! value! description inValidityRange "
    "traceable linkedReport",
    "measuringEquipment/certificate": "referral! referralID! procedure! value! description "
    "inValidityRange traceable linkedReport",
    "items": "name equipmentClass description owner manufacturer identifications item!",
    "item": "name! equipmentClass description owner installedSoftwares manufacturer model "
    "identifications! itemQuantities subItems",
    "identifications": "identification!",
    "identification": "issuer! value! name",
    "itemQuantities": "itemQuantity!",
    "itemQuantity": "name description noQuantity real",
    "calibrationLaboratory": "calibrationLaboratoryCode contact! cryptElectronicSeal",
    "contact": "name! eMail phone fax link location! descriptionData",
    "customer": "name! eMail phone fax link location! descriptionData",
    "respPersons": "respPerson!",
    "respPerson": "person! description role mainSigner cryptElectronicSeal",
    "person": "name! eMail phone fax link location descriptionData",
    "statements": "statement!",
    "statement": "name description countryCodeISO3166_1 convention traceable norm reference link "
    "declaration valid date period respAuthority conformity data",
    "metaData": "name description countryCodeISO3166_1 convention traceable norm reference link "
    "declaration valid date period respAuthority conformity data",
    "measurementResults": "usedMethods usedSoftware measuringEquipments influenceConditions "
    "measurementMetaData measurementResult!",
    "measurementResult": "name! description usedMethods usedSoftware measuringEquipments "
    "influenceConditions results! measurementMetaData",
    "usedMethods": "usedMethod!",
    "usedMethod": "name! description norm reference link usedMethodQuantities",
    "measuringEquipments": "name equipmentClass description owner identifications "
    "measuringEquipment!",
    "measuringEquipment": "name! equipmentClass description certificate manufacturer model "
    "identifications measuringEquipmentQuantities installedSoftware",
    "influenceConditions": "influenceCondition!",
    "influenceCondition": "name! description status certificate data!",
    "results": "result!",
    "result": "name! description data!",
    "quantity": "name description noQuantity real realListXMLList relativeUncertainty usedMethods",
    "measurementMetaData": "metaData!",
    "document": "name description fileName! mimeType! dataBase64!",
    "real": "label quantityType value! unit! significantDigit dateTime "
    "measurementUncertaintyUnivariate",
    "realListXMLList": "labelXMLList quantityTypeXMLList valueXMLList! unitXMLList! "
    "significantDigitXMLList",
    "measurementUncertaintyUnivariate": "expandedMU standardMU coverageIntervalMU",
    "expandedMU": "valueExpandedMU! coverageFactor! coverageProbability! distribution",
    "coverageIntervalMU": "valueStandardMU! intervalMin! intervalMax! coverageProbability!",
}
#: Elements that may repeat among their siblings.
MANY = set(
    "software identification itemQuantity respPerson statement usedMethod measuringEquipment "
    "influenceCondition result metaData content text quantity countryCode further".split()
)
#: Elements with a choice of children in any order.
ANY_ORDER = {"data": {"text", "quantity"}, "location": {"countryCode", "further"}}
ENUMERATIONS = {
    "software/type": {"application", "library", "other"},
    "performanceLocation": {"laboratory", "customer", "other"},
    "typeOfChange": {"amended", "substituted"},
    "issuer": {"manufacturer", "calibrationLaboratory", "customer", "owner", "other"},
    "conformity": {"pass", "fail", "conditionalPass", "conditionalFail", "noPass", "noFail"},
}
PATTERNS = {
    "countryCodeISO3166_1": r"[A-Z]{2}",
    "countryCode": r"[A-Z]{2}",
    "usedLangCodeISO639_1": r"[a-z]{2}",
    "beginPerformanceDate": r"\d{4}-\d\d-\d\d",
    "endPerformanceDate": r"\d{4}-\d\d-\d\d",
    "issueDate": r"\d{4}-\d\d-\d\d",
    "date": r"\d{4}-\d\d-\d\d",
    "release": r"[a-zA-Z] ?([0-9]{1,3}\.){0,3}[0-9]{1,3}",
    "value": r"\S+(\s+\S+)*",
    "referralID": r"\S+(\s+\S+)*",
    "uniqueIdentifier": r"\S+(\s+\S+)*",
    "role": r"\S+(\s+\S+)*",
    "content": r"\S+(\s+\S+)*",
    "mainSigner": "true|false",
}


def local(element):
    return etree.QName(element).localname


def problems(root):
    """Return where the structure is not that of the schema."""
    return [said for element in root.iter() for said in problems_of(element)]


def problems_of(element):
    name = local(element)
    parent = element.getparent()
    path = name if parent is None else f"{local(parent)}/{name}"
    children = [local(child) for child in element]
    here = f"{path} (line {element.sourceline})"
    if name in ANY_ORDER:
        yield from (f"{here}: {one}" for one in set(children) - ANY_ORDER[name])
        return
    allowed = CHILDREN.get(path) or CHILDREN.get(name)
    if allowed is not None and (path, name) != ("identification/name", "name"):
        words = allowed.split()
        order = [word.rstrip("!") for word in words]
        places = [order.index(one) if one in order else -1 for one in children]
        if -1 in places or (places != sorted(places) and name != "administrativeData"):
            yield f"{here}: {children}"
        yield from (
            f"{here}: no {one[:-1]}" for one in words if one[-1] == "!" and one[:-1] not in children
        )
        yield from (
            f"{here}: {one} twice" for one in set(children) - MANY if children.count(one) > 1
        )
    elif set(children) - {"content"}:
        yield f"{here}: {children} are not in the table"
    elif not children:
        pattern = PATTERNS.get(name)
        if pattern and not re.fullmatch(pattern, element.text or ""):
            yield f"{here}: {element.text!r}"
        known = ENUMERATIONS.get(path) or ENUMERATIONS.get(name)
        if known and element.text not in known:
            yield f"{here}: {element.text!r}"


def changed(issued, **parts):
    document = deepcopy(dict(issued.document))
    for key, value in parts.items():
        document[key] = {**document[key], **value} if isinstance(value, dict) else value
    return replace(issued, document=document)


def is_si(unit):
    """By dsiUnits, the PTB's own reader of D-SI units; it warns of its own spellings."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        from dsi_unit import DsiUnit

        return DsiUnit(unit).valid


@pytest.fixture(scope="module")
def root(issued):
    return etree.fromstring(dcc_xml(issued, ABOUT))


def found(root, path):
    return root.xpath(path, namespaces=NAMES)


@pytest.mark.parametrize("number", [f"TL-2026-000{at}" for at in range(1, 6)])
def test_dcc_of_every_certificate_has_the_structure_of_the_schema(laboratory, number) -> None:
    tree = etree.fromstring(dcc_xml(laboratory.issued(number), ABOUT))
    assert problems(tree) == []


@pytest.mark.parametrize(
    "spoil",
    [
        lambda root: (
            found(root, "//dcc:customer")[0].getparent().remove(found(root, "//dcc:customer")[0])
        ),
        lambda root: found(root, "//dcc:coreData")[0].append(
            found(root, "//dcc:beginPerformanceDate")[0]
        ),
        lambda root: setattr(found(root, "//dcc:typeOfChange")[0], "text", "changed"),
        lambda root: setattr(found(root, "//dcc:content")[0], "text", " "),
        lambda root: found(root, "//dcc:result")[0].append(etree.Element("{https://ptb.de/dcc}x")),
    ],
)
def test_structure_check_notices_what_is_spoilt(issued, spoil) -> None:
    tree = etree.fromstring(dcc_xml(issued, ABOUT))
    spoil(tree)
    assert problems(tree)


def test_dcc_names_its_version_and_schema(root) -> None:
    assert root.tag == "{https://ptb.de/dcc}digitalCalibrationCertificate"
    assert root.get("schemaVersion") == "3.3.0"
    assert root.get("{http://www.w3.org/2001/XMLSchema-instance}schemaLocation") == (
        "https://ptb.de/dcc https://ptb.de/dcc/v3.3.0/dcc.xsd"
    )


def test_dcc_result_keeps_the_printed_digits_with_their_zeros(issued, root) -> None:
    shown = printed(issued.document["result"])
    number = "//dcc:result[1]//si:real"
    digits = len(shown.value.lstrip("0.").replace(".", ""))
    assert found(root, f"{number}/si:value/text()") == [shown.value]
    assert found(root, f"{number}/si:significantDigit/text()") == [str(digits)]
    assert found(root, f"{number}//si:valueExpandedMU/text()") == [shown.uncertainty]
    assert found(root, f"{number}//si:coverageFactor/text()") == ["2.0"]
    assert found(root, f"{number}//si:coverageProbability/text()") == ["0.95"]


def test_dcc_of_a_monte_carlo_result_states_its_interval(laboratory) -> None:
    issued = laboratory.issued("TL-2026-0001")
    tree = etree.fromstring(dcc_xml(issued, ABOUT))
    low, high = (
        found(tree, f"//dcc:result[1]//si:interval{end}/text()")[0] for end in ("Min", "Max")
    )
    assert (
        f"interval {low} to {high} mol/L" in issued.document["result"]["concentration"]["reported"]
    )
    assert found(tree, "//si:expandedMU") == []


def test_dcc_units_are_those_of_the_si(root) -> None:
    units = set(found(root, "//si:unit/text()") + found(root, "//si:unitXMLList/text()"))
    assert units >= {r"\mole\litre\tothe{-1}", r"\one", r"\milli\litre", r"\degreecelsius"}
    assert [unit for unit in units if not is_si(unit)] == []


def test_every_unit_that_can_be_exported_is_one_of_the_si() -> None:
    assert [unit for unit in UNITS.values() if not is_si(unit)] == []
    assert not is_si(r"\mol")


def test_dcc_names_the_replaced_certificate_with_its_hash(issued, replaced, root) -> None:
    core = "//dcc:coreData"
    assert found(root, f"{core}//dcc:replacedUniqueIdentifier/text()") == ["TL-2026-0004"]
    assert found(root, f"{core}/dcc:previousReport/dcc:value/text()") == [replaced.document_digest]


def test_dcc_of_a_first_certificate_replaces_none(replaced) -> None:
    tree = etree.fromstring(dcc_xml(replaced, ABOUT))
    assert found(tree, "//dcc:reportAmendedSubstituted | //dcc:previousReport") == []


def test_dcc_names_every_root_with_the_hash_of_its_paper(issued) -> None:
    roots = issued.document["traceability"]
    kept = roots[1]["calibration_id"]
    about = replace(ABOUT, paper_hashes={kept: "ab" * 32})
    tree = etree.fromstring(dcc_xml(issued, about))
    equipment = found(tree, "//dcc:measuringEquipment")
    hashes = [found(one, "string(dcc:certificate/dcc:value)") for one in equipment]
    numbers = [found(one, "string(dcc:certificate/dcc:referralID)") for one in equipment]
    assert numbers == [one["certificate_number"] for one in roots]
    assert hashes[1] == "ab" * 32
    assert hashes[0] == digest(canonical(roots[0]["statements"]))
    says = found(equipment[0], "string(dcc:certificate/dcc:description)")
    assert "no file is kept" in says


def test_dcc_findings_are_conformity_statements_with_their_rule(issued, root) -> None:
    stated = found(root, "//dcc:metaData/dcc:conformity/text()")
    words = {"holds": "pass", "look": "conditionalPass", "fails": "fail"}
    assert stated == [words[one["verdict"]] for one in issued.document["findings"]]
    for rule in found(root, "//dcc:metaData/dcc:declaration"):
        assert "Decision rule" in "".join(rule.itertext())
    assert "Accepted by Ottilie Renn." in "".join(root.itertext())


def test_dcc_people_are_those_who_signed(root) -> None:
    assert found(root, "//dcc:respPerson/dcc:person/dcc:name/dcc:content/text()") == [
        "Bashir Oduya", "Ottilie Renn",
    ]  # fmt: skip
    assert found(root, "//dcc:mainSigner/text()") == ["false", "true"]


def test_dcc_carries_the_printed_certificate_where_it_is_given(issued) -> None:
    pdf = certificate_pdf(issued)
    tree = etree.fromstring(dcc_xml(issued, replace(ABOUT, pdf=pdf)))
    assert problems(tree) == []
    (text,) = found(tree, "/*/dcc:document/dcc:dataBase64/text()")
    assert base64.b64decode(text) == pdf


@pytest.mark.parametrize(
    "odd", ["<x>&amp;]]>", "a\x00b\x07c\ufffe", "  spaces  ", "", "<!DOCTYPE a [<!ENTITY b 'c'>]>"]
)
def test_dcc_of_odd_names_stays_one_document(issued, odd) -> None:
    laboratory = {"name": odd, "address": odd}
    tree = etree.fromstring(dcc_xml(changed(issued, laboratory=laboratory), ABOUT))
    assert problems(tree) == []
    (name,) = found(tree, "//dcc:calibrationLaboratory/dcc:contact/dcc:name/dcc:content/text()")
    kept = re.sub("[\x00-\x08\ufffe]", "\ufffd", odd).strip() or "not stated"
    assert name == kept


@pytest.mark.parametrize("country", ["", "ch", "CHE", "C1", "ÄÖ", "CH\n"])
def test_dcc_without_a_country_is_refused(issued, country) -> None:
    with pytest.raises(Unacceptable) as refused:
        dcc_xml(issued, replace(ABOUT, country=country))
    assert refused.value.field == "country"


def test_dcc_of_a_changed_document_is_refused(issued) -> None:
    with pytest.raises(Unacceptable, match="not the text that was issued"):
        dcc_xml(replace(issued, holds=False), ABOUT)


def test_dcc_is_read_back_to_the_certificates_own_numbers(issued, root) -> None:
    values = found(root, "//si:valueXMLList/text()")[0].split()
    stated = [one["value"] for one in issued.document["result"]["replicates"]]
    assert [float(one) for one in values] == pytest.approx(stated, abs=0.6e-5)
    assert json.loads(json.dumps(values)) == values

"""A Digital Calibration Certificate, DCC 3: its values for a person to confirm."""

import re
from collections.abc import Iterator
from dataclasses import dataclass

from server.intake.dcc_quantity import Column, names_of, read_column, ref_types_of
from server.intake.safe_xml import Node, read_xml
from server.lab.refusal import Unacceptable

DCC_SPACE = "https://ptb.de/dcc"
#: refTypes whose meaning is known here; others are shown, not dropped.
KNOWN_REF_TYPES = frozenset(
    "basic_nominalValue basic_referenceValue basic_measuredValue basic_measurementError "
    "basic_recalibration basic_serialNumber basic_repeatability".split()
)
_DAY = re.compile(r"\d{4}-\d{2}-\d{2}")
_MOST_SHOWN = 2_000


@dataclass(frozen=True, slots=True)
class Shown:
    """Something that the certificate says and nothing here uses: where, of which refType, what."""

    path: str
    ref_type: str
    text: str


@dataclass(frozen=True, slots=True)
class Identification:
    """An item's number: who gave it (manufacturer, laboratory, customer ...), what it is."""

    issuer: str
    value: str
    name: str
    ref_types: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class Item:
    """What was calibrated."""

    name: str
    maker: str
    model: str
    identifications: tuple[Identification, ...]

    @property
    def serial(self) -> str | None:
        """The number that the maker gave it, or None."""
        for one in self.identifications:
            if one.issuer == "manufacturer" or "basic_serialNumber" in one.ref_types:
                return one.value
        return None


@dataclass(frozen=True, slots=True)
class Table:
    """A list of quantities of one result, column by column, of equal length or not."""

    name: str
    ref_types: tuple[str, ...]
    columns: tuple[Column, ...]

    @property
    def even(self) -> bool:
        """Whether every column with numbers has as many."""
        return len({len(one.amounts) for one in self.columns if one.amounts}) == 1


@dataclass(frozen=True, slots=True)
class CalibrationCertificate:
    """What a DCC says, all as text; nothing of it counts before a person has confirmed it.

    ``recalibration`` is the day of the statement with refType basic_recalibration;
    ``unknown_ref_types`` are those of which nothing is known here; ``left_over`` all texts that no
    field above holds.
    """

    schema_version: str
    unique_identifier: str
    begun_on: str
    ended_on: str
    issued_on: str
    received_on: str
    laboratory: str
    laboratory_code: str
    customer: str
    responsible: tuple[str, ...]
    software: tuple[str, ...]
    items: tuple[Item, ...]
    recalibration: str | None
    tables: tuple[Table, ...]
    unknown_ref_types: tuple[str, ...]
    left_over: tuple[Shown, ...]


def read_dcc(data: bytes) -> CalibrationCertificate:
    """Return what a DCC of version 3 says (schema at https://ptb.de/dcc).

    Raises:
        Unacceptable: no DCC 3, a DOCTYPE or entity, too large, a required part missing, a number
            that is none.
    """
    root = read_xml(data, what="The certificate")
    if root.name != "digitalCalibrationCertificate" or root.space != DCC_SPACE:
        says = "The file is no Digital Calibration Certificate: its first element says otherwise."
        raise Unacceptable(says, field="file")
    version = root.attributes.get("schemaVersion", "")
    if not re.fullmatch(r"3\.\d{1,3}\.\d{1,3}(-[\w.]{1,20})?", version):
        says = f"The certificate is of DCC version “{version[:20]}”; version 3 is read here."
        raise Unacceptable(says, field="file")
    for one in root.walk():
        one.seen = False
    administrative = _need(root, "administrativeData")
    core = _need(administrative, "coreData")
    laboratory = administrative.one("calibrationLaboratory")
    tables = tuple(_tables(root))
    found = {
        "unique_identifier": _text(_need(core, "uniqueIdentifier")),
        "begun_on": _day(core, "beginPerformanceDate"),
        "ended_on": _day(core, "endPerformanceDate"),
        "issued_on": _day(core, "issueDate", required=False),
        "received_on": _day(core, "receiptDate", required=False),
        "laboratory": _contact(laboratory),
        "laboratory_code": _text(laboratory.one("calibrationLaboratoryCode")) if laboratory else "",
        "customer": _contact(administrative, "customer"),
    }
    responsible, software = tuple(_people(administrative)), tuple(_software(administrative))
    items, recalibration = tuple(_items(administrative)), _recalibration(administrative)
    return CalibrationCertificate(
        schema_version=version,
        **found,
        responsible=responsible,
        software=software,
        items=items,
        recalibration=recalibration,
        tables=tables,
        unknown_ref_types=_unknown(root),
        left_over=tuple(_left_over(root)),
    )


def _need(node: Node, name: str) -> Node:
    found = node.one(name)
    if found is None:
        where = "/".join(one for one in (node.path(), name) if one)
        raise Unacceptable(f"The certificate has no {where}.", field="file")
    return found


def _text(node: Node | None) -> str:
    if node is None:
        return ""
    node.seen = True
    return node.text


def _day(core: Node, name: str, *, required: bool = True) -> str:
    node = core.one(name)
    if node is None and not required:
        return ""
    text = _text(node if node is not None else _need(core, name))
    if not _DAY.match(text):
        says = f"administrativeData/coreData/{name}: “{text[:30]}” is no day."
        raise Unacceptable(says, field="file", example="2026-03-12")
    return text


def _contact(node: Node | None, *way: str) -> str:
    """Return the name of a contact, which stands in the node or in an element ``contact``."""
    for name in way:
        node = node.one(name) if node else None
    if node is None:
        return ""
    contact = node.one("contact") or node
    return names_of(contact.one("name"))


def _people(administrative: Node) -> Iterator[str]:
    persons = administrative.one("respPersons")
    for one in persons.all("respPerson") if persons else ():
        person = one.one("person")
        name = names_of(person.one("name")) if person else ""
        if name:
            yield name


def _software(administrative: Node) -> Iterator[str]:
    listed = administrative.one("dccSoftware")
    for one in listed.all("software") if listed else ():
        yield " ".join(
            part for part in (names_of(one.one("name")), _text(one.one("release"))) if part
        )


def _items(administrative: Node) -> Iterator[Item]:
    listed = administrative.one("items")
    for one in listed.all("item") if listed else ():
        yield Item(
            name=names_of(one.one("name")),
            maker=_contact(one, "manufacturer"),
            model=_text(one.one("model")),
            identifications=tuple(_identifications(one)),
        )


def _identifications(item: Node) -> Iterator[Identification]:
    listed = item.one("identifications")
    for one in listed.all("identification") if listed else ():
        yield Identification(
            issuer=_text(one.one("issuer")),
            value=_text(one.one("value")),
            name=names_of(one.one("name")),
            ref_types=ref_types_of(one),
        )


def _recalibration(administrative: Node) -> str | None:
    """Return the day by which the customer wants it calibrated again, or None."""
    listed = administrative.one("statements")
    for one in listed.all("statement") if listed else ():
        if "basic_recalibration" in ref_types_of(one):
            date = one.one("date")
            if date is not None and _DAY.match(date.text):
                return _text(date)
    return None


def _tables(root: Node) -> Iterator[Table]:
    """Yield the lists of every result; single quantities of a result stand together in one."""
    results = root.one("measurementResults")
    for measurement in results.all("measurementResult") if results else ():
        title = names_of(measurement.one("name"))
        listed = measurement.one("results")
        for result in listed.all("result") if listed else ():
            name = " · ".join(one for one in (title, names_of(result.one("name"))) if one)
            data = result.one("data")
            if data is not None:
                yield from _tables_of(data, name, ref_types_of(result))


def _tables_of(node: Node, name: str, ref_types: tuple[str, ...]) -> Iterator[Table]:
    columns = tuple(read_column(one) for one in node.all("quantity"))
    if columns:
        yield Table(name, (*ref_types, *ref_types_of(node)), columns)
    for inner in node.all("list"):
        own = names_of(inner.one("name"))
        yield from _tables_of(inner, f"{name} · {own}" if own else name, ref_types)


def _unknown(root: Node) -> tuple[str, ...]:
    found: dict[str, None] = {}
    for node in root.walk():
        for one in ref_types_of(node):
            if one not in KNOWN_REF_TYPES:
                found[one] = None
    return tuple(found)


def _left_over(root: Node) -> Iterator[Shown]:
    """Yield every text that nobody read, with the refType of what it belongs to."""
    count = 0
    for node in root.walk():
        if node.seen or not node.text:
            continue
        count += 1
        if count > _MOST_SHOWN:
            yield Shown("", "", f"more than {_MOST_SHOWN} further texts; see the file")
            return
        yield Shown(node.path(), _ref_type_above(node), _shortened(node))


def _ref_type_above(node: Node) -> str:
    above: Node | None = node
    while above is not None:
        if above.attributes.get("refType"):
            return above.attributes["refType"]
        above = above.parent
    return ""


def _shortened(node: Node) -> str:
    """Return a text; of enclosed files and signatures only how long they are."""
    binary = "base64" in node.name.lower() or node.name in {"SignatureValue", "X509Certificate"}
    return f"({len(node.text)} characters of a file or signature)" if binary else node.text

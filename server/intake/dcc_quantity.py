"""Quantities of a Digital Calibration Certificate: numbers as text, with their uncertainties."""

from collections.abc import Sequence
from dataclasses import dataclass
from decimal import Decimal

from server.intake.safe_xml import Node
from server.lab.refusal import Unacceptable
from server.metrology.decimal_text import DecimalProblem, read_wire_decimal

_MOST_VALUES = 5_000


@dataclass(frozen=True, slots=True)
class Amount:
    """One number as the certificate writes it, with its expanded uncertainty and k as text.

    A standard uncertainty that is stated as one is ``U`` with ``k`` 1.
    """

    value: str
    unit: str
    U: str | None = None
    k: str | None = None
    probability: str | None = None
    distribution: str | None = None


@dataclass(frozen=True, slots=True)
class Column:
    """A quantity of a list: its names, refTypes, and its amounts in order.

    ``others`` are the same amounts in other units, where the certificate states them (si:hybrid);
    ``text`` is what stands there instead of numbers.
    """

    name: str
    ref_types: tuple[str, ...]
    amounts: tuple[Amount, ...]
    others: tuple[tuple[Amount, ...], ...] = ()
    text: str = ""


def names_of(node: Node | None) -> str:
    """Return a text in all languages that it has, joined."""
    if node is None:
        return ""
    node.seen = True
    found = []
    for one in node.all("content"):
        one.seen = True
        if one.text and one.text not in found:
            found.append(one.text)
    return " / ".join(found) or node.text


def ref_types_of(node: Node) -> tuple[str, ...]:
    """Return an element's refTypes."""
    return tuple(node.attributes.get("refType", "").split())


def read_column(quantity: Node) -> Column:
    """Return a quantity with its numbers.

    Raises:
        Unacceptable: a number that is none, lists that do not fit each other.
    """
    quantity.seen = True
    name, ref_types = names_of(quantity.one("name")), ref_types_of(quantity)
    forms = [amounts for child in quantity.children for amounts in _forms(child)]
    if forms:
        return Column(name, ref_types, forms[0], tuple(forms[1:]))
    return Column(name, ref_types, (), text=_words(quantity))


def _words(quantity: Node) -> str:
    """Return what a quantity says in words (dcc:noQuantity and the like)."""
    found = []
    for child in quantity.children:
        if child.name in {"noQuantity", "charsXMLList"}:
            for one in child.walk():
                one.seen = True
                if one.text:
                    found.append(one.text)
    return " / ".join(found)


def _forms(node: Node) -> list[tuple[Amount, ...]]:
    """Return the amounts of one element of D-SI; a hybrid states them in several units."""
    if node.name == "real":
        return [(_real(node),)]
    if node.name == "constant":
        return [(_real(node),)]
    if node.name == "realListXMLList":
        return [_real_list(node)]
    if node.name == "list":
        node.seen = True
        reals = tuple(_real(one) for one in node.all("real"))
        return [reals] if reals else []
    if node.name == "hybrid":
        node.seen = True
        return [amounts for child in node.children for amounts in _forms(child)]
    return []


def _real(node: Node) -> Amount:
    """Return a single si:real or si:constant."""
    node.seen = True
    U = _uncertainty(node, ())
    value = _text(node, "value") or ""
    return Amount(
        value=_decimal(value, node),
        unit=_text(node, "unit") or "",
        U=None if U.U is None else _decimal(U.U, node),
        k=None if U.k is None else _decimal(U.k, node),
        probability=U.probability,
        distribution=U.distribution,
    )


def _real_list(node: Node) -> tuple[Amount, ...]:
    """Return an si:realListXMLList; unit, U, k and p may be stated once for all."""
    node.seen = True
    values = (_text(node, "valueXMLList") or "").split()
    if not 0 < len(values) <= _MOST_VALUES:
        says = f"{node.path()}: a list has {len(values)} values; 1 to {_MOST_VALUES} are read."
        raise Unacceptable(says, field="file")
    stated = _uncertainty(node, ("XMLList",))
    parts = {
        name: _spread(text, len(values), name, node)
        for name, text in (
            ("unit", _text(node, "unitXMLList")),
            ("U", stated.U),
            ("k", stated.k),
            ("probability", stated.probability),
            ("distribution", stated.distribution),
        )
    }
    return tuple(
        Amount(
            value=_decimal(value, node),
            unit=parts["unit"][i] or "",
            U=_maybe_decimal(parts["U"][i], node),
            k=_maybe_decimal(parts["k"][i], node),
            probability=parts["probability"][i],
            distribution=parts["distribution"][i],
        )
        for i, value in enumerate(values)
    )


@dataclass(frozen=True, slots=True)
class _Stated:
    """The texts of an uncertainty, one or a list of them."""

    U: str | None
    k: str | None
    probability: str | None
    distribution: str | None


#: (element, its element of the value): new and old spellings of D-SI, and a standard uncertainty.
_FORMS = (
    ("expandedMU", "valueExpandedMU"),
    ("expandedUnc", "uncertainty"),
    ("standardMU", "valueStandardMU"),
)


def _uncertainty(node: Node, suffix: Sequence[str]) -> _Stated:
    """Return the uncertainty of a real or of a list (suffix ``XMLList``), empty where none is."""
    end = "".join(suffix)
    within = [node, *node.all(f"measurementUncertaintyUnivariate{end}")]
    for place in within:
        for element, value in _FORMS:
            found = place.one(f"{element}{end}") or (place.one(element) if end else None)
            if found is None:
                continue
            place.seen = found.seen = True
            one = element == "standardMU"
            return _Stated(
                U=_text(found, f"{value}{end}") or _text(found, value),
                k="1" if one else _text(found, f"coverageFactor{end}", "coverageFactor"),
                probability=_text(found, f"coverageProbability{end}", "coverageProbability"),
                distribution=_text(found, f"distribution{end}", "distribution"),
            )
    return _Stated(None, None, None, None)


def _text(node: Node, *names: str) -> str | None:
    for name in names:
        found = node.one(name)
        if found is not None:
            found.seen = True
            return found.text or None
    return None


def _spread(text: str | None, count: int, what: str, node: Node) -> list[str | None]:
    """Return one text for each value: each its own, or one for all."""
    parts: list[str | None] = [*(text or "").split()]
    if not parts:
        return [None] * count
    if len(parts) == 1:
        return parts * count
    if len(parts) != count:
        says = f"{node.path()}: {len(parts)} texts of {what} for {count} values."
        raise Unacceptable(says, field="file")
    return parts


def _maybe_decimal(text: str | None, node: Node) -> str | None:
    return None if text is None else _decimal(text, node)


def _decimal(text: str, node: Node) -> str:
    """Return a number as it is written, after checking that it is one."""
    try:
        read_wire_decimal(text, node.path())
    except DecimalProblem as problem:
        raise Unacceptable(problem.says, field="file") from problem
    return text


def plain(number: Decimal) -> str:
    """Return a decimal as plain text with its own zeros, and no minus before zero."""
    return f"{abs(number) if number == 0 else number:f}"

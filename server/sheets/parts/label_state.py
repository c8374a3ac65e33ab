"""Whether the label on a bottle still tells the truth."""

from collections.abc import Mapping
from typing import Any

from sqlalchemy.orm import Session

from server.records.queries.list_labels import PrintedLabel, labels_of_bottles
from server.records.queries.list_shelf import BottleOnShelf


def again_says(one: BottleOnShelf, last: PrintedLabel) -> str:
    """Return why a bottle's label should be printed again: the value on it stands no more."""
    value, standing = last.text.value, one.lot.certificate
    if value is None:
        return ""
    if standing is None or standing.row.number != value.certificate:
        now = f", which {standing.row.number} replaced" if standing else ""
        return f"Its label bears the value of {value.certificate}{now}."
    return ""


def is_gone(one: BottleOnShelf) -> bool:
    """Say whether a bottle is out of use for good, so that it gets no label any more."""
    return one.bottle.used_up_at is not None or one.lot.pulled


def label_says(session: Session, one: BottleOnShelf, settings: Mapping[str, Any]) -> str:
    """Return what is wrong with a bottle's label, empty where nothing is.

    It is asked only where the laboratory prints values on labels: no other label grows old.
    """
    if not settings.get("label_value") or is_gone(one):
        return ""
    printed = labels_of_bottles(session, [one.bottle.id])
    return again_says(one, printed[0]) if printed else ""

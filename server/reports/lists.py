"""The laboratory's lists as CSV: shelf, standard lots, instruments, lots, trail."""

import re
from collections.abc import Iterable, Sequence
from typing import Protocol

from server.reports.csv_export import write_csv
from server.sheets.countersign import TrailLine
from server.sheets.lots_page import Lots
from server.sheets.parts.telling import iso_day
from server.sheets.shelf import Shelf
from server.sheets.stores import Stores

_REPORTED = re.compile(r"(?P<value>[0-9.]+) ± (?P<U>[0-9.]+) (?P<unit>\S+) \(k = (?P<k>[0-9.]+)\)")
_CERTIFIED = ("value", "U", "unit", "k", "as certified")
_NUMBERS = ("nominal, mol/L", "value", "U", "k")


class InstrumentLine(Protocol):
    """What an instrument's line in the list tells."""

    @property
    def kind(self) -> str:
        """Balance, burette, pipette and so on."""

    @property
    def name(self) -> str:
        """Its name."""

    @property
    def says(self) -> str:
        """What it is and where it stands."""

    @property
    def state(self) -> str:
        """In date, due soon, lapsed, held, not calibrated."""

    @property
    def due(self) -> str:
        """The last day of its calibration."""

    @property
    def due_basis(self) -> str:
        """What sets that day."""

    @property
    def certificate(self) -> str:
        """The number of the calibration that serves."""

    @property
    def flag(self) -> str:
        """What speaks against it, empty where nothing does."""


def shelf_csv(shelf: Shelf) -> bytes:
    """Return the bottles of a shelf as it is shown; a number only where a bottle is in force."""
    heads = ("bottle", "titrant", "nominal, mol/L", "lot", "state", *_CERTIFIED, "good until",
             "place")  # fmt: skip
    rows = [
        (
            one.code, one.titrant, _nominal(one.nominal), one.lot_name, one.state,
            *_certified(one.reported), iso_day(one.good_until), one.place,
        )
        for one in shelf.bottles
    ]  # fmt: skip
    return write_csv(heads, rows, numeric=_NUMBERS)


def lots_csv(lots: Lots) -> bytes:
    """Return titrant lots as they are shown."""
    heads = ("lot", "name", "titrant", "nominal, mol/L", "medium", "state", *_CERTIFIED,
             "certificate", "good until", "bottles", "made up", "made up by")  # fmt: skip
    rows = [
        (
            one.code, one.name, one.titrant, _nominal(one.nominal), one.medium, one.state,
            *_certified(one.reported), one.certificate, iso_day(one.good_until),
            str(one.bottles), one.made_at, one.made_by,
        )
        for one in lots.lots
    ]  # fmt: skip
    return write_csv(heads, rows, numeric=(*_NUMBERS, "bottles"))


def standard_lots_csv(stores: Stores) -> bytes:
    """Return the standard lots as they are shown; what is left in g."""
    heads = ("standard lot", "substance", "certificate", "issuer", "mass fraction", "state",
             "good until", "set by", "opened", "left, g")  # fmt: skip
    rows = [
        (
            one.name, one.kind, one.certificate, one.issuer,
            one.says.removeprefix("mass fraction "), one.state, iso_day(one.due), one.due_rule,
            iso_day(one.opened), one.left.removesuffix(" g"),
        )
        for one in stores.standard_lots
    ]  # fmt: skip
    return write_csv(heads, rows, numeric=("left, g",))


def instruments_csv(lines: Iterable[InstrumentLine]) -> bytes:
    """Return the instruments as they are shown."""
    heads = ("instrument", "kind", "what and where", "state", "due", "set by", "certificate",
             "speaks against it")  # fmt: skip
    rows = [
        (
            one.name, one.kind, one.says, one.state, iso_day(one.due), one.due_basis,
            one.certificate, one.flag,
        )
        for one in lines
    ]  # fmt: skip
    return write_csv(heads, rows)


def trail_csv(lines: Sequence[TrailLine]) -> bytes:
    """Return lines of the trail, times in UTC."""
    heads = ("number", "at", "who", "act", "kind", "thing", "why", "details")
    rows = [
        (
            str(one.seq), one.at, one.who, one.act, one.kind, one.thing, one.why or "",
            one.details,
        )
        for one in lines
    ]  # fmt: skip
    return write_csv(heads, rows, numeric=("number",))


def _nominal(words: str) -> str:
    return words.removesuffix(" mol/L")


def _certified(reported: str) -> tuple[str, str, str, str, str]:
    """Return value, U, unit and k apart; where the statement is an interval it stands alone."""
    read = _REPORTED.fullmatch(reported)
    if read is None:
        return "", "", "", "", reported
    return read["value"], read["U"], read["unit"], read["k"], reported

"""The form of a calibration done here: rows of readings, as typed, and back to their places."""

import re
from collections.abc import Callable, Iterator, Mapping
from contextlib import contextmanager
from dataclasses import dataclass
from types import MappingProxyType
from typing import Any

from server.lab.refusal import Unacceptable
from server.lab.sheet_facts import BALANCE, PROBE, THERMOMETER
from server.metrology.tolerances import PISTON_KINDS
from server.procedures.calibration_runs import RecordRun
from server.procedures.instrument_log import MeasureDrop
from server.records.queries.load_used import USED_FIELDS
from server.web.forms.typed import Typed

#: Rows that a form holds at first and at most; over the API a run may have more.
FIRST_ROWS: Mapping[str, int] = MappingProxyType({BALANCE: 6, PROBE: 3, THERMOMETER: 5})
FIRST_WEIGHINGS, MORE_ROWS, MOST_ROWS = 10, 5, 50
_READINGS, _OFF_CENTRE = 10, 4

#: What a weighing may state itself; the air and the minutes of the run hold where it does not.
_OF_ITS_OWN = ("air_temperature", "air_pressure", "air_humidity", "minutes")
#: What stands in one row, by the letter of its fields: (list of the document, names of its keys).
_ROWS: Mapping[str, tuple[str, tuple[str, ...]]] = MappingProxyType(
    {
        "w": ("weighings", ("point", "before", "after", "water", *_OF_ITS_OWN, "left_out")),
        "m": ("weights", ("name", "nominal", "conventional", "U", "k", "up", "down")),
        "b": ("buffers", ("buffer", "temperature", "mV", "pH", "certified_pH", "u_pH")),
        "t": ("points", ("reading", "reference")),
    }
)
_FIRST_KEYS = {"w": "before", "m": "conventional", "b": "buffer", "t": "reading"}
_WORDS = {
    "weighings": "Weighing", "weights": "Weight", "buffers": "Buffer", "points": "Point",
    "repeatability.readings": "Reading", "eccentricity.positions": "Off the centre",
}  # fmt: skip
_LETTERS = {
    "weighings": "w", "weights": "m", "buffers": "b", "points": "t",
    "repeatability.readings": "r", "eccentricity.positions": "e",
}  # fmt: skip
_LISTED = "weighings|weights|buffers|points|repeatability.readings|eccentricity.positions"
_PLACE = re.compile(rf"({_LISTED})\[(\d+)\](?:\.(\w+(?:\.\w+)*))?")
#: Where a key of a document is called otherwise in the form.
_NAMES = {
    "class": "grade", "kind": "ware", "eccentricity.centre": "centre", "step": "step",
    "repeatability.load": "load", "repeatability": "r0", "repeatability.readings": "r0",
    "weighings": "w0_before", "weights": "m0_conventional", "buffers": "b0_buffer",
    "points": "t0_reading", "reference_u": "reference_bound", "balance": "balance_id",
    "eccentricity.positions": "e0",
}  # fmt: skip
_BOUNDS = {
    "weighing": "g", "water_temperature": "Cel", "air_temperature": "Cel", "air_pressure": "hPa",
    "air_humidity": "%", "evaporation": "g/min",
}  # fmt: skip


@dataclass(frozen=True, slots=True)
class TypedRun:
    """A run as typed: its document, and the row of the form that each of its members comes from."""

    document: dict[str, Any]
    places: Mapping[str, tuple[int, ...]]

    def field(self, path: str | None) -> str | None:
        """Return the form's field for a path in the document."""
        if path is None:
            return None
        found = _PLACE.match(path)
        if found is None:
            head, _, tail = path.partition(".")
            if head == "uncertainty" and tail:
                return f"u_{tail.partition('.')[0]}"
            return _NAMES.get(path, path.replace(".", "_"))
        row = self._row(found[1], int(found[2]))
        letter = _LETTERS[found[1]]
        if letter in "re":
            return f"{letter}{row}"
        key = (found[3] or _FIRST_KEYS[letter]).replace(".", "_")
        key = "U" if letter == "m" and key == "u" else key
        return f"{letter}{row}_{key}"

    def words(self, says: str) -> str:
        """Return a sentence with the rows counted as the form counts them."""

        def placed(found: re.Match[str]) -> str:
            row = self._row(found[1], int(found[2])) + 1
            key = f", {re.sub('[._]', ' ', found[3])}" if found[3] else ""
            return f"{_WORDS[found[1]]} {row}{key}"

        return _PLACE.sub(placed, says)

    def row_of(self, name: str, index: int) -> int:
        """Return the row of the form that a member of a list comes from."""
        return self._row(name, index)

    def _row(self, name: str, index: int) -> int:
        places = self.places.get(name, ())
        return places[index] if index < len(places) else index


@contextmanager
def refusals_of(typed: TypedRun) -> Iterator[None]:
    """Let refusals name the fields and rows of the form."""
    try:
        yield
    except Unacceptable as refusal:
        says = typed.words(refusal.says)
        raise Unacceptable(
            says, field=typed.field(refusal.field), example=refusal.example, shown=refusal.shown
        ) from refusal


def rows_shown(form: Typed, kind: str) -> int:
    """Return how many rows the form shows; one more handful where more were asked for."""
    text = form.text("rows")
    first = FIRST_ROWS.get(kind, FIRST_WEIGHINGS)
    rows = int(text) if text.isascii() and text.isdigit() and len(text) < 4 else first
    more = MORE_ROWS if form.text("do") == "more" else 0
    return max(1, min(MOST_ROWS, rows + more))


def read_run(form: Typed, kind: str) -> TypedRun:
    """Return the run that a form holds; an empty row is none."""
    readers: dict[str, Callable[[Typed], TypedRun]] = {
        BALANCE: _balance, PROBE: _probe, THERMOMETER: _thermometer,
    }  # fmt: skip
    return readers.get(kind, _ware)(form)


def read_record_run(form: Typed, instrument_id: str, run: dict[str, Any]) -> RecordRun:
    """Return the calibration that a form holds."""
    return RecordRun(
        instrument_id=instrument_id,
        run=run,
        done_on=form.text("done_on"),
        due_on=form.text("due_on"),
        due_basis=form.text("due_basis"),
        certificate_number=form.text("certificate_number"),
        issuer=form.text("issuer"),
        balance_id=form.text("balance_id"),
        thermometer_id=form.text("thermometer_id"),
        room_id=form.text("room_id"),
        reason=form.text("reason"),
    )


def read_drop(form: Typed, instrument_id: str) -> tuple[MeasureDrop, TypedRun]:
    """Return the weighings of a burette's drops, and where each stands in the form."""
    typed = _ware(form)
    kept = ("water", "glass_expansion", "air", "weighings")
    run = {key: value for key, value in typed.document.items() if key in kept}
    command = MeasureDrop(
        instrument_id=instrument_id,
        drops=form.whole("drops", example="20"),
        run=run,
        balance_id=form.text("balance_id"),
        thermometer_id=form.text("thermometer_id"),
        room_id=form.text("room_id"),
    )
    return command, typed


def picked_of(form: Typed) -> dict[str, str]:
    """Return the instruments that a run is weighed with, by kind."""
    return {kind: form.text(field) for kind, field in USED_FIELDS.items()}


def _ware(form: Typed) -> TypedRun:
    rows, places = _rows(form, "w")
    document = _kept(
        {
            "kind": form.text("ware"),
            "nominal": form.decimal("nominal"),
            "class": "" if form.text("ware") in PISTON_KINDS else form.text("grade"),
            "division": form.decimal("division"),
            "water": form.text("water"),
            "glass_expansion": form.decimal("glass_expansion"),
            "air": _group(form, "air", ("temperature", "pressure", "humidity")),
            "evaporation": _group(form, "evaporation", ("rate", "minutes")),
            "uncertainty": _bounds(form),
            "rule": form.text("rule"),
        }
    )
    weighings = [_with_air(one) for one in rows]
    return TypedRun({**document, "weighings": weighings}, {"weighings": places})


def _with_air(row: Mapping[str, str]) -> dict[str, Any]:
    """Return a weighing with the air that was read at it, where it was."""
    air = {key.removeprefix("air_"): row[key] for key in row if key.startswith("air_")}
    rest = {key: value for key, value in row.items() if not key.startswith("air_")}
    return {**rest, "air": air} if air else rest


def _balance(form: Typed) -> TypedRun:
    rows, places = _rows(form, "m")
    rows = [one if "U" in one else {k: v for k, v in one.items() if k != "k"} for one in rows]
    readings = [(i, form.decimal(f"r{i}")) for i in range(_READINGS)]
    typed = [(i, text) for i, text in readings if text]
    off = [(i, form.decimal(f"e{i}")) for i in range(_OFF_CENTRE) if form.decimal(f"e{i}")]
    repeated = _kept({"load": form.decimal("load"), "readings": [text for _, text in typed]})
    document = _kept(
        {
            "step": form.decimal("step"),
            "repeatability": repeated,
            "eccentricity": _kept(
                {"centre": form.decimal("centre"), "positions": [text for _, text in off]}
            ),
            "air": _group(form, "air", ("temperature", "pressure", "humidity")),
            "limits": _group(form, "limits", ("error", "eccentricity", "hysteresis")),
            "rule": form.text("rule"),
        }
    )
    document.setdefault("repeatability", {})
    return TypedRun(
        {**document, "weights": rows},
        {
            "weights": places,
            "repeatability.readings": tuple(i for i, _ in typed),
            "eccentricity.positions": tuple(i for i, _ in off),
        },
    )


def _probe(form: Typed) -> TypedRun:
    rows, places = _rows(form, "b")
    uncertainty = _kept(
        {
            key: _half_width(form.decimal(f"u_{key}"), unit)
            for key, unit in (("reading", "mV"), ("temperature", "Cel"))
        }
    )
    document = _kept(
        {
            "set": form.text("set"),
            "uncertainty": uncertainty,
            "limits": _group(form, "limits", ("slope_least", "slope_most", "offset")),
        }
    )
    return TypedRun({**document, "buffers": rows}, {"buffers": places})


def _thermometer(form: Typed) -> TypedRun:
    rows, places = _rows(form, "t")
    U = form.decimal("reference_bound")
    k = form.decimal("reference_k") or "2"
    document = _kept(
        {
            "step": form.decimal("step"),
            "reference_u": {"unit": "Cel", "U": U, "k": k} if U else None,
            "limits": _group(form, "limits", ("error",)),
            "rule": form.text("rule"),
            "serves": form.text("serves"),
        }
    )
    return TypedRun({**document, "points": rows}, {"points": places})


def _rows(form: Typed, letter: str) -> tuple[list[dict[str, str]], tuple[int, ...]]:
    """Return the rows in which a reading was typed, and where they stand.

    What a form fills in by itself (a point, a factor k) makes no row.
    """
    _, keys = _ROWS[letter]
    found, places = [], []
    for i in range(MOST_ROWS):
        texts = {key: form.text(f"{letter}{i}_{key}").strip() for key in keys}
        own = {key for key, text in texts.items() if text} - _FILLED[letter]
        if own:
            read = {key: form.decimal(f"{letter}{i}_{key}") for key in keys if texts[key]}
            read |= {key: texts[key] for key in ("left_out", "name", "buffer") if texts.get(key)}
            found.append(read)
            places.append(i)
    return found, tuple(places)


#: Keys whose fields hold something before anybody typed.
_FILLED: Mapping[str, frozenset[str]] = MappingProxyType(
    {
        "w": frozenset({"point"}),
        "m": frozenset({"k"}),
        "b": frozenset({"buffer"}),
        "t": frozenset(),
    }
)


def _bounds(form: Typed) -> dict[str, Any]:
    stated = {key: _half_width(form.decimal(f"u_{key}"), unit) for key, unit in _BOUNDS.items()}
    return _kept(stated)


def _half_width(text: str, unit: str) -> dict[str, str] | None:
    return {"unit": unit, "half_width": text, "shape": "rectangular"} if text else None


def _group(form: Typed, name: str, keys: tuple[str, ...]) -> dict[str, str]:
    return _kept({key: form.decimal(f"{name}_{key}") for key in keys})


def _kept(document: Mapping[str, Any]) -> dict[str, Any]:
    """Return a document without what nobody typed."""
    return {key: value for key, value in document.items() if value not in (None, "", {}, [])}

"""A titration curve as an entry: the points as text, how they were read, and from which file."""

import json
from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

from server.lab import reading_documents as reading
from server.lab.canonical import canonical
from server.lab.refusal import Unacceptable
from server.metrology.decimal_text import DecimalProblem, read_wire_decimal

FORMAT = "curve-entry/1"
SLOT, METHOD_SLOT = "curve", "end_point_method"
KINDS = ("pH", "mV")
FEWEST_POINTS, MOST_POINTS = 6, 5_000
#: The ways to an end point on a curve that a recipe or a person may take, in the trade's words.
CURVE_METHODS = (
    "steepest segment",
    "first derivative",
    "second derivative",
    "gran acid side",
    "gran alkaline side",
    "model fit",
)
#: The reactions that the model fit knows; ``none`` keeps to derivatives and Gran's lines.
CURVE_SYSTEMS = ("khp-naoh", "tris-hcl", "carbonate-hcl", "none")
_KEYS = (
    "format", "kind", "volume_mL", "reading", "seconds", "mapping", "set_aside", "drop", "file",
)  # fmt: skip


@dataclass(frozen=True, slots=True)
class CurveRow:
    """A row of the table that was not taken, and why."""

    row: int
    says: str


@dataclass(frozen=True, slots=True)
class CurveDrop:
    """The calibrated volume of one drop in mL with its u, shared by all points; and whose it is."""

    volume_mL: str
    u_mL: str | None = None
    instrument: str | None = None


@dataclass(frozen=True, slots=True)
class CurveFile:
    """The original that the points came from: its name and the SHA-256 of its bytes."""

    name: str
    sha256: str


@dataclass(frozen=True, slots=True)
class CurveEntry:
    """A curve as it was understood and confirmed.

    ``volume_mL``, ``reading`` (pH or mV, by ``kind``) and ``seconds`` are decimals as text, equally
    many, in the order of reading. ``mapping`` says which column held what.
    """

    kind: str
    volume_mL: tuple[str, ...]
    reading: tuple[str, ...]
    seconds: tuple[str, ...] | None
    mapping: Mapping[str, Any]
    set_aside: tuple[CurveRow, ...] = ()
    drop: CurveDrop | None = None
    file: CurveFile | None = None

    @property
    def words(self) -> str:
        """The curve in short words, as its row on the sheet says it."""
        name = f"{self.file.name}, " if self.file else ""
        left = f", {len(self.set_aside)} left out" if self.set_aside else ""
        timed = ", with times" if self.seconds is not None else ""
        return f"{name}{len(self.volume_mL)} points, {self.kind}{timed}{left}"

    def to_record(self) -> dict[str, Any]:
        """Return the curve as a replicate of a bench record carries it."""
        curve: dict[str, Any] = {"volume_mL": list(self.volume_mL), self.kind: list(self.reading)}
        if self.seconds is not None:
            curve["seconds"] = list(self.seconds)
        return curve


def write_curve_entry(curve: CurveEntry) -> str:
    """Return the curve as canonical text, the ``raw`` of its entry."""
    document: dict[str, Any] = {
        "format": FORMAT,
        "kind": curve.kind,
        "volume_mL": list(curve.volume_mL),
        "reading": list(curve.reading),
        "mapping": dict(curve.mapping),
        "set_aside": [{"row": one.row, "says": one.says} for one in curve.set_aside],
    }
    if curve.seconds is not None:
        document["seconds"] = list(curve.seconds)
    if curve.drop is not None:
        stated = (
            ("volume_mL", curve.drop.volume_mL),
            ("u_mL", curve.drop.u_mL),
            ("instrument", curve.drop.instrument),
        )
        document["drop"] = {key: value for key, value in stated if value is not None}
    if curve.file is not None:
        document["file"] = {"name": curve.file.name, "sha256": curve.file.sha256}
    return canonical(document)


def read_curve_entry(raw: str | None) -> CurveEntry:
    """Return the curve that an entry's ``raw`` holds.

    Raises:
        Unacceptable: it is no such text, or the points make no curve; the key is named.
    """
    try:
        document = json.loads(raw or "")
    except ValueError as problem:
        says = "This entry holds no curve: its text cannot be read."
        raise Unacceptable(says, field=SLOT) from problem
    doc = reading.known_keys(document, SLOT, _KEYS)
    if doc.get("format") != FORMAT:
        raise Unacceptable(f"{SLOT}.format must be {FORMAT}.", field=f"{SLOT}.format")
    volumes = _decimals(doc, "volume_mL")
    readings = _decimals(doc, "reading")
    seconds = _decimals(doc, "seconds") if doc.get("seconds") is not None else None
    for key, values in (("reading", readings), ("seconds", seconds)):
        if values is not None and len(values) != len(volumes):
            says = f"{SLOT}.{key} has {len(values)} values for {len(volumes)} volumes."
            raise Unacceptable(says, field=f"{SLOT}.{key}")
    return CurveEntry(
        kind=reading.choice_at(doc, "kind", SLOT, choices=KINDS),
        volume_mL=volumes,
        reading=readings,
        seconds=seconds,
        mapping=_object(doc, "mapping"),
        set_aside=_set_aside(doc),
        drop=_drop(doc),
        file=_file(doc),
    )


def check_count(points: int) -> None:
    """Refuse too few points for a curve, and more than one is kept with.

    Raises:
        Unacceptable: how many there are, and how many may be.
    """
    if points < FEWEST_POINTS:
        says = f"The table has {points} points; a curve needs at least {FEWEST_POINTS}."
        raise Unacceptable(says, field="file")
    if points > MOST_POINTS:
        says = (
            f"The table has {points} points; a curve is kept with at most {MOST_POINTS}. "
            "Export fewer readings, every second one for instance."
        )
        raise Unacceptable(says, field="file")


def _decimals(doc: Mapping[str, Any], key: str) -> tuple[str, ...]:
    values = doc.get(key)
    path = f"{SLOT}.{key}"
    if not isinstance(values, Sequence) or isinstance(values, str):
        raise Unacceptable(f"{path} must be a list of numbers as text.", field=path)
    check_count(len(values))
    for at, value in enumerate(values):
        where = f"{path}[{at}]"
        if not isinstance(value, str):
            raise Unacceptable(f"{where} must be a number as text.", field=where, example="12.35")
        try:
            read_wire_decimal(value, where)
        except DecimalProblem as problem:
            raise Unacceptable(problem.says, field=where, example="12.35") from problem
    return tuple(values)


def _object(doc: Mapping[str, Any], key: str) -> Mapping[str, Any]:
    value = doc.get(key) or {}
    if not isinstance(value, Mapping):
        raise Unacceptable(f"{SLOT}.{key} must be an object.", field=f"{SLOT}.{key}")
    return dict(value)


def _set_aside(doc: Mapping[str, Any]) -> tuple[CurveRow, ...]:
    rows = doc.get("set_aside", [])
    path = f"{SLOT}.set_aside"
    if not isinstance(rows, list):
        raise Unacceptable(f"{path} must be a list.", field=path)
    read = []
    for at, one in enumerate(rows):
        row = reading.known_keys(one, f"{path}[{at}]", ("row", "says"))
        number = reading.count_at(row, "row", f"{path}[{at}]", low=1, high=10**7, default=1)
        says = reading.text_at(row, "says", f"{path}[{at}]", example="out of order")
        read.append(CurveRow(number, says))
    return tuple(read)


def _drop(doc: Mapping[str, Any]) -> CurveDrop | None:
    if doc.get("drop") is None:
        return None
    path = f"{SLOT}.drop"
    drop = reading.known_keys(doc["drop"], path, ("volume_mL", "u_mL", "instrument"))
    return CurveDrop(
        volume_mL=positive_text(drop, "volume_mL", path, example="0.0487"),
        u_mL=positive_text(drop, "u_mL", path, example="0.0002") if drop.get("u_mL") else None,
        instrument=(
            reading.text_at(drop, "instrument", path, example="Drop counter 2", most=120)
            if drop.get("instrument")
            else None
        ),
    )


def positive_text(document: Mapping[str, Any], key: str, path: str, *, example: str) -> str:
    """Return a number above zero as the text that was typed.

    Raises:
        Unacceptable: it is no such number; the path is named.
    """
    where = f"{path}.{key}" if path else key
    value = document.get(key)
    if not isinstance(value, str):
        raise Unacceptable(f"{where} must be a number as text.", field=where, example=example)
    try:
        number = read_wire_decimal(value, where)
    except DecimalProblem as problem:
        raise Unacceptable(problem.says, field=where, example=example) from problem
    if number <= 0:
        raise Unacceptable(f"{where} must be more than zero.", field=where, example=example)
    return value


def _file(doc: Mapping[str, Any]) -> CurveFile | None:
    if doc.get("file") is None:
        return None
    path = f"{SLOT}.file"
    file = reading.known_keys(doc["file"], path, ("name", "sha256"))
    return CurveFile(
        name=reading.text_at(file, "name", path, example="run3.csv", most=200),
        sha256=reading.text_at(file, "sha256", path, example="e3b0c442…", most=64),
    )

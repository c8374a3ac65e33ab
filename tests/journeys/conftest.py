"""A laboratory that will titrate QUAM's example A2; every act goes through the procedures."""

from collections.abc import Callable
from dataclasses import dataclass, field
from typing import Any
from uuid import uuid4

import pytest

from server.lab.actor import Actor, Proof
from server.lab.ink import standing
from server.lab.people import initials_of
from server.procedures.bench import BeginSheet, begin_sheet
from server.procedures.countersign import Countersign, countersign_sheet
from server.procedures.entries import NewEntry, WriteEntries, write_entries
from server.procedures.hand_in import HandIn, evaluate_sheet, hand_in_sheet, prepare_hand_in
from server.procedures.instruments import (
    RecordCalibration,
    RegisterInstrument,
    record_calibration,
    register_instrument,
)
from server.procedures.laboratory import SetUpLaboratory, set_up_laboratory
from server.procedures.lots import FillBottles, MakeUpLot, fill_bottles, make_up_lot
from server.procedures.people import AddPerson, add_person
from server.procedures.stores import (
    ReceiveStandardLot,
    WriteRecipe,
    receive_standard_lot,
    write_recipe,
)
from server.records import trail
from server.records.queries.load_sheet import load_sheet_facts
from server.records.queries.sheet_trail import last_act_of_sheet
from server.records.tables.trail import TrailRow
from server.sheets.look_up import look_up

ZONE = "Europe/Berlin"
PEOPLE = {
    "steward": ("Runa Askvall", ("steward",)),
    # whoever may countersign in general still may not countersign her own work
    "analyst": ("Ida Mohnke", ("analyst", "countersigner")),
    "second": ("Lene Tiedt", ("countersigner",)),
    "keeper": ("Nils Obermark", ("keeper",)),
}
# QUAM:2012 (EURACHEM/CITAC CG 4, third edition), example A2: its statements as papers of the
# laboratory. Temperature: ±3 °C at 95 %, so u = 3/1.96 °C; water expands by 2.1e-4 per °C.
RECIPE = {
    "title": "Sodium hydroxide 0.1 mol/L against potassium hydrogen phthalate",
    "titrant": {"substance": "NaOH", "nominal": "0.1", "medium": "water"},
    "standard": "KHP",
    "weighing": "difference",
    "replicates": 1,
    "end_point": {"mode": "visual", "indicator": "phenolphthalein"},
    "buoyancy": False,
    "liquid_expansion": {"value": "2.1e-4", "unit": "1/K"},
    "repeatability": {"relative_u": "0.0005", "applies_to": "mean", "source": "validation"},
    "interval_days": 14,
}
KHP = {
    "mass_fraction": {"value": "1.0", "half_width": "0.0005", "shape": "rectangular"},
    "molar_mass": {"value": "204.2212", "unit": "g/mol", "u": "0.0038"},
}
INSTRUMENTS: dict[str, tuple[dict[str, str], dict[str, Any]]] = {
    "balance": (
        {"resolution": "0.0001", "capacity": "220"},
        {"linearity": {"unit": "g", "half_width": "0.00015", "shape": "rectangular"}},
    ),
    "burette": (
        {"resolution": "0.01"},
        {
            "capacity": {"value": "20", "unit": "mL"},
            "delivery": {"unit": "mL", "half_width": "0.03", "shape": "triangular"},
        },
    ),
    "thermometer": ({"resolution": "1"}, {"reading": {"unit": "Cel", "u": "1.5306122"}}),
}
SLOTS = ("container_and_standard", "container_less_standard", "burette_start", "burette_end")


@dataclass
class Laboratory:
    """The laboratory at work; people are told by their part in the story."""

    transactions: Any
    clock: Any
    people: dict[str, Actor] = field(default_factory=dict)
    instruments: dict[str, str] = field(default_factory=dict)
    recipe: str = ""
    khp: str = ""
    lot: str = ""
    bottle: str = ""
    #: Monte Carlo trials of an evaluation; none, but where the story is about the number.
    trials: int = 0

    def act(self, procedure: Callable[..., Any], command: Any, who: str, **more: Any) -> Any:
        """Let somebody do something."""
        actor = self.people[who]
        return self.transactions.write(
            lambda session: procedure(session, command, actor=actor, now=self.clock(), **more)
        )

    def read(self, sheet: Callable[..., Any], *given: Any, **more: Any) -> Any:
        """Read something now."""
        return self.transactions.read(
            lambda session: sheet(session, *given, now=self.clock(), **more)
        )

    def proof(self, who: str) -> Proof:
        """Return the proof that somebody gave the password just now."""
        return Proof(self.people[who].person_id, self.clock())

    def add_instrument(self, kind: str, name: str, due_on: str) -> str:
        """Let the keeper register an instrument with QUAM's statement of it."""
        identity, document = INSTRUMENTS[kind]
        command = RegisterInstrument(kind, name, "Holm", "example", "17", "Bench 1", **identity)
        instrument = self.act(register_instrument, command, "keeper")
        calibration = RecordCalibration(
            instrument, "C-17", "calibration house", "2025-04-03", due_on, "12 months", document
        )
        self.act(record_calibration, calibration, "keeper")
        return instrument

    def begin(self, who: str = "analyst", **other: Any) -> str:
        """Begin a sheet for the lot of the bottle."""
        given = {f"{kind}_id": key for kind, key in self.instruments.items()}
        command = BeginSheet(self.bottle, self.recipe, self.khp, **given | other)
        return self.act(begin_sheet, command, who)

    def write(self, sheet: str, *lines: tuple[int, str, str], who: str = "analyst") -> None:
        """Write lines (replicate, slot, text)."""
        entries = tuple(NewEntry(str(uuid4()), *line) for line in lines)
        self.act(write_entries, WriteEntries(sheet, entries), who)

    def correct(self, sheet: str, line: tuple[int, str, str], reason: str) -> None:
        """Strike what stands in a row and write it anew."""
        replicate, slot, text = line
        stands = standing(self.facts(sheet).entries)[(replicate, slot, 1)]
        entry = NewEntry(str(uuid4()), *line, strikes=stands.id, reason=reason)
        self.act(write_entries, WriteEntries(sheet, (entry,)), "analyst")

    def titrate(self, sheet: str, *replicates: tuple[str, str, str, str]) -> None:
        """Write a sheet: indicator and temperature, then a replicate every twelve minutes."""
        self.write(sheet, (0, "indicator", "phenolphthalein"), (0, "temperature", "20"))
        for number, readings in enumerate(replicates, start=1):
            self.clock.move(minutes=12)
            lines = [(number, slot, text) for slot, text in zip(SLOTS, readings, strict=True)]
            self.write(sheet, *lines)
        self.clock.move(minutes=12)

    def evaluate(self, sheet: str) -> Any:
        """Evaluate a sheet for hand in, with nothing open."""
        actor = self.people["analyst"]
        prepared = self.read(prepare_hand_in, sheet, actor=actor)
        return evaluate_sheet(prepared, trials=self.trials)

    def hand_in(self, sheet: str, **reasons: str) -> Any:
        """Hand in a sheet with the reasons for what fails (underscores stand for spaces)."""
        evaluated = self.evaluate(sheet)
        named = {name.replace("_", " "): reason for name, reason in reasons.items()}
        command = HandIn(sheet, evaluated.revision, named)
        return self.act(
            lambda session, command, **more: hand_in_sheet(session, command, evaluated, **more),
            command, "analyst", proof=self.proof("analyst"),
        )  # fmt: skip

    def countersign(self, sheet: str, *accepted: str, who: str = "second") -> Any:
        """Countersign a sheet an hour later, accepting findings by name."""
        self.clock.move(hours=1)
        seen = self.transactions.read(lambda session: last_act_of_sheet(session, sheet))
        command = Countersign(sheet, self.facts(sheet).revision, accepted, trail_seen=seen)
        return self.act(countersign_sheet, command, who, proof=self.proof(who))

    def facts(self, sheet: str) -> Any:
        """Return all that a sheet holds."""
        return self.transactions.read(lambda session: load_sheet_facts(session, sheet))

    def shelf(self) -> dict[str, Any]:
        """Return what a visitor gets of the bottle now."""
        return self.read(look_up, self.bottle, at=None)

    def acts(self) -> list[tuple[str, str]]:
        """Return who did what, oldest first."""
        return self.transactions.read(
            lambda session: [
                (row.person_name, row.act) for row in session.query(TrailRow).order_by(TrailRow.seq)
            ]
        )

    def chain(self) -> trail.TrailCheck:
        """Return whether the trail's chain holds."""
        return self.transactions.read(trail.check)


@pytest.fixture
def quam(transactions: Any, clock: Any) -> Laboratory:
    """The laboratory with papers as QUAM A2 states them, and a lot in a bottle."""
    lab = Laboratory(transactions, clock)
    name, roles = PEOPLE["steward"]
    first = SetUpLaboratory("Test laboratory", "1 Filter Lane", ZONE, "steward", name, "not kept")
    key = transactions.write(
        lambda session: set_up_laboratory(session, first, password_hash="none", now=clock())
    )
    for part, (name, roles) in PEOPLE.items():
        if part != "steward":
            command = AddPerson(part, name, roles, "not kept")
            key = lab.act(add_person, command, "steward", password_hash="none")
        lab.people[part] = Actor(key, name, initials_of(name), frozenset(roles), ZONE)
    for kind in INSTRUMENTS:
        lab.instruments[kind] = lab.add_instrument(kind, f"{kind.capitalize()} 1", "2026-11-03")
    khp = ReceiveStandardLot(
        "KHP lot 7", "KHP", "RM-7", "reference house", "2028-01-31", "expiry", **KHP
    )
    lab.khp = lab.act(receive_standard_lot, khp, "keeper")
    lab.recipe = lab.act(write_recipe, WriteRecipe("NaOH against KHP", RECIPE), "keeper")
    lab.lot = lab.act(make_up_lot, MakeUpLot("NaOH", "0.1"), "analyst")
    (lab.bottle,) = lab.act(fill_bottles, FillBottles(lab.lot, "Shelf 1", "1000"), "analyst")
    return lab

"""A small laboratory, set up through the procedures: who works there, and what a sheet needs."""

import os
import shutil
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field, replace
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Any
from uuid import uuid4

import pytest
import sqlalchemy as sa

from server.evaluation.from_sheet import EvaluatedSheet, evaluate_sheet
from server.lab.actor import Actor, Proof
from server.lab.ink import standing
from server.lab.people import initials_of
from server.procedures.bench import BeginSheet, begin_sheet
from server.procedures.countersign import Countersign, countersign_sheet
from server.procedures.entries import NewEntry, WriteEntries, Written, write_entries
from server.procedures.hand_in import HandIn, failing, hand_in_sheet, prepare_hand_in
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
from server.records.database import Database, open_database, sqlite_url
from server.records.queries.load_sheet import load_sheet_facts
from server.records.queries.sheet_trail import last_act_of_sheet
from server.records.tables.trail import TrailRow
from server.records.transaction import Transactions

#: The time at which the tests' clock stands at first.
START = datetime(2026, 5, 4, 8, 30, tzinfo=UTC)
ZONE = "Europe/Berlin"
#: Who works here, by the word that the tests use, with the roles that each holds.
PEOPLE = {
    "steward": ("Runa Askvall", ("steward",)),
    "analyst": ("Ida Mohnke", ("analyst",)),
    "second analyst": ("Pavel Orrin", ("analyst",)),
    "countersigner": ("Lene Tiedt", ("countersigner",)),
    "second countersigner": ("Sami Vaar", ("countersigner",)),
    "keeper": ("Nils Obermark", ("keeper",)),
    "second keeper": ("Tove Brandis", ("keeper",)),
    "reader": ("Alba Quist", ("reader",)),
    "all hands": ("Mika Dorn", ("analyst", "countersigner", "keeper", "reader")),
}
RECIPE = {
    "title": "Sodium hydroxide 0.1 mol/L against potassium hydrogen phthalate",
    "titrant": {"substance": "NaOH", "nominal": "0.1", "medium": "water"},
    "route": "weighed",
    "standard": "KHP",
    "weighing": "difference",
    "replicates": 3,
    "end_point": {"mode": "visual", "indicator": "phenolphthalein"},
    "blank": "none",
    "repeatability": {"relative_u": "0.0005", "applies_to": "one", "source": "validation"},
    "buoyancy": False,
    "temperature": "once",
    "interval_days": 14,
    "notice_days": 3,
    "steps": [{"key": "mixed", "label": "Lot mixed thoroughly", "when": "before"}],
    "limits": {"replicates_least": "3", "replicates_advised": "3"},
}
BALANCE = {
    "identity": {"resolution": "0.0001", "capacity": "220"},
    "document": {"linearity": {"unit": "g", "half_width": "0.00015", "shape": "rectangular"}},
}
BURETTE = {
    "identity": {"resolution": "0.01", "capacity": "25"},
    "document": {
        "capacity": {"value": "25", "unit": "mL"},
        "delivery": {"unit": "mL", "half_width": "0.02", "shape": "triangular"},
        "glass_expansion": "9.9e-6",
    },
}
THERMOMETER = {
    "identity": {"resolution": "0.1"},
    "document": {"reading": {"unit": "Cel", "U": "0.2", "k": "2"}},
}
#: Rows of the sheet, then three replicates near 0.1 mol/L that hold every limit.
SHEET_LINES = (
    (0, "step:mixed", "done"),
    (0, "indicator", "phenolphthalein"),
    (0, "temperature", "20.4"),
)
REPLICATES = (
    ("60.4084", "60.0000", "0.00", "20.00"),
    ("60.4102", "60.0000", "0.00", "20.08"),
    ("60.4066", "60.0000", "0.00", "19.91"),
)
SLOTS = ("container_and_standard", "container_less_standard", "burette_start", "burette_end")
#: No Monte Carlo: these tests are about acts; tests/journeys hands in with the simulation.
TRIALS = 0


def replicate_lines(number: int, readings: tuple[str, str, str, str]) -> list[tuple[int, str, str]]:
    """Return one replicate's lines: number, slot, text."""
    return [(number, slot, text) for slot, text in zip(SLOTS, readings, strict=True)]


def all_lines() -> list[tuple[int, str, str]]:
    """Return the lines of a sheet whose findings all hold."""
    lines = list(SHEET_LINES)
    for number, readings in enumerate(REPLICATES, start=1):
        lines += replicate_lines(number, readings)
    return lines


def new_entry(replicate: int, slot: str, text: str, **more: Any) -> NewEntry:
    """Return an entry with a UUID of its own."""
    return NewEntry(id=str(uuid4()), replicate=replicate, slot=slot, text=text, **more)


@dataclass
class Laboratory:
    """The laboratory at work: each act in its own transaction, at the clock's time."""

    transactions: Transactions
    clock: Any
    people: dict[str, Actor] = field(default_factory=dict)
    recipe: str = ""
    standard_lot: str = ""
    balance: str = ""
    burette: str = ""
    thermometer: str = ""
    lot: str = ""
    bottle: str = ""
    sheet: str = ""

    def act(self, procedure: Callable[..., Any], command: Any, who: str, **more: Any) -> Any:
        """Let somebody do something."""
        actor = self.people[who]
        return self.transactions.write(
            lambda session: procedure(session, command, actor=actor, now=self.clock(), **more)
        )

    def proof(self, who: str) -> Proof:
        """Return the proof that somebody gave the password just now."""
        return Proof(self.people[who].person_id, self.clock())

    def facts(self, sheet: str | None = None) -> Any:
        """Return a sheet's facts, of the begun sheet where none is named."""
        return self.transactions.read(
            lambda session: load_sheet_facts(session, sheet or self.sheet)
        )

    def register(self, kind: str, name: str, stated: dict[str, Any], due_on: str) -> str:
        """Let the keeper register an instrument with a calibration."""
        command = RegisterInstrument(
            kind, name, "Holm", "example", "17", "Bench 1", **stated["identity"]
        )
        instrument = self.act(register_instrument, command, "keeper")
        self.calibrate(instrument, stated["document"], due_on)
        return instrument

    def calibrate(self, instrument: str, document: dict[str, Any], due_on: str) -> str:
        """Let the keeper record a calibration."""
        command = RecordCalibration(
            instrument, "C-17", "calibration house", "2026-01-12", due_on, "own plan", document
        )
        return self.act(record_calibration, command, "keeper")

    def begin(self, who: str = "analyst", **other: Any) -> str:
        """Begin a sheet on the lot and return its id."""
        given = {
            "lot_code": self.lot,
            "recipe_id": self.recipe,
            "standard_lot_id": self.standard_lot,
            "balance_id": self.balance,
            "burette_id": self.burette,
            "thermometer_id": self.thermometer,
        }
        return self.act(begin_sheet, BeginSheet(**given | other), who)

    def write(
        self, *entries: NewEntry, who: str = "analyst", sheet: str = ""
    ) -> tuple[Written, ...]:
        """Write entries on a sheet."""
        return self.act(write_entries, WriteEntries(sheet or self.sheet, entries), who)

    def write_lines(self, lines: Any, who: str = "analyst", sheet: str = "") -> tuple[Written, ...]:
        """Write lines (replicate, slot, text) on a sheet."""
        return self.write(*(new_entry(*line) for line in lines), who=who, sheet=sheet)

    def correct(
        self, place: tuple[int, str, int], text: str, reason: str, who: str = "analyst"
    ) -> None:
        """Strike what stands in a row of the sheet and write anew."""
        stands = standing(self.facts().entries)[place]
        replicate, slot, segment = place
        self.write(
            new_entry(replicate, slot, text, segment=segment, strikes=stands.id, reason=reason),
            who=who,
        )

    def evaluate(self, sheet: str = "", who: str = "analyst") -> EvaluatedSheet:
        """Read a sheet for hand in and evaluate it with nothing open."""
        actor = self.people[who]
        prepared = self.transactions.read(
            lambda session: prepare_hand_in(
                session, sheet or self.sheet, actor=actor, now=self.clock()
            )
        )
        return evaluate_sheet(prepared, trials=TRIALS)

    def hand_in(
        self, sheet: str = "", who: str = "analyst", reasons: dict[str, str] | None = None
    ) -> dict[str, Any]:
        """Evaluate a sheet and hand it in, with a reason for all that fails where none is given."""
        evaluated = self.evaluate(sheet, who)
        names = failing(evaluated.result["findings"])
        given = dict.fromkeys(names, "seen and accepted") if reasons is None else reasons
        command = HandIn(sheet or self.sheet, evaluated.revision, given)
        return self.act(
            lambda session, command, **more: hand_in_sheet(session, command, evaluated, **more),
            command, who, proof=self.proof(who),
        )  # fmt: skip

    def countersign(self, sheet: str = "", who: str = "countersigner") -> dict[str, Any]:
        """Countersign a sheet five minutes later, accepting by name what fails."""
        self.clock.move(minutes=5)
        facts = self.facts(sheet or self.sheet)
        accepted = failing(facts.evaluation.result["findings"]) if facts.evaluation else []
        seen = self.last_act(sheet)
        command = Countersign(sheet or self.sheet, facts.revision, tuple(accepted), trail_seen=seen)
        return self.act(countersign_sheet, command, who, proof=self.proof(who))

    def last_act(self, sheet: str = "") -> int:
        """Return the number of the last act in a sheet's trail."""
        return self.transactions.read(
            lambda session: last_act_of_sheet(session, sheet or self.sheet)
        )

    def certify(self, sheet: str = "") -> dict[str, Any]:
        """Write a whole sheet, hand it in and countersign it."""
        self.write_lines(all_lines(), sheet=sheet)
        self.hand_in(sheet)
        return self.countersign(sheet)

    def acts(self) -> list[tuple[str, str, str]]:
        """Return the trail as who, act, kind, oldest first."""
        return self.transactions.read(
            lambda session: [
                (row.person_name, row.act, row.kind)
                for row in session.query(TrailRow).order_by(TrailRow.seq)
            ]
        )

    def chain(self) -> trail.TrailCheck:
        """Return whether the trail's chain holds."""
        return self.transactions.read(trail.check)


def set_up(transactions: Transactions, clock: Callable[[], datetime]) -> Laboratory:
    """Return a laboratory with its people, papers, a lot in a bottle and a begun sheet."""
    lab = Laboratory(transactions, clock)
    first = SetUpLaboratory(
        "Test laboratory", "1 Filter Lane", ZONE, "steward", PEOPLE["steward"][0], "not kept"
    )
    steward = transactions.write(
        lambda session: set_up_laboratory(session, first, password_hash="none", now=clock())
    )
    for word, (name, roles) in PEOPLE.items():
        if word == "steward":
            person_id = steward
        else:
            command = AddPerson(word.replace(" ", "."), name, roles, "not kept")
            person_id = lab.act(add_person, command, "steward", password_hash="none")
        lab.people[word] = Actor(person_id, name, initials_of(name), frozenset(roles), ZONE)
    lab.balance = lab.register("balance", "Balance B-1", BALANCE, "2026-12-31")
    lab.burette = lab.register("burette", "Burette U-1", BURETTE, "2026-12-31")
    lab.thermometer = lab.register("thermometer", "Thermometer T-1", THERMOMETER, "2026-12-31")
    received = ReceiveStandardLot(
        "KHP lot 7", "KHP", "RM-7", "reference house", "2028-01-31", "expiry on the certificate",
        {"value": "0.9999", "U": "0.0004", "k": "2"},
    )  # fmt: skip
    lab.standard_lot = lab.act(receive_standard_lot, received, "keeper")
    lab.recipe = lab.act(write_recipe, WriteRecipe("NaOH against KHP", RECIPE), "keeper")
    lab.lot = lab.act(make_up_lot, MakeUpLot("NaOH", "0.1"), "second analyst")
    (lab.bottle,) = lab.act(fill_bottles, FillBottles(lab.lot, "Shelf 1", "1000"), "second analyst")
    lab.sheet = lab.begin()
    return lab


def on_server(statement: str) -> None:
    """Run a statement on the PostgreSQL server of the tests, outside any transaction."""
    engine = sa.create_engine(address_of(None), isolation_level="AUTOCOMMIT")
    with engine.connect() as connection:
        connection.exec_driver_sql(statement)
    engine.dispose()


def address_of(name: str | None) -> str:
    """Return the URL of a database on the PostgreSQL server of the tests."""
    url = sa.make_url(os.environ["TITRANT_LEDGER_TEST_DATABASE_URL"])
    url = url.set(drivername="postgresql+psycopg")
    return (url.set(database=name) if name else url).render_as_string(hide_password=False)


@pytest.fixture(scope="session")
def lab_in_file(fresh_sqlite: Callable[[], Database]) -> tuple[Path, Laboratory]:
    """The small laboratory in a SQLite file, to be copied."""
    database = fresh_sqlite()
    transactions = Transactions(database)
    built = set_up(transactions, lambda: START)
    with database.engine.connect() as connection:
        connection.connection.execute("PRAGMA wal_checkpoint(TRUNCATE)")
    transactions.close()
    return Path(str(database.url.database)), built


@pytest.fixture(scope="session")
def lab_on_server(request: pytest.FixtureRequest) -> Iterator[tuple[str, Laboratory]]:
    """The small laboratory in a PostgreSQL database, to be copied."""
    template = request.getfixturevalue("postgres_template")
    name = f"lab_{uuid4().hex[:12]}"
    on_server(f'CREATE DATABASE "{name}" TEMPLATE "{template}"')
    transactions = Transactions(open_database(address_of(name)))
    built = set_up(transactions, lambda: START)
    transactions.close()
    yield name, built
    on_server(f'DROP DATABASE "{name}" WITH (FORCE)')


@pytest.fixture
def sqlite_lab(lab_in_file: tuple[Path, Laboratory], tmp_path: Path, clock: Any) -> Any:
    """The small laboratory on SQLite alone, for rules that do not depend on the engine."""
    source, built = lab_in_file
    path = tmp_path / "laboratory.sqlite"
    shutil.copy(source, path)
    transactions = Transactions(open_database(sqlite_url(path)))
    yield replace(built, transactions=transactions, clock=clock)
    transactions.close()


@pytest.fixture
def postgres_lab(request: pytest.FixtureRequest, clock: Any) -> Any:
    """The small laboratory on PostgreSQL alone."""
    source, built = request.getfixturevalue("lab_on_server")
    name = f"test_{uuid4().hex[:12]}"
    on_server(f'CREATE DATABASE "{name}" TEMPLATE "{source}"')
    transactions = Transactions(open_database(address_of(name)))
    yield replace(built, transactions=transactions, clock=clock)
    transactions.close()
    on_server(f'DROP DATABASE "{name}" WITH (FORCE)')


@pytest.fixture(params=["sqlite", pytest.param("postgres", marks=pytest.mark.postgres)])
def lab(request: pytest.FixtureRequest) -> Laboratory:
    """The small laboratory on each engine."""
    found: Laboratory = request.getfixturevalue(f"{request.param}_lab")
    return found


@pytest.fixture(scope="module")
def shared_lab(fresh_sqlite: Callable[[], Database]) -> Iterator[Laboratory]:
    """One small laboratory for all tests of a module that change nothing in it."""
    found = Transactions(fresh_sqlite())
    yield set_up(found, lambda: START)
    found.close()


def certify_at_start(built: Laboratory, transactions: Transactions) -> Laboratory:
    """Return the small laboratory with the certificate of its lot, issued five minutes later."""

    class Moving:
        at = START

        def __call__(self) -> datetime:
            return self.at

        def move(self, **span: float) -> datetime:
            self.at += timedelta(**span)
            return self.at

    lab = replace(built, transactions=transactions, clock=Moving())
    lab.certify()
    return lab


@pytest.fixture(scope="session")
def certified_file(
    lab_in_file: tuple[Path, Laboratory], tmp_path_factory: pytest.TempPathFactory
) -> tuple[Path, Laboratory]:
    """The small laboratory with a certificate, in a SQLite file to be copied."""
    source, built = lab_in_file
    path = tmp_path_factory.mktemp("certified") / "laboratory.sqlite"
    shutil.copy(source, path)
    database = open_database(sqlite_url(path))
    transactions = Transactions(database)
    certify_at_start(built, transactions)
    with database.engine.connect() as connection:
        connection.connection.execute("PRAGMA wal_checkpoint(TRUNCATE)")
    transactions.close()
    return path, built


@pytest.fixture(scope="session")
def certified_on_server(
    lab_on_server: tuple[str, Laboratory],
) -> Iterator[tuple[str, Laboratory]]:
    """The small laboratory with a certificate, in a PostgreSQL database to be copied."""
    source, built = lab_on_server
    name = f"certified_{uuid4().hex[:12]}"
    on_server(f'CREATE DATABASE "{name}" TEMPLATE "{source}"')
    transactions = Transactions(open_database(address_of(name)))
    certify_at_start(built, transactions)
    transactions.close()
    yield name, built
    on_server(f'DROP DATABASE "{name}" WITH (FORCE)')


@pytest.fixture(params=["sqlite", pytest.param("postgres", marks=pytest.mark.postgres)])
def certified(request: pytest.FixtureRequest, tmp_path: Path, clock: Any) -> Iterator[Laboratory]:
    """The small laboratory with a certificate of an hour ago, on each engine."""
    clock.move(hours=1)
    if request.param == "sqlite":
        source, built = request.getfixturevalue("certified_file")
        path = tmp_path / "laboratory.sqlite"
        shutil.copy(source, path)
        transactions = Transactions(open_database(sqlite_url(path)))
        yield replace(built, transactions=transactions, clock=clock)
        transactions.close()
        return
    template, built = request.getfixturevalue("certified_on_server")
    name = f"test_{uuid4().hex[:12]}"
    on_server(f'CREATE DATABASE "{name}" TEMPLATE "{template}"')
    transactions = Transactions(open_database(address_of(name)))
    yield replace(built, transactions=transactions, clock=clock)
    transactions.close()
    on_server(f'DROP DATABASE "{name}" WITH (FORCE)')

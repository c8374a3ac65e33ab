"""A real Chromium against a real server; the clock is the only thing that is made up."""

import contextlib
import socket
import threading
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Any

import pytest
import uvicorn

from server.app import build_app
from server.credentials.passwords import hash_password
from server.lab.actor import Actor
from server.lab.people import initials_of
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
from server.records.transaction import Transactions
from server.settings import Settings

CHROMIUM = next(
    (p for p in ("/usr/bin/chromium", "/usr/bin/chromium-browser") if Path(p).exists()), None
)
FLAGS = ["--headless", "--no-sandbox", "--disable-gpu", "--disable-background-networking"]
PASSWORD = "meadow willow heron 4"
ZONE = "Europe/Berlin"
PEOPLE = {
    "runa": ("Runa Askvall", ("steward",)),
    "ida": ("Ida Mohnke", ("analyst", "countersigner")),
    "lene": ("Lene Tiedt", ("countersigner",)),
    "nils": ("Nils Obermark", ("keeper", "analyst")),
}
# The tools of example A2 of EURACHEM/CITAC CG 4 (QUAM:2012)
TOOLS = {
    "balance": ({"resolution": "0.0001", "capacity": "220"}, {
        "linearity": {"unit": "g", "half_width": "0.00015", "shape": "rectangular"},
    }),
    "burette": ({"resolution": "0.01", "capacity": "20"}, {
        "capacity": {"value": "20", "unit": "mL"},
        "delivery": {"unit": "mL", "half_width": "0.03", "shape": "triangular"},
    }),
    "thermometer": ({"resolution": "0.1"}, {"reading": {"unit": "Cel", "U": "3", "k": "1.96"}}),
}  # fmt: skip
RECIPE = {
    "title": "Sodium hydroxide against potassium hydrogen phthalate",
    "titrant": {"substance": "NaOH", "nominal": "0.1", "medium": "water"},
    "standard": "KHP",
    "weighing": "difference",
    "replicates": 1,
    "end_point": {"mode": "visual", "indicator": "phenolphthalein"},
    "buoyancy": False,
    "temperature": "once",
    "liquid_expansion": {"value": "2.1e-4", "unit": "1/K"},
    "repeatability": {"relative_u": "0.0005", "applies_to": "mean", "source": "validation"},
    "interval_days": 14,
}


class MovingClock:
    """A clock that moves a second each time it is read, so that no two acts share an instant."""

    def __init__(self, at: datetime) -> None:
        self._at, self._lock = at, threading.Lock()

    def __call__(self) -> datetime:
        with self._lock:
            self._at += timedelta(seconds=1)
            return self._at


@dataclass
class Laboratory:
    """A served laboratory: its address, its codes, and how its people are called."""

    address: str
    transactions: Transactions
    clock: Callable[[], datetime]
    lot: str
    bottle: str
    people: dict[str, Actor] = field(default_factory=dict)


@pytest.fixture(scope="module")
def laboratory(fresh_sqlite: Callable[[], Any], tmp_path_factory: Any) -> Iterator[Laboratory]:
    """The laboratory of QUAM A2, served on a port of its own."""
    transactions = Transactions(fresh_sqlite())
    clock = MovingClock(datetime(2026, 5, 4, 8, 30, tzinfo=UTC))
    people, lot, bottle = set_up(transactions, clock)
    settings = Settings(data=tmp_path_factory.mktemp("data"), database_url="sqlite://")
    app = build_app(settings, transactions=transactions, clock=clock)
    with served(app) as address:
        yield Laboratory(address, transactions, clock, lot, bottle, people)
    transactions.close()


@contextlib.contextmanager
def served(app: Any) -> Iterator[str]:
    """Serve an application in a thread until it is no longer needed."""
    listener = socket.socket()
    listener.bind(("127.0.0.1", 0))
    server = uvicorn.Server(uvicorn.Config(app, log_level="error", ws="none"))
    thread = threading.Thread(target=server.run, kwargs={"sockets": [listener]}, daemon=True)
    thread.start()
    yield f"http://127.0.0.1:{listener.getsockname()[1]}"
    server.should_exit = True
    thread.join(timeout=20)
    listener.close()


def set_up(
    transactions: Transactions, clock: Callable[[], datetime]
) -> tuple[dict[str, Actor], str, str]:
    """Return the people, the code of the lot and that of its bottle."""
    people: dict[str, Actor] = {}
    hashed = hash_password(PASSWORD)

    def act(procedure: Callable[..., Any], command: Any, who: str, **more: Any) -> Any:
        return transactions.write(
            lambda session: procedure(session, command, actor=people[who], now=clock(), **more)
        )

    for name, (printed, roles) in PEOPLE.items():
        if name == "runa":
            first = SetUpLaboratory(
                "Test laboratory", "1 Filter Lane", ZONE, name, printed, PASSWORD
            )
            person_id = transactions.write(
                lambda session, first=first: set_up_laboratory(
                    session, first, password_hash=hashed, now=clock()
                )
            )
        else:
            command = AddPerson(name, printed, roles, PASSWORD)
            person_id = act(add_person, command, "runa", password_hash=hashed)
        people[name] = Actor(person_id, printed, initials_of(printed), frozenset(roles), ZONE)
    for kind, (identity, document) in TOOLS.items():
        register = RegisterInstrument(
            kind, f"{kind.title()} 1", "Holm", "example", "17", "Bench 1", **identity
        )
        instrument = act(register_instrument, register, "nils")
        calibration = RecordCalibration(
            instrument, f"C-{kind}", "calibration house", "2026-01-12", "2026-12-31", "own plan",
            document,
        )  # fmt: skip
        act(record_calibration, calibration, "nils")
    received = ReceiveStandardLot(
        "KHP lot 7", "KHP", "RM-7", "reference house", "2028-01-31", "expiry on the certificate",
        {"value": "1.0", "half_width": "0.0005", "shape": "rectangular"},
        molar_mass={"value": "204.2212", "unit": "g/mol", "u": "0.0038"},
    )  # fmt: skip
    act(receive_standard_lot, received, "nils")
    act(write_recipe, WriteRecipe("NaOH against KHP", RECIPE), "nils")
    lot = act(make_up_lot, MakeUpLot("NaOH", "0.1"), "nils")
    (bottle,) = act(fill_bottles, FillBottles(lot, "Shelf 1", "1000"), "nils")
    return people, lot, bottle


@pytest.fixture(scope="session")
def chromium(request: pytest.FixtureRequest) -> Iterator[Any]:
    """One Chromium for all browser tests."""
    if CHROMIUM is None:
        request.getfixturevalue("missing")("Chromium is missing: install Debian's chromium")
    from playwright.sync_api import sync_playwright

    with sync_playwright() as playwright:
        browser = playwright.chromium.launch(executable_path=CHROMIUM, args=FLAGS)
        yield browser
        browser.close()


class Desk:
    """One person's browser; it keeps every error and every breach of the content policy."""

    def __init__(
        self, chromium: Any, address: str, *, width: int = 820, height: int = 1180
    ) -> None:
        self.context = chromium.new_context(
            base_url=address, viewport={"width": width, "height": height}, has_touch=True
        )
        self.context.set_default_timeout(15_000)
        self.wrong: list[str] = []
        self.context.add_init_script(
            "document.addEventListener('securitypolicyviolation',"
            " (e) => console.error('policy: ' + e.violatedDirective + ' ' + e.blockedURI))"
        )
        self.page = self.context.new_page()
        self.page.on("console", self._heard)
        self.page.on("pageerror", lambda error: self.wrong.append(str(error)))

    def _heard(self, message: Any) -> None:
        # a refused form answers 403, 409 or 422: Chromium calls that an error of loading
        if message.type == "error" and "Failed to load resource" not in message.text:
            self.wrong.append(message.text)

    def sign_in(self, name: str) -> None:
        self.page.goto("/sign-in")
        self.page.get_by_label("Sign-in name").fill(name)
        self.page.get_by_label("Password").fill(PASSWORD)
        self.page.get_by_role("main").get_by_role("button", name="Sign in").click()
        self.page.wait_for_url(lambda url: "sign-in" not in url)

    def close(self) -> None:
        self.context.close()
        assert self.wrong == []


@pytest.fixture
def desks(chromium: Any, laboratory: Laboratory) -> Iterator[Callable[..., Desk]]:
    """A maker of browsers; each must end without an error or a breach of policy."""
    made: list[Desk] = []

    def make(name: str | None = None, **size: int) -> Desk:
        desk = Desk(chromium, laboratory.address, **size)
        made.append(desk)
        if name is not None:
            desk.sign_in(name)
        return desk

    yield make
    for desk in made:
        desk.close()

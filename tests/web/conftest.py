"""The demonstration laboratory behind the whole application, over https."""

import shutil
from collections.abc import Callable, Iterator
from dataclasses import dataclass, field
from datetime import UTC, datetime
from pathlib import Path
from typing import Any
from uuid import uuid4

import pytest
from fastapi import FastAPI
from fastapi.testclient import TestClient

from server.app import build_app
from server.credentials.passwords import hash_password
from server.demo.laboratory import DemoSummary, fill_demo
from server.lab.actor import Actor
from server.procedures.people import AddPerson, add_person
from server.records.database import open_database, sqlite_url
from server.records.transaction import Transactions
from server.settings import Settings

NOW = datetime(2026, 5, 4, 8, 30, tzinfo=UTC)
SETUP_CODE = "7TESTED7"
MORE_PEOPLE = {"rosa": ["reader"], "cleo": ["countersigner"], "tove": ["analyst", "countersigner"]}
STEWARD = frozenset({"steward"})
ONE_OF_EACH = {
    "analyst": "imke",
    "countersigner": "cleo",
    "keeper": "jonas",
    "steward": "marisol",
    "reader": "rosa",
}


@dataclass
class Web:
    """The application with its people; ``roles`` names one who holds that role alone."""

    app: FastAPI
    demo: DemoSummary
    passwords: dict[str, str]
    clock: Any
    clients: list[TestClient] = field(default_factory=list)
    roles: dict[str, str] = field(default_factory=lambda: dict(ONE_OF_EACH))

    def visitor(self) -> TestClient:
        """A browser that is not signed in."""
        client = TestClient(self.app, base_url="https://testserver", follow_redirects=False)
        self.clients.append(client)
        return client

    def client(self, name: str) -> "Hand":
        """A browser with somebody signed in."""
        client = self.visitor()
        answer = client.post("/api/session", json={"name": name, "password": self.passwords[name]})
        assert answer.status_code == 201, answer.text
        return Hand(client, answer.json()["form_token"], self.passwords[name])

    @property
    def transactions(self) -> Transactions:
        found: Transactions = self.app.state.parts.transactions
        return found


@dataclass
class Hand:
    """Somebody at a browser: sends forms and JSON with the token of the session."""

    client: TestClient
    token: str
    password: str

    def get(self, url: str, **more: Any) -> Any:
        return self.client.get(url, **more)

    def form(self, url: str, *, key: str | None = None, **fields: Any) -> Any:
        sent = {"form_token": self.token, "key": key or str(uuid4()), **fields}
        return self.client.post(url, data=sent)

    def post(self, url: str, body: Any = None, **headers: str) -> Any:
        sent = {"X-Form-Token": self.token, **headers}
        return self.client.post(url, json=body if body is not None else {}, headers=sent)


@pytest.fixture(scope="session")
def demo_file(
    fresh_sqlite: Callable[[], Any], tmp_path_factory: pytest.TempPathFactory
) -> tuple[Path, DemoSummary]:
    """A SQLite file with the demonstration laboratory, made once."""
    transactions = Transactions(fresh_sqlite())
    summary = fill_demo(transactions, now=NOW, zone="Europe/Zurich", progress=lambda _: None)
    for name, roles in MORE_PEOPLE.items():
        _add(transactions, name, roles)
    path = tmp_path_factory.mktemp("demo") / "ledger.sqlite"
    with transactions.database.engine.connect() as connection:
        connection.connection.execute("VACUUM INTO ?", (str(path),))
    transactions.close()
    return path, summary


def _words_of(name: str) -> str:
    return f"the words of {name}"


def _add(transactions: Transactions, name: str, roles: list[str]) -> None:
    """Add somebody with roles that nobody of the demonstration holds alone."""
    steward = Actor("00000000-0000-4000-8000-000000000000", "Nobody", "N", STEWARD, "UTC")
    command = AddPerson(name, f"{name.title()} Ambler", tuple(roles), _words_of(name))
    hashed = hash_password(command.password)
    transactions.write(
        lambda session: add_person(session, command, password_hash=hashed, actor=steward, now=NOW)
    )


@pytest.fixture(scope="module")
def start_web(
    demo_file: tuple[Path, DemoSummary], tmp_path_factory: pytest.TempPathFactory
) -> Iterator[Callable[[Any], Web]]:
    """Starts the application on a copy of the demonstration laboratory."""
    started: list[Web] = []

    def start(clock: Any) -> Web:
        path, summary = demo_file
        data = tmp_path_factory.mktemp("data")
        copy = data / "ledger.sqlite"
        shutil.copy(path, copy)
        settings = Settings(data=data, database_url=sqlite_url(copy))
        transactions = Transactions(open_database(settings.database_url))
        app = build_app(settings, transactions=transactions, clock=clock, setup_code=SETUP_CODE)
        passwords = {one.sign_in_name: one.password for one in summary.people}
        passwords |= {name: _words_of(name) for name in MORE_PEOPLE}
        web = Web(app, summary, passwords, clock)
        started.append(web)
        return web

    yield start
    for web in started:
        for client in web.clients:
            client.close()
        web.transactions.close()


class Clock:
    """A clock that stands until it is moved."""

    def __init__(self) -> None:
        self.at = NOW

    def __call__(self) -> datetime:
        return self.at


@pytest.fixture
def web(start_web: Callable[[Any], Web]) -> Web:
    """The application on a laboratory of this test's own."""
    return start_web(Clock())


@pytest.fixture(scope="module")
def shared_web(start_web: Callable[[Any], Web]) -> Web:
    """The application on a laboratory that a module's tests share, for what changes nothing."""
    return start_web(Clock())

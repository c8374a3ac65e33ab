"""The demonstration laboratory's certificates as they leave it, read once."""

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from datetime import UTC, datetime
from typing import Any

import pytest
import sqlalchemy as sa

from server.credentials.signing_keys import SigningKeys, open_signing_keys
from server.demo.laboratory import fill_demo
from server.lab.actor import Actor
from server.records.database import Database
from server.records.tables.bench import Certificate, Evaluation
from server.records.tables.people import Person
from server.records.transaction import Transactions
from server.reports.issued import Issued, issued_from
from server.sheets.certificate_page import open_certificate, open_certificate_document

NOW = datetime(2026, 12, 1, 13, 5, tzinfo=UTC)
ZONE = "Europe/Zurich"


@dataclass(frozen=True)
class Laboratory:
    """The demonstration laboratory, read as its analyst Bashir."""

    transactions: Transactions
    reader: Actor

    def read(self, opened: Callable[..., Any], *given: Any) -> Any:
        return self.transactions.read(
            lambda session: opened(session, *given, actor=self.reader, now=NOW)
        )

    def snapshot(self, number: str) -> str:
        asked = (
            sa.select(Evaluation.snapshot)
            .join(Certificate, Certificate.evaluation_id == Evaluation.id)
            .where(Certificate.number == number)
        )
        text: str = self.transactions.read(lambda session: session.scalars(asked).one())
        return text

    def issued(self, number: str) -> Issued:
        found = self.read(open_certificate_document, number)
        page = self.read(open_certificate, number)
        replaces = found["document"]["replaces"]
        previous = self.read(open_certificate_document, replaces) if replaces else None
        return issued_from(
            found,
            signatures_hold=tuple(one.holds for one in page.signatures),
            snapshot=self.snapshot(number),
            previous=previous["document"] if previous else None,
            url=f"https://ledger.example/certificates/{number}",
        )


@pytest.fixture(scope="session")
def laboratory(fresh_sqlite: Callable[[], Database]) -> Iterator[Laboratory]:
    """Nobody writes in this one."""
    transactions = Transactions(fresh_sqlite())
    fill_demo(transactions, now=NOW, zone=ZONE, progress=lambda _: None)
    asked = sa.select(Person).where(Person.sign_in_name == "bashir")
    reader = transactions.read(
        lambda session: [
            Actor(one.id, one.printed_name, one.initials, frozenset(one.roles), ZONE)
            for one in session.scalars(asked)
        ]
    )[0]
    yield Laboratory(transactions, reader)
    transactions.close()


@pytest.fixture(scope="session")
def issued(laboratory: Laboratory) -> Issued:
    """The certificate that replaces another, with a correction and an accepted finding."""
    return laboratory.issued("TL-2026-0005")


@pytest.fixture(scope="session")
def replaced(laboratory: Laboratory) -> Issued:
    """A certificate that was replaced."""
    return laboratory.issued("TL-2026-0004")


@pytest.fixture(scope="session")
def keys(tmp_path_factory: pytest.TempPathFactory) -> SigningKeys:
    return open_signing_keys(tmp_path_factory.mktemp("data") / "keys", now=NOW)

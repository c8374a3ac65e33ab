"""A burette calibrated weighing by weighing in the browser, and what follows for the next number."""

import re
from uuid import uuid4

import pytest

pytestmark = pytest.mark.browser

#: Made up: reading, grams before and after, of water at 20.0 °C. At 20 mL about 40 µL too much.
WEIGHINGS = [
    ("10", "31.0000", "40.9900"), ("10", "31.2000", "41.1904"), ("18", "30.5000", "48.4850"),
    ("18", "30.7000", "48.6846"), ("20", "30.1000", "50.0830"), ("20", "30.3000", "50.2826"),
]  # fmt: skip
READINGS = (
    ("container_and_standard", "60.5450"), ("container_less_standard", "60.1562"),
    ("burette_start", "0.00"), ("burette_end", "18.64"),
)  # fmt: skip


@pytest.fixture
def own_laboratory(fresh_sqlite, tmp_path):
    """The laboratory of QUAM A2 once more, for a test that changes its burette."""
    from datetime import UTC, datetime

    from conftest_of_browser import Laboratory, MovingClock, served, set_up

    from server.app import build_app
    from server.records.transaction import Transactions
    from server.settings import Settings

    transactions = Transactions(fresh_sqlite())
    clock = MovingClock(datetime(2026, 5, 4, 8, 30, tzinfo=UTC))
    people, lot, bottle = set_up(transactions, clock)
    settings = Settings(data=tmp_path, database_url="sqlite://")
    with served(build_app(settings, transactions=transactions, clock=clock)) as address:
        yield Laboratory(address, transactions, clock, lot, bottle, people)
    transactions.close()

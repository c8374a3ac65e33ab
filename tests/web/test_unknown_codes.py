"""Unknown codes are counted per source, within a minute, in a bounded place."""

from datetime import UTC, datetime, timedelta

import pytest

from server.lab.refusal import TooOften
from server.web import unknown_codes
from server.web.unknown_codes import MOST, WITHIN, UnknownCodes

NOW = datetime(2026, 5, 4, tzinfo=UTC)


def test_source_is_refused_after_the_most_within_a_minute_and_told_how_long() -> None:
    counted = UnknownCodes()
    for n in range(MOST):
        counted.count("here", now=NOW + timedelta(seconds=n))

    with pytest.raises(TooOften) as refused:
        counted.count("here", now=NOW + timedelta(seconds=40))

    assert refused.value.shown["retry_after_s"] == pytest.approx(20)
    counted.count("elsewhere", now=NOW + timedelta(seconds=40))
    counted.count("here", now=NOW + WITHIN)


def test_sources_are_forgotten_when_there_are_too_many(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(unknown_codes, "_MOST_SOURCES", 3)
    counted = UnknownCodes()
    for n in range(20):
        counted.count(f"source {n}", now=NOW)

    assert len(counted._seen) <= 3

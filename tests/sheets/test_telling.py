"""Words for days, spans and quantities."""

from datetime import UTC, datetime, timedelta

import pytest

from server.sheets.parts.certificate_words import end_point_words
from server.sheets.parts.telling import (
    count_words,
    due_words,
    moment_words,
    plain_words,
    quantity_words,
    signed_words,
    span_words,
    typed_day_words,
)

ZONE = "Europe/Zurich"
NOON = datetime(2026, 12, 1, 13, 5, tzinfo=UTC)


def test_moment_is_told_in_the_laboratorys_zone() -> None:
    assert moment_words(NOON, ZONE) == "1 Dec 2026, 14:05"
    assert signed_words(NOON, ZONE) == "1 Dec 2026, 14:05 (Europe/Zurich)"


@pytest.mark.parametrize(
    ("until", "words"),
    [
        (datetime(2026, 12, 1, 23, tzinfo=UTC), "today"),
        (datetime(2026, 12, 2, 23, tzinfo=UTC), "tomorrow"),
        (datetime(2026, 12, 15, 23, tzinfo=UTC), "in 14 days"),
        (datetime(2026, 11, 30, 23, tzinfo=UTC), "yesterday"),
        (datetime(2026, 11, 5, 23, tzinfo=UTC), "26 days ago"),
    ],
)
def test_due_counts_local_days_up_to_the_last_good_one(until, words) -> None:
    assert due_words(until, NOON, ZONE) == words


@pytest.mark.parametrize(
    ("span", "words"),
    [
        (timedelta(seconds=20), "less than a minute"),
        (timedelta(minutes=1), "1 minute"),
        (timedelta(hours=10, minutes=59), "10 hours"),
        (timedelta(days=3), "3 days"),
    ],
)
def test_span_is_told_in_its_largest_unit(span, words) -> None:
    assert span_words(span) == words


def test_typed_day_that_is_none_stays_as_typed() -> None:
    assert typed_day_words("2026-05-31") == "31 May 2026"
    assert typed_day_words("about May") == "about May"
    assert typed_day_words(None) == ""


@pytest.mark.parametrize(
    ("quantity", "words"),
    [
        ({"value": "0.99986", "U": "0.00034", "k": "2"}, "0.99986, U = 0.00034 (k = 2)"),
        ({"unit": "g", "half_width": "0.00015"}, "± 0.00015 g (rectangular)"),
        ({"value": "2.10e-4", "unit": "1/K", "u": "1e-5", "source": "table"},
         "2.10e-4 /K, u = 1e-5 /K, table"),
        (None, ""),
    ],
)  # fmt: skip
def test_quantity_keeps_every_digit_that_was_typed(quantity, words) -> None:
    assert quantity_words(quantity) == words


@pytest.mark.parametrize(
    ("value", "text"), [(0.99986, "0.99986"), (1.0, "1"), (0.0, "0"), (2.1e-5, "0.000021")]
)
def test_plain_words_add_no_zeros(value, text) -> None:
    assert plain_words(value) == text


def test_count_takes_the_plural_from_two_on() -> None:
    assert [count_words(n, "entry", "entries") for n in (0, 1, 2)] == [
        "0 entries",
        "1 entry",
        "2 entries",
    ]


def test_end_point_words_name_the_way_and_its_replicates_where_they_differ():
    ways = [
        {"method": "model fit", "replicates": ["1", "2", "4"]},
        {"method": "first derivative", "replicates": ["3"]},
    ]
    probe = {"mode": "potentiometric", "indicator": None}
    assert end_point_words(probe) == "potentiometric"  # issued before ways were noted
    assert end_point_words({**probe, "methods": ways[:1]}) == "potentiometric, model fit"
    assert end_point_words({**probe, "methods": ways}) == (
        "potentiometric, model fit (replicates 1, 2 and 4) and first derivative (replicate 3)"
    )

from datetime import UTC, date, datetime, timedelta

import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from server.lab.refusal import Unacceptable
from server.lab.validity import end_of_day, last_day, local_day, read_day, read_zone, valid_until

ZONES = ("UTC", "Europe/Berlin", "America/New_York", "Asia/Kolkata", "Pacific/Auckland")
DAYS = st.dates(date(1990, 1, 1), date(2090, 1, 1))


@pytest.mark.parametrize(
    "name", ["", "Mars/Olympus", "../../etc/passwd", "Europe/Berlin\0", "/etc"]
)
def test_read_zone_no_zone_is_refused_by_field(name):
    with pytest.raises(Unacceptable) as refused:
        read_zone(name)
    assert refused.value.field == "zone"


def test_read_day_iso_day_is_read():
    assert read_day(" 2026-05-31 ", "due_on") == date(2026, 5, 31)


@pytest.mark.parametrize(
    "text", ["", "31.05.2026", "2026-02-30", "9999-12-31", "0001-01-01", "soon"]
)
def test_read_day_no_sensible_day_is_refused_by_field(text):
    with pytest.raises(Unacceptable) as refused:
        read_day(text, "due_on")
    assert refused.value.field == "due_on"
    assert refused.value.example == "2026-05-31"


@settings(deadline=None, max_examples=60)
@given(DAYS, st.sampled_from(ZONES))
def test_end_of_day_is_the_first_instant_of_the_next_day(day, zone):
    end = end_of_day(day, zone)
    assert end.tzinfo is UTC
    assert local_day(end, zone) > day
    assert local_day(end - timedelta(microseconds=1), zone) == day == last_day(end, zone)


def test_end_of_day_where_midnight_is_skipped_is_the_moment_of_the_change():
    # Cairo put the clock forward at midnight of 26 April 2024 (IANA time zone data)
    assert end_of_day(date(2024, 4, 25), "Africa/Cairo") == datetime(2024, 4, 25, 22, tzinfo=UTC)
    assert last_day(datetime(2024, 4, 25, 22, tzinfo=UTC), "Africa/Cairo") == date(2024, 4, 25)


def test_valid_until_counts_local_days_not_hours():
    # 23:30 in Berlin on 3 May; the change to summer time lies before
    measured = datetime(2026, 5, 3, 21, 30, tzinfo=UTC)
    found = valid_until(
        measured_at=measured, interval_days=14, use_by=None, zone="Europe/Berlin"
    )  # fmt: skip
    assert found.at == datetime(2026, 5, 17, 22, tzinfo=UTC)
    assert found.rule == "interval of the recipe, 14 days after measuring"


def test_valid_until_earlier_use_by_day_of_the_lot_rules():
    found = valid_until(
        measured_at=datetime(2026, 5, 3, 10, tzinfo=UTC), interval_days=14,
        use_by=date(2026, 5, 10), zone="UTC",
    )  # fmt: skip
    assert found.at == datetime(2026, 5, 11, tzinfo=UTC)
    assert found.rule == "use-by day of the lot"


def test_valid_until_later_use_by_day_changes_nothing():
    found = valid_until(
        measured_at=datetime(2026, 5, 3, 10, tzinfo=UTC), interval_days=1,
        use_by=date(2026, 6, 10), zone="UTC",
    )  # fmt: skip
    assert found.at == datetime(2026, 5, 5, tzinfo=UTC)
    assert found.rule == "interval of the recipe, 1 day after measuring"

from concurrent.futures import ThreadPoolExecutor
from datetime import UTC, datetime

from server.procedures.throttle import count_failure, forget, keys_of, too_often_says, wait_s

NOW = datetime(2026, 5, 4, 8, 30, tzinfo=UTC)
KEYS = keys_of("ida", "192.0.2.7")


def test_keys_are_of_account_and_source_and_bounded():
    assert KEYS == ("account:ida", "source:192.0.2.7")
    assert max(map(len, keys_of("x" * 10_000, "y" * 10_000))) < 220


def test_failures_at_once_are_all_counted(transactions):
    def fail(_):
        return transactions.write(lambda session: count_failure(session, KEYS, now=NOW))

    with ThreadPoolExecutor(10) as pool:
        counts = list(pool.map(fail, range(30)))
    assert sorted(counts) == list(range(1, 31))
    assert transactions.read(lambda session: wait_s(session, KEYS, now=NOW)) == 15 * 60


def test_forgotten_key_waits_no_more(transactions):
    for _ in range(7):
        transactions.write(lambda session: count_failure(session, KEYS, now=NOW))
    transactions.write(lambda session: forget(session, KEYS[0]))
    assert transactions.read(lambda session: wait_s(session, KEYS[:1], now=NOW)) == 0
    assert transactions.read(lambda session: wait_s(session, KEYS, now=NOW)) == 4


def test_sentence_says_whole_seconds_at_least_one():
    assert too_often_says(0.2) == "Too many failures. Wait 1 seconds, then try again."

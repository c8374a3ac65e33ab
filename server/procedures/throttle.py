"""How long somebody waits after failures in a row, per account and per source."""

from collections.abc import Iterable
from datetime import datetime, timedelta

from sqlalchemy.orm import Session

from server.lab.refusal import TooOften
from server.records.queries.load_sign_ins import failures_of
from server.records.tables.people import SignInFailure

FREE_FAILURES = 5
MOST_WAIT_S = 15 * 60
#: After this long without a failure the count starts anew.
FORGOTTEN_AFTER = timedelta(minutes=30)
ALERT_AT = 10


def keys_of(name: str, source: str) -> tuple[str, str]:
    """Return the keys under which failures of an account and of a source are counted."""
    return f"account:{name[:200]}", f"source:{source[:200]}"


def wait_s(session: Session, keys: Iterable[str], *, now: datetime) -> float:
    """Return the seconds left to wait before the next try."""
    return max(_left(failures_of(session, key), now) for key in keys)


def refuse_if_early(session: Session, keys: Iterable[str], *, now: datetime) -> None:
    """Refuse a try that comes before the wait is over."""
    left = wait_s(session, keys, now=now)
    if left > 0:
        raise TooOften(too_often_says(left), shown={"retry_after_s": left})


def too_often_says(left: float) -> str:
    """Return the sentence for somebody who has to wait."""
    return f"Too many failures. Wait {max(1, round(left))} seconds, then try again."


def count_failure(session: Session, keys: Iterable[str], *, now: datetime) -> int:
    """Count one more failure for each key; return the highest count."""
    counts = []
    for key in keys:
        row = failures_of(session, key, lock=True)
        if row is None:
            row = SignInFailure(key=key, count=0, last_at=now)
            session.add(row)
        row.count = 1 if now - row.last_at > FORGOTTEN_AFTER else row.count + 1
        row.last_at = now
        counts.append(row.count)
    session.flush()
    return max(counts)


def forget(session: Session, key: str) -> None:
    """Forget the failures of one key after a success."""
    row = failures_of(session, key, lock=True)
    if row is not None:
        session.delete(row)
        session.flush()


def _left(row: SignInFailure | None, now: datetime) -> float:
    if row is None or row.count < FREE_FAILURES or now - row.last_at > FORGOTTEN_AFTER:
        return 0.0
    wait = float(min(MOST_WAIT_S, 1 << min(row.count - FREE_FAILURES, 20)))
    return max(0.0, wait - (now - row.last_at).total_seconds())

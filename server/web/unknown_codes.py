"""Looking up codes that nobody has: counted per source, so that codes cannot be tried out."""

from collections import deque
from datetime import datetime, timedelta
from threading import Lock

from server.lab.refusal import TooOften

MOST = 30
WITHIN = timedelta(minutes=1)
_MOST_SOURCES = 10_000


class UnknownCodes:
    """Counts look-ups of unknown codes; known ones are never counted or slowed."""

    def __init__(self) -> None:
        self._seen: dict[str, deque[datetime]] = {}
        self._lock = Lock()

    def count(self, source: str, *, now: datetime) -> None:
        """Count one more unknown code from a source.

        Raises:
            TooOften: this source asked for more than ``MOST`` unknown codes within a minute.
        """
        with self._lock:
            if len(self._seen) >= _MOST_SOURCES:
                self._forget(now)
            seen = self._seen.setdefault(source, deque())
            while seen and now - seen[0] >= WITHIN:
                seen.popleft()
            if len(seen) < MOST:
                seen.append(now)
                return
            left = (seen[0] + WITHIN - now).total_seconds()
        says = f"Too many unknown codes. Wait {max(1, round(left))} seconds, then try again."
        raise TooOften(says, shown={"retry_after_s": left})

    def _forget(self, now: datetime) -> None:
        """Drop the sources that have been quiet; all of them where none has."""
        quiet = [one for one, seen in self._seen.items() if not seen or now - seen[-1] >= WITHIN]
        for source in quiet or list(self._seen):
            del self._seen[source]

"""Column types that keep what was written: instants to the microsecond, canonical JSON text."""

import json
from datetime import UTC, datetime, timedelta
from typing import Any

from sqlalchemy import BigInteger, Text
from sqlalchemy.engine import Dialect
from sqlalchemy.types import TypeDecorator

from server.lab.canonical import canonical

_EPOCH = datetime(1970, 1, 1, tzinfo=UTC)


class Instant(TypeDecorator[datetime]):
    """An instant as whole microseconds since 1970 in UTC; SQLite would drop the zone."""

    impl = BigInteger
    cache_ok = True

    def process_bind_param(self, value: datetime | None, dialect: Dialect) -> int | None:
        """Refuse an instant without a zone; store microseconds."""
        del dialect
        if value is None:
            return None
        if value.tzinfo is None:
            raise ValueError("an instant needs its zone")
        return (value - _EPOCH) // timedelta(microseconds=1)

    def process_result_value(self, value: Any, dialect: Dialect) -> datetime | None:
        """Return the instant in UTC."""
        del dialect
        return None if value is None else _EPOCH + timedelta(microseconds=value)


class JsonText(TypeDecorator[Any]):
    """A JSON-like value as canonical text: JSONB would renumber and reorder it."""

    impl = Text
    cache_ok = True

    def process_bind_param(self, value: Any, dialect: Dialect) -> str | None:
        """Store the canonical text."""
        del dialect
        return None if value is None else canonical(value)

    def process_result_value(self, value: Any, dialect: Dialect) -> Any:
        """Read the canonical text back."""
        del dialect
        return None if value is None else json.loads(value)

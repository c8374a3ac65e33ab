"""A lot's certificates over time, as lines and as a picture."""

from collections.abc import Sequence
from datetime import UTC, datetime

from server.drawing.history import HistoryPoint, certificate_history
from server.lab.states import STANDING, certificate_state
from server.lab.validity import local_day
from server.records.queries.list_certificates import KeptCertificate
from server.sheets.parts.outcome import printed
from server.sheets.parts.telling import day_words
from server.sheets.shelf import HistoryLine

_UNIX = datetime(1970, 1, 1, tzinfo=UTC)


def state_of_certificate(one: KeptCertificate) -> str:
    """Return a certificate's state."""
    return certificate_state(replaced=one.replaced_by is not None, pulled=one.pulled)


def history_lines(certificates: Sequence[KeptCertificate], zone: str) -> tuple[HistoryLine, ...]:
    """Return the certificates in the order given."""
    return tuple(
        HistoryLine(
            number=one.row.number,
            url=f"/certificates/{one.row.number}",
            reported=one.document["result"]["concentration"]["reported"],
            issued=day_words(local_day(one.row.issued_at, zone)),
            state=state_of_certificate(one),
        )
        for one in certificates
    )


def history_chart(certificates: Sequence[KeptCertificate], zone: str) -> str:
    """Return the picture of the certificates; empty where there is none."""
    if not certificates:
        return ""
    points = [_point(one, zone) for one in certificates]
    decimals = max(printed(one.document["result"]).decimals for one in certificates)
    unit = certificates[0].document["result"]["concentration"]["unit"]
    return certificate_history(points, unit=unit, decimals=decimals)


def _point(one: KeptCertificate, zone: str) -> HistoryPoint:
    concentration = one.document["result"]["concentration"]
    day = local_day(one.row.issued_at, zone)
    return HistoryPoint(
        label=day_words(day).rpartition(" ")[0],
        day=(one.row.issued_at - _UNIX).total_seconds() / 86400.0,
        value=concentration["value"],
        U=concentration["U"],
        standing=state_of_certificate(one) == STANDING,
    )

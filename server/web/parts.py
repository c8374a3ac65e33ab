"""What the web is made of: values handed down by the roof, nothing global."""

from collections.abc import Callable
from dataclasses import dataclass, field
from datetime import datetime

from starlette.requests import HTTPConnection

from server.credentials.signing_keys import SigningKeys
from server.records.transaction import Transactions
from server.web.chart_bundle import ChartBundle
from server.web.templating import Templating
from server.web.unknown_codes import UnknownCodes


@dataclass(frozen=True, slots=True)
class Parts:
    """The parts that every route may use.

    ``secure``: whether all traffic comes by https, also where a proxy speaks it. ``setup_code``
    opens the set-up page of an empty database; ``keys`` sign what leaves the laboratory.
    ``sends_mail``: whether a server for e-mail is set. ``at_end`` is called when the application
    ends, before the database is closed.
    """

    transactions: Transactions
    clock: Callable[[], datetime]
    templating: Templating
    secure: bool
    setup_code: str = field(repr=False)
    version: str
    unknown_codes: UnknownCodes
    keys: SigningKeys = field(repr=False)
    sends_mail: bool = False
    at_end: tuple[Callable[[], None], ...] = ()
    chart_bundle: ChartBundle = field(default_factory=ChartBundle)


def parts_of(connection: HTTPConnection) -> Parts:
    """Return the parts of the application that a request came to."""
    parts: Parts = connection.app.state.parts
    return parts

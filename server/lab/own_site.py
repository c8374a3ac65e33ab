"""The laboratory's own address on the network, its country and its paper."""

import re
from urllib.parse import urlsplit

from server.lab.refusal import Unacceptable

#: What certificates are printed on; the first is the default.
PAPERS = ("a4", "us-letter")

_COUNTRY = re.compile(r"[A-Z]{2}", re.ASCII)
_MOST = 200
_PLAIN = re.compile(r"[!-~]+", re.ASCII)


def read_base_url(text: str, field: str = "base_url") -> str:
    """Return the address under which people reach this program, without a slash at its end.

    An empty text stays empty: none is set.

    Raises:
        Unacceptable: it is no http address, or longer than a label's QR code should be.
    """
    base = text.strip().rstrip("/")
    if not base:
        return ""
    try:
        parts = urlsplit(base)
        good = (
            parts.scheme in {"http", "https"}
            and bool(parts.hostname)
            and parts.username is None
            and (parts.port is None or parts.port > 0)
            and not (parts.query or parts.fragment)
        )
    except ValueError:
        good = False
    if not good or not _PLAIN.fullmatch(base):
        says = "The laboratory's own address must be an http address without question marks."
        raise Unacceptable(says, field=field, example="https://ledger.example")
    if len(base) > _MOST:
        says = f"The laboratory's own address takes up to {_MOST} characters."
        raise Unacceptable(says, field=field, example="https://ledger.example")
    return base


def read_country(text: str, field: str = "country") -> str:
    """Return the laboratory's country, two capital letters of ISO 3166-1; empty where none is set.

    Raises:
        Unacceptable: it is neither empty nor two letters.
    """
    country = text.strip().upper()
    if country and not _COUNTRY.fullmatch(country):
        says = "The country is told by its two letters of ISO 3166-1."
        raise Unacceptable(says, field=field, example="CH")
    return country


def read_paper(text: str, field: str = "paper") -> str:
    """Return what certificates are printed on.

    Raises:
        Unacceptable: it is none of the papers that are known.
    """
    if text not in PAPERS:
        says = f"{field} is one of {', '.join(PAPERS)}."
        raise Unacceptable(says, field=field, example=PAPERS[0])
    return text

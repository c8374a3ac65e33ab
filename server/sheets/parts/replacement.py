"""What a certificate says otherwise than the one it replaces."""

from collections.abc import Iterator, Mapping
from typing import Any

from server.sheets.parts.outcome import printed
from server.sheets.parts.telling import typed_day_words


def why_replaced(document: Mapping[str, Any], previous: Mapping[str, Any]) -> str:
    """Return why a certificate replaces the one before it: as stated, or what was done."""
    stated = document.get("replaces_because")
    if stated:
        return str(stated)
    sheet = document["sheet"]["number"]
    if document["sheet"]["id"] != previous["sheet"]["id"]:
        return f"The lot was standardized anew on bench sheet {sheet}."
    return f"Bench sheet {sheet} was corrected."


def changed_lines(was: Mapping[str, Any], now: Mapping[str, Any]) -> Iterator[tuple[str, str, str]]:
    """Yield what differs: name, what stood there, what stands now; the value also its shift."""
    before, after = was["result"]["concentration"], now["result"]["concentration"]
    percent = 100 * (after["value"] - before["value"]) / before["value"]
    shift = f"{percent:+.3f} %".replace("-", "−")
    pairs = [
        ("concentration", before["reported"], f"{after['reported']}, {shift}"),
        ("factor", printed(was["result"]).factor, printed(now["result"]).factor),
        ("valid until", _day(was["validity"]["last_day"]), _day(now["validity"]["last_day"])),
        ("measured", _day(was["measured"]["day"]), _day(now["measured"]["day"])),
        ("measured by", ", ".join(was["measured"]["by"]), ", ".join(now["measured"]["by"])),
        ("bench sheet", was["sheet"]["number"], now["sheet"]["number"]),
        ("recipe", _recipe(was), _recipe(now)),
        ("valid for", was["valid_for"], now["valid_for"]),
        ("calculation", was["calculation"], now["calculation"]),
    ]
    papers = {"was": _papers(was), "now": _papers(now)}
    pairs += [
        (kind, papers["was"].get(kind, "none"), papers["now"].get(kind, "none"))
        for kind in dict.fromkeys((*papers["was"], *papers["now"]))
    ]
    yield from (pair for pair in pairs if pair[1] != pair[2])


def _day(text: str) -> str:
    return typed_day_words(text)


def _recipe(document: Mapping[str, Any]) -> str:
    return f"{document['recipe']['name']}, version {document['recipe']['version']}"


def _papers(document: Mapping[str, Any]) -> dict[str, str]:
    return {
        one["kind"]: f"{one['name']}, {one['certificate_number']}"
        for one in document["traceability"]
    }

"""R010: a number that is not certified shows to analysts and countersigners, on its sheet only.

Every route that only reads is opened while a sheet is handed in, as somebody of each role, as a
visitor and as a script with an analyst's token; a visitor, a reader and an analyst follow the links
of every page as well.
"""

import io
import json
import re
import zipfile
from collections.abc import Iterator
from dataclasses import dataclass
from typing import Any

import pytest
import sqlalchemy as sa

from server.lab.scopes import Scope
from server.records.tables.bench import Evaluation, Sheet
from server.records.tables.lots import Bottle, Lot
from server.web.wiring import ROUTERS

_BEGIN = ("/", "/bench", "/countersign", "/lots", "/stores", "/instruments", "/trail", "/me")
_MOST_OF_ONE = 2
_FOLLOW = frozenset({"visitor", "reader", "analyst"})
_LIKE = re.compile(r"/[0-9a-f]{8}-[0-9a-f-]{27}|/[0-9A-Z]{8}(?=[/?.]|$)|/TL-[0-9]{4}-[0-9]+")


@dataclass(frozen=True)
class Waiting:
    """A sheet that waits for a second person, what names it, and what it comes to, in digits."""

    sheet_id: str
    codes: tuple[str, ...]
    lot_name: str
    digits: tuple[str, ...]

    def in_text(self, text: str) -> bool:
        """Say whether the number stands in a text, rounded or not."""
        return any(one in text for one in self.digits)

    def addresses(self) -> Iterator[str]:
        """Every reading route that this sheet, its lot or its bottle can be asked by."""
        known = {"sheet_id": (self.sheet_id,), "code": self.codes}
        for prefix, router in ROUTERS:
            for route in router.routes:
                path = prefix + route.path  # type: ignore[attr-defined]
                names = re.findall(r"{(\w+)}", path)
                if "GET" not in route.methods:  # type: ignore[attr-defined]
                    continue
                if not names:
                    yield path
                elif names[0] in known and len(names) == 1:
                    yield from (path.replace(f"{{{names[0]}}}", one) for one in known[names[0]])
        yield from (f"/trail?thing={self.lot_name}", "/trail?words=handed", "/?state=unproven")


@pytest.fixture(scope="module")
def waiting(shared_web: Any) -> Waiting:
    """The demonstration's sheet that is handed in; its lot has no other certificate."""
    sheet_id = shared_web.demo.waiting_sheet_id

    def read(session: Any) -> Waiting:
        sheet = session.get_one(Sheet, sheet_id)
        lot = session.get_one(Lot, sheet.lot_id)
        bottles = session.scalars(sa.select(Bottle.code).where(Bottle.lot_id == lot.id)).all()
        snapshot = session.get_one(Evaluation, sheet.evaluation_id).snapshot
        concentration = json.loads(snapshot)["result"]["concentration"]
        printed, full = concentration["reported"].split()[0], repr(concentration["value"])
        return Waiting(sheet_id, (lot.code, *bottles), lot.name, (printed, full[:9]))

    found: Waiting = shared_web.transactions.read(read)
    return found


def _script(web: Any) -> Any:
    """A script with an analyst's token of all scopes."""
    owner = web.client("imke")
    asked = {"name": "crawler", "scopes": list(Scope), "password": owner.password}
    client = web.visitor()
    client.headers["Authorization"] = f"Bearer {owner.post('/api/tokens', asked).json()['token']}"
    return client


def _texts(answer: Any) -> Iterator[str]:
    """What an answer says, with the members of an archive."""
    yield answer.text
    if answer.content.startswith(b"PK"):
        with zipfile.ZipFile(io.BytesIO(answer.content)) as archive:
            for name in archive.namelist():
                yield archive.read(name).decode("utf-8", "replace")


def _crawl(browser: Any, asked: list[str], *, follow: bool) -> dict[str, Any]:
    """Open all addresses and, where asked, what their pages link to, of like pages a few."""
    left, answers, like = list(dict.fromkeys([*asked, *_BEGIN])), {}, dict[str, int]()
    while left:
        url = left.pop(0)
        shape = _LIKE.sub("/*", url).partition("?")[0]
        if url in answers or (url not in asked and like.get(shape, 0) >= _MOST_OF_ONE):
            continue
        like[shape] = like.get(shape, 0) + 1
        answers[url] = answer = browser.get(url)
        if follow and answer.headers.get("content-type", "").startswith("text/html"):
            links = re.findall(r'(?:href|src)="(/[^"#]*)', answer.text)
            left += [one.replace("&amp;", "&") for one in links if not one.startswith("/static")]
    return answers


@pytest.mark.parametrize(
    "role", ["visitor", "script", "reader", "steward", "keeper", "analyst", "countersigner"]
)
def test_number_of_a_sheet_that_waits_shows_where_it_may_and_nowhere_else(
    shared_web: Any, waiting: Waiting, role: str
) -> None:
    asked = list(waiting.addresses())
    if role == "script":
        browser = _script(shared_web)
    else:
        browser = shared_web.client(shared_web.roles[role]) if role != "visitor" else None
    answers = _crawl(browser or shared_web.visitor(), asked, follow=role in _FOLLOW)

    shown = {url for url, one in answers.items() if any(map(waiting.in_text, _texts(one)))}

    own = {url for url in shown if waiting.sheet_id in url}
    if role == "countersigner":
        own |= {url for url in shown if url in {"/countersign", "/api/countersign"}}
    assert shown - own == set()
    if role in {"analyst", "countersigner"}:
        assert f"/bench/{waiting.sheet_id}" in own  # the test would see it
    else:
        assert own == set()
    opened = [url for url, one in answers.items() if one.status_code == 200]
    assert len(opened) > (5 if role in {"visitor", "script"} else 40), opened

"""Every link of every page leads to a page, for everybody."""

import re
from typing import Any

import pytest

_BEGIN = ("/", "/bench", "/countersign", "/stores", "/instruments", "/trail", "/about", "/me")
_MOST_OF_ONE = 3


def _shape(url: str) -> str:
    """Return an address without its codes, ids and query, so that like pages are few."""
    path = re.sub(r"/[0-9a-f]{8}-[0-9a-f-]{27}|/[0-9A-Z]{8}(?=/|$|\?)|/TL-[0-9-]+", "/*", url)
    return path.partition("?")[0]


@pytest.mark.parametrize("name", [None, "imke", "ottilie", "jonas", "marisol", "rosa", "tove"])
def test_every_link_leads_to_a_page(shared_web: Any, name: str | None) -> None:
    browser = shared_web.client(name) if name else shared_web.visitor()
    waiting, seen, shapes = list(_BEGIN), set(), dict[str, int]()
    while waiting:
        url = waiting.pop(0)
        shape = _shape(url)
        if url in seen or shapes.get(shape, 0) >= _MOST_OF_ONE:
            continue
        seen.add(url)
        shapes[shape] = shapes.get(shape, 0) + 1
        answer = browser.get(url)
        if name is None and answer.status_code == 401:
            continue
        assert answer.status_code in {200, 303}, (url, answer.status_code, answer.text[-1500:])
        if answer.headers.get("content-type", "").startswith("text/html"):
            links = re.findall(r'href="(/[^"#]*)', answer.text)
            waiting += [link.replace("&amp;", "&") for link in links]
    assert len(seen) > (5 if name is None else 20)


def test_every_form_of_every_page_goes_to_a_route_that_takes_it(shared_web: Any) -> None:
    from server.web.wiring import ROUTERS

    taken = [
        re.compile(re.sub(r"\{[^}]+\}", "[^/]+", prefix + route.path))  # type: ignore[attr-defined]
        for prefix, router in ROUTERS
        for route in router.routes
        if "POST" in route.methods  # type: ignore[attr-defined]
    ]
    demo, found = shared_web.demo, set()
    pages = [
        "/bench", "/lots/new", "/stores/standard-lots/new", "/stores/recipes/new", "/people",
        "/laboratory",
        f"/labels?thing={demo.bottles_in_force[0]}",
        "/instruments/new", "/me", f"/countersign/{demo.waiting_sheet_id}",
        f"/bench/{demo.sent_back_sheet_id}", f"/bench/{demo.sent_back_sheet_id}/hand-in",
        *(f"/b/{code}" for code in demo.bottles),
    ]  # fmt: skip
    for name in ("imke", "cleo", "jonas", "marisol"):
        hand = shared_web.client(name)
        for url in pages:
            html = hand.get(url).text
            found |= set(re.findall(r'<form method="post" action="([^"]+)"', html))
    assert len(found) > 15
    for action in found:
        assert any(one.fullmatch(action) for one in taken), action


def test_sheet_in_the_bench_page_is_the_sheet_of_the_api(shared_web: Any) -> None:
    """The page's JSON cannot end its script element, whatever a person typed."""
    import json

    bashir = shared_web.client("bashir")
    sheet = shared_web.demo.open_sheet_id
    html = bashir.get(f"/bench/{sheet}").text
    held = re.search(r'<script type="application/json" id="sheet">(.*?)</script>', html, re.DOTALL)
    assert held is not None

    assert json.loads(held[1]) == bashir.get(f"/api/sheets/{sheet}").json()
    assert "<" not in held[1]

"""R104, R105: the policy and the other headers stand on every kind of answer."""

import re
from typing import Any

import pytest

ADDRESSES = [
    "/",
    "/about",
    "/sign-in",
    "/nowhere",
    "/bench",
    "/b/NOCODE00",
    "/health",
    "/api/openapi.json",
    "/api/nowhere",
    "/static/x/css/ledger.css",
]


@pytest.mark.parametrize("address", ADDRESSES)
def test_answer_of_any_kind_carries_the_policy(shared_web: Any, address: str) -> None:
    headers = shared_web.visitor().get(address).headers
    policy = dict(
        part.strip().split(" ", 1) for part in headers["content-security-policy"].split(";")
    )

    assert policy["default-src"] == "'none'"
    assert policy["frame-ancestors"] == policy["base-uri"] == policy["object-src"] == "'none'"
    for name in ("script-src", "style-src", "connect-src", "form-action", "img-src"):
        assert policy[name] == "'self'"
    assert "unsafe" not in headers["content-security-policy"]
    assert headers["x-content-type-options"] == "nosniff"
    assert headers["referrer-policy"] == "no-referrer"
    assert headers["cross-origin-opener-policy"] == "same-origin"
    assert headers["strict-transport-security"] == "max-age=31536000; includeSubDomains"
    camera = "camera=(self)" if address == "/" else "camera=()"  # the shelf scans codes
    assert camera in headers["permissions-policy"]


def test_answers_are_never_stored_but_for_static_files_of_this_release(shared_web: Any) -> None:
    visitor = shared_web.visitor()
    page = visitor.get("/")
    style = re.search(r'href="(/static/[^"]+\.css)"', page.text)
    assert style is not None

    assert page.headers["cache-control"] == "no-store"
    assert "immutable" in visitor.get(style[1]).headers["cache-control"]
    assert visitor.get("/static/older/css/ledger.css").headers["cache-control"] == "no-cache"
    signed_in = shared_web.client("imke")
    for address in ("/bench", "/api/session", f"/b/{shared_web.demo.bottles_in_force[0]}"):
        assert signed_in.get(address).headers["cache-control"] == "no-store"


def test_pages_hold_nothing_that_the_policy_would_block(shared_web: Any) -> None:
    """No style attribute, no inline script but data, no handler attribute, nothing from outside."""
    hand = shared_web.client("tove")
    bottle = shared_web.demo.bottles_in_force[-1]
    number = hand.get(f"/api/bottles/{bottle}").json()["certificate"]["number"]
    addresses = [
        "/", f"/b/{bottle}", f"/b/{bottle}?at=24.0", "/bench", "/countersign", "/stores",
        "/instruments", "/trail", "/me", "/about", "/lots/new", f"/certificates/{number}",
        f"/bench/{shared_web.demo.sent_back_sheet_id}",
        f"/bench/{shared_web.demo.sent_back_sheet_id}/hand-in",
        f"/countersign/{shared_web.demo.waiting_sheet_id}",
    ]  # fmt: skip
    for address in addresses:
        answer = hand.get(address)
        html = answer.text
        assert answer.status_code == 200, address
        assert not re.search(r"<[^>]*\sstyle\s*=", html), address
        assert "<style" not in html, address
        assert not re.search(r"<[^>]*\son[a-z]+\s*=", html), address
        for attributes in re.findall(r"<script\b([^>]*)>", html):
            assert "src=" in attributes or 'type="application/json"' in attributes, address
        for source in re.findall(r'(?:src|href)="([^"#]+)"', html):
            assert source.startswith("/"), (address, source)


def test_session_cookie_is_bound_to_this_host_and_unseen_by_scripts(shared_web: Any) -> None:
    given = {"name": "imke", "password": shared_web.passwords["imke"]}

    cookie = shared_web.visitor().post("/api/session", json=given).headers["set-cookie"]

    assert cookie.startswith("__Host-titrant-ledger=")
    parts = {part.strip().lower() for part in cookie.split(";")}
    assert {"secure", "httponly", "path=/", "samesite=lax"} <= parts
    assert not any(part.startswith(("domain", "max-age", "expires")) for part in parts)


def test_session_over_plain_http_has_a_cookie_that_https_never_reads(shared_web: Any) -> None:
    given = {"name": "imke", "password": shared_web.passwords["imke"]}
    plain = shared_web.visitor()
    plain.base_url = "http://testserver"

    answer = plain.post("/api/session", json=given)

    assert answer.headers["set-cookie"].startswith("titrant-ledger=")
    assert "secure" not in answer.headers["set-cookie"].lower()
    assert "strict-transport-security" not in answer.headers
    assert plain.get("/me").status_code == 200
    stolen = answer.headers["set-cookie"].partition(";")[0]
    over_https = shared_web.visitor().get("/me", headers={"Cookie": stolen})
    assert over_https.status_code == 401


def test_head_is_answered_as_get_without_a_body(shared_web: Any) -> None:
    visitor = shared_web.visitor()
    head, whole = visitor.head("/about"), visitor.get("/about")
    assert head.status_code == whole.status_code == 200
    assert head.content == b""
    assert head.headers["content-length"] == whole.headers["content-length"]

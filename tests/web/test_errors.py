"""One table from refusals to statuses; what nobody foresaw gets a number."""

import logging
from typing import Any

import pytest
from fastapi.testclient import TestClient

from server.lab import refusal as lab
from server.web import refusals as web_refusals
from server.web.errors import STATUS, answer_of, headers_of
from server.web.parts import parts_of

WANTED = {
    lab.NotSignedIn: 401,
    lab.NotAllowed: 403,
    lab.NotFound: 404,
    lab.SavedFirst: 409,
    lab.Stale: 412,
    lab.Unacceptable: 422,
    lab.KeyMissing: 400,
    lab.TooOften: 429,
    lab.CannotWrite: 503,
    web_refusals.NotFromHere: 403,
    web_refusals.TokenRefused: 401,
    web_refusals.TooLarge: 413,
    web_refusals.WrongKind: 415,
    web_refusals.Unreadable: 400,
}


def _kinds(of: type) -> set[type]:
    """Return all kinds but a module's private ones, which never leave it."""
    public = [kind for kind in of.__subclasses__() if not kind.__name__.startswith("_")]
    return {of, *(one for kind in public for one in _kinds(kind))}


def test_every_refusal_has_its_own_line_in_the_table() -> None:
    assert _kinds(lab.Refusal) == set(STATUS)


@pytest.mark.parametrize(("kind", "status"), WANTED.items(), ids=str)
def test_refusal_is_answered_with_its_status(kind: type[lab.Refusal], status: int) -> None:
    assert answer_of(kind("No.")).status == status


def test_titles_of_problems_are_told_apart() -> None:
    titles = [one.title for kind, one in STATUS.items() if kind is not lab.Refusal]

    assert len(set(titles)) == len(titles)


def test_too_often_says_when_to_come_back() -> None:
    refused = lab.TooOften("Wait.", shown={"retry_after_s": 7.6})

    assert headers_of(refused) == {"Retry-After": "8"}


@pytest.mark.parametrize("path", ["/nowhere", "/api/nowhere", "/static/x/../../etc/passwd"])
def test_unknown_address_is_not_found_in_the_readers_own_form(shared_web: Any, path: str) -> None:
    answer = shared_web.visitor().get(path)

    assert answer.status_code == 404
    kind = "application/problem+json" if path.startswith("/api") else "text/html"
    assert answer.headers["content-type"].startswith(kind)


def test_method_that_an_address_does_not_take_is_refused(shared_web: Any) -> None:
    visitor = shared_web.visitor()

    assert visitor.request("PUT", "/api/lots", json={}).status_code == 405
    assert visitor.request("PATCH", "/lots/new").status_code == 405
    assert "allow" in visitor.request("PUT", "/api/lots", json={}).headers


@pytest.mark.parametrize("path", ["/", "/about", "/health", "/api/shelf"])
def test_head_is_answered_like_get(shared_web: Any, path: str) -> None:
    visitor = shared_web.visitor()
    head, get = visitor.head(path), visitor.get(path)

    assert head.status_code == get.status_code == 200
    assert head.headers["content-type"] == get.headers["content-type"]


@pytest.mark.parametrize("path", ["/about", "/api/session", "/health"])
def test_error_that_nobody_foresaw_gets_a_number_and_says_nothing_else(
    web: Any, path: str, monkeypatch: pytest.MonkeyPatch, caplog: pytest.LogCaptureFixture
) -> None:
    def broken(*_: Any) -> Any:
        raise ZeroDivisionError("the inside of the program")

    client = TestClient(web.app, base_url="https://testserver")
    monkeypatch.setattr(type(web.transactions), "read", broken)

    with caplog.at_level(logging.ERROR, logger="server.web.errors"):
        answer = client.get(path)

    assert answer.status_code == 500
    assert "inside of the program" not in answer.text
    assert "Traceback" not in answer.text
    assert answer.headers["content-security-policy"]
    incident = caplog.records[-1].args[0]  # type: ignore[index]
    assert str(incident) in answer.text
    assert caplog.records[-1].exc_info is not None
    if path != "/about":
        assert answer.json()["incident"] == incident


def test_parts_of_a_request_are_those_of_its_application(web: Any) -> None:
    class Asked:
        app = web.app

    assert parts_of(Asked()) is web.app.state.parts  # type: ignore[arg-type]

"""R103: a write needs the token of its own session and comes from a page of this server."""

from typing import Any

import pytest

from server.web.wiring import API_PREFIX, ROUTERS

#: Writes of a visitor carry the visitor's token; they are tried apart.
_VISITORS = frozenset({"/sign-in", "/setup", "/api/session"})
WRITES = sorted(
    (method, prefix + route.path)  # type: ignore[attr-defined]
    for prefix, router in ROUTERS
    for route in router.routes
    for method in route.methods - {"GET", "HEAD"}  # type: ignore[attr-defined]
    if (method, prefix + route.path) not in {("POST", path) for path in _VISITORS}  # type: ignore[attr-defined]
)


@pytest.fixture(scope="module")
def imke(shared_web: Any) -> Any:
    return shared_web.client("imke")


@pytest.fixture(scope="module")
def other_token(shared_web: Any) -> str:
    token: str = shared_web.client("imke").token
    return token


def _send(hand: Any, method: str, path: str, token: str, **headers: str) -> Any:
    if path.startswith(API_PREFIX):
        sent = {"X-Form-Token": token, **headers} if token else headers
        return hand.client.request(method, path, json={"entries": []}, headers=sent)
    return hand.client.post(path, data={"form_token": token, "key": "k"}, headers=headers)


@pytest.mark.parametrize(("method", "path"), WRITES)
def test_write_without_token_is_refused(imke: Any, method: str, path: str) -> None:
    assert _send(imke, method, path, "").status_code == 403


@pytest.mark.parametrize(("method", "path"), WRITES)
def test_write_with_the_token_of_another_session_is_refused(
    imke: Any, other_token: str, method: str, path: str
) -> None:
    assert other_token != imke.token
    assert _send(imke, method, path, other_token).status_code == 403


@pytest.mark.parametrize(("method", "path"), WRITES)
@pytest.mark.parametrize(
    "headers",
    [
        {"Origin": "https://elsewhere.example"},
        {"Origin": "null"},
        {"Origin": "https://testserver.elsewhere.example"},
        {"Sec-Fetch-Site": "cross-site"},
        {"Sec-Fetch-Site": "same-site"},
    ],
    ids=["origin", "null origin", "longer host", "cross-site", "same-site"],
)
def test_write_sent_from_another_site_is_refused_whatever_it_carries(
    imke: Any, method: str, path: str, headers: dict[str, str]
) -> None:
    answer = _send(imke, method, path, imke.token, **headers)

    assert answer.status_code == 403
    assert "another site" in answer.text


def test_write_from_a_page_of_this_server_is_taken(shared_web: Any) -> None:
    bashir = shared_web.client("bashir")
    headers = {"Origin": "https://testserver", "Sec-Fetch-Site": "same-origin"}

    answer = _send(bashir, "POST", "/lots/new", bashir.token, **headers)

    assert answer.status_code == 422


@pytest.mark.parametrize("path", ["/sign-in", "/setup"])
@pytest.mark.parametrize("token", ["", "0" * 64])
def test_visitors_form_without_the_browsers_own_token_is_refused(
    shared_web: Any, path: str, token: str
) -> None:
    visitor = shared_web.visitor()
    visitor.get("/sign-in")

    assert visitor.post(path, data={"form_token": token, "key": "k"}).status_code == 403


def test_entries_without_header_and_token_are_refused(shared_web: Any) -> None:
    bashir = shared_web.client("bashir")
    door = f"/api/sheets/{shared_web.demo.open_sheet_id}/entries"

    assert bashir.client.post(door, json=[]).status_code == 403


def test_entries_of_somebody_else_on_the_same_tablet_are_refused(shared_web: Any) -> None:
    """A tablet keeps one person's entries apart from another's; so does the door."""
    imke = shared_web.client("imke").get("/api/session").json()["person"]["id"]
    bashir = shared_web.client("bashir")
    door = f"/api/sheets/{shared_web.demo.open_sheet_id}/entries"
    headers = {"X-Titrant-Ledger": "bench", "X-Titrant-Person": imke}

    answer = bashir.client.post(door, json=[], headers=headers)

    assert answer.status_code == 401
    assert "somebody else" in answer.json()["detail"]


def test_form_opened_before_signing_in_is_shown_again_with_what_was_typed(
    shared_web: Any, other_token: str
) -> None:
    imke = shared_web.client("imke")
    typed = {"form_token": other_token, "key": "k", "name": "Lye of the long afternoon"}

    answer = imke.client.post("/lots/new", data=typed)

    assert answer.status_code == 403
    assert 'value="Lye of the long afternoon"' in answer.text
    assert imke.token in answer.text

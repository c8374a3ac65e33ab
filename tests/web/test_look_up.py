"""The look-up over HTTP, and the page behind the label."""

import re
from datetime import timedelta
from typing import Any

import pytest

KEYS = {
    "bottle", "titrant", "lot", "state", "in_force", "concentration", "factor", "valid_for",
    "valid_until", "certificate", "as_of",
}  # fmt: skip
CONCENTRATION = {
    "value", "u", "U", "k", "dof", "coverage", "unit", "temperature_C", "reported"
}  # fmt: skip


@pytest.fixture(scope="module")
def visitor(shared_web: Any) -> Any:
    return shared_web.visitor()


@pytest.fixture(scope="module")
def good(shared_web: Any) -> str:
    code: str = shared_web.demo.bottles_in_force[-1]
    return code


@pytest.fixture(scope="module")
def out(shared_web: Any) -> list[str]:
    return [one for one in shared_web.demo.bottles if one not in shared_web.demo.bottles_in_force]


def test_bottle_in_force_tells_its_number_to_a_visitor(visitor: Any, good: str) -> None:
    found = visitor.get(f"/api/bottles/{good}").json()

    assert found.keys() >= KEYS
    assert found["in_force"] is True
    assert found["bottle"] == good
    assert found["concentration"].keys() >= CONCENTRATION
    assert found["concentration"]["unit"] == "mol/L"
    assert found["certificate"]["url"].startswith("/certificates/TL-")


def test_page_and_api_agree_on_every_digit(visitor: Any, good: str) -> None:
    found = visitor.get(f"/api/bottles/{good}").json()
    page = visitor.get(f"/b/{good}").text

    reported = re.fullmatch(
        r"(\S+) ± (\S+) mol/L \(k = (\S+)\)", found["concentration"]["reported"]
    )
    assert reported is not None
    assert f'<span class="big-number">{reported[1]}</span>' in page
    assert f"± {reported[2]} mol/L" in page
    assert f"k = {reported[3]}" in page
    assert found["certificate"]["number"] in page


def test_code_is_taken_in_any_case_and_either_path(visitor: Any, good: str) -> None:
    pages = [visitor.get(path) for path in (f"/b/{good}", f"/B/{good}", f"/b/{good.lower()}")]

    assert {one.status_code for one in pages} == {200}
    assert all(f'<span class="digits">{good}</span>' in one.text for one in pages)
    assert visitor.get(f"/api/bottles/{good.lower()}").json()["bottle"] == good


def test_plain_text_is_number_and_unit_on_one_line(visitor: Any, good: str) -> None:
    answer = visitor.get(f"/api/bottles/{good}", headers={"Accept": "text/plain"})

    assert answer.headers["content-type"].startswith("text/plain")
    assert re.fullmatch(r"0\.\d{4,6} mol/L\n", answer.text)

    address = f"/api/bottles/{good}?at=30.0"
    warm = visitor.get(address, headers={"Accept": "text/plain"}).text
    assert warm.split()[0] == visitor.get(address).json()["at_temperature"]["reported"].split()[0]
    assert warm != answer.text


def test_bottle_that_is_not_in_force_has_no_number_in_any_form(
    visitor: Any, out: list[str]
) -> None:
    """R010: no number that no standing certificate carries, anywhere."""
    assert out
    for code in out:
        answer = visitor.get(f"/api/bottles/{code}")
        plain = visitor.get(f"/api/bottles/{code}", headers={"Accept": "text/plain"})
        page = visitor.get(f"/b/{code}")

        assert answer.status_code == plain.status_code == page.status_code == 200
        assert answer.json()["in_force"] is False
        assert answer.json()["concentration"] is None
        assert plain.text.startswith("not in force: ")
        assert "mol/L" not in plain.text
        assert "big-number" not in page.text
        assert "Do not use" in page.text


def test_certificate_that_lapses_takes_the_number_away_to_the_second(web: Any) -> None:
    code = web.demo.bottles_in_force[-1]
    visitor = web.visitor()
    until = visitor.get(f"/api/bottles/{code}").json()["valid_until"]
    last = type(web.clock.at).fromisoformat(until)

    web.clock.at = last - timedelta(microseconds=1)
    assert visitor.get(f"/api/bottles/{code}").json()["in_force"] is True
    web.clock.at = last
    assert visitor.get(f"/api/bottles/{code}").json()["in_force"] is False
    assert visitor.get(f"/api/bottles/{code}").json()["state"] == "lapsed"


def test_held_bottle_loses_its_number_at_once_and_gets_it_back_when_released(web: Any) -> None:
    code = web.demo.bottles_in_force[-1]
    visitor, imke, jonas = web.visitor(), web.client("imke"), web.client("jonas")

    assert imke.form("/hold", kind="bottle", thing=code, reason="cloudy").status_code == 303
    assert visitor.get(f"/api/bottles/{code}").json()["concentration"] is None
    assert imke.form("/release", kind="bottle", thing=code, reason="clear").status_code == 403
    assert jonas.form("/release", kind="bottle", thing=code, reason="clear").status_code == 303

    assert visitor.get(f"/api/bottles/{code}").json()["in_force"] is True


def test_temperature_of_use_adds_its_uncertainty(visitor: Any, good: str) -> None:
    found = visitor.get(f"/api/bottles/{good}?at=24.0").json()
    warm, plain = found["at_temperature"], found["concentration"]

    assert warm["value"] < plain["value"]
    assert warm["u"] >= plain["u"] * 0.999


@pytest.mark.parametrize("at", ["warm", "24,0,0", "1e3", "-400", "nan"])
def test_temperature_that_is_none_is_refused_naming_the_field(
    visitor: Any, good: str, at: str
) -> None:
    answer = visitor.get(f"/api/bottles/{good}", params={"at": at})

    assert answer.status_code == 422
    assert answer.json()["field"] == "at"


def test_unknown_code_is_not_found_with_the_nearest_codes(web: Any) -> None:
    good = web.demo.bottles_in_force[-1]
    slip = good[:-1] + ("0" if good[-1] != "0" else "1")

    answer = web.visitor().get(f"/api/bottles/{slip}")

    assert answer.status_code == 404
    assert good in answer.json()["shown"]["nearest"]
    assert web.visitor().get(f"/b/{slip}").status_code == 404


def test_only_unknown_codes_are_slowed_down(web: Any) -> None:
    visitor = web.visitor()
    good = web.demo.bottles_in_force[-1]
    for _ in range(30):
        assert visitor.get("/api/bottles/AAAAAAAA").status_code == 404

    slowed = visitor.get("/api/bottles/AAAAAAAA")

    assert slowed.status_code == 429
    assert int(slowed.headers["retry-after"]) > 0
    assert visitor.get("/b/AAAAAAAA").status_code == 429
    assert visitor.get(f"/api/bottles/{good}").status_code == 200
    web.clock.at += timedelta(minutes=1)
    assert visitor.get("/api/bottles/AAAAAAAA").status_code == 404


def test_closed_shelf_is_closed_to_visitors_everywhere(web: Any) -> None:
    steward, visitor, reader = web.client("marisol"), web.visitor(), web.client("rosa")
    good = web.demo.bottles_in_force[-1]
    settings = {"name": "Lab", "address": "", "zone": "Europe/Zurich", "revision": 1}
    assert steward.post("/api/laboratory", {**settings, "shelf_open": False}).status_code == 200

    for path in ("/", "/api/shelf", f"/b/{good}", f"/api/bottles/{good}"):
        assert visitor.get(path).status_code == 401, path
        assert reader.get(path).status_code == 200, path


def test_visitor_is_told_no_name_of_any_person(shared_web: Any, visitor: Any) -> None:
    """R113: on no page, in no JSON, in force or not."""
    names = [one.printed_name for one in shared_web.demo.people]
    names += [one.sign_in_name for one in shared_web.demo.people]
    paths = ["/", "/about", "/sign-in", "/api/shelf"]
    for code in shared_web.demo.bottles:
        paths += [f"/b/{code}", f"/api/bottles/{code}"]
    for path in paths:
        text = visitor.get(path).text
        for name in names:
            assert name not in text, (path, name)


def test_shelf_lists_bottles_in_force_to_a_visitor_with_links(
    shared_web: Any, visitor: Any
) -> None:
    page = visitor.get("/").text

    for code in shared_web.demo.bottles_in_force:
        assert f'href="/b/{code}"' in page
    for code in set(shared_web.demo.bottles) - set(shared_web.demo.bottles_in_force):
        assert code not in page


def test_health_answers_without_a_write(shared_web: Any, visitor: Any) -> None:
    def rows() -> list[int]:
        with shared_web.transactions.database.reader.connect() as connection:
            tables = connection.exec_driver_sql(
                "SELECT name FROM sqlite_master WHERE type = 'table' ORDER BY name"
            ).scalars()
            return [
                connection.exec_driver_sql(f'SELECT count(*) FROM "{table}"').scalar_one()
                for table in tables.all()
            ]

    before = rows()
    answer = visitor.get("/health")

    assert answer.status_code == 200
    assert answer.json()["status"] == "ok"
    assert rows() == before


#: Acts over the API that take no body.
SAYS_ALL_IN_ITS_ADDRESS = frozenset({"used-up", "opened", "confirm-pull", "revoke"})


def test_openapi_describes_every_route_of_the_api(visitor: Any) -> None:
    from server.web.wiring import API_PREFIX, ROUTERS

    paths = visitor.get("/api/openapi.json").json()["paths"]
    for prefix, router in ROUTERS:
        if prefix != API_PREFIX:
            continue
        for route in router.routes:
            described = paths[prefix + route.path]  # type: ignore[attr-defined]
            for method in route.methods - {"HEAD"}:  # type: ignore[attr-defined]
                assert described[method.lower()]["summary"]
                last = route.path.rpartition("/")[2]  # type: ignore[attr-defined]
                if method == "POST" and last not in SAYS_ALL_IN_ITS_ADDRESS:
                    assert "requestBody" in described["post"], route.path  # type: ignore[attr-defined]
    others = {path for path in paths if not path.startswith("/api/")}
    assert others == {"/health", "/.well-known/jwks.json"}

"""R058, R028: every route for every role answers what the laboratory's table of acts says."""

from collections.abc import Callable, Iterator
from dataclasses import dataclass
from typing import Any
from uuid import uuid4

import pytest

from server.lab.scopes import Scope
from server.web.bearer import ROUTES as TOKEN_ROUTES
from server.web.wiring import ROUTERS

NOBODY = str(uuid4())
NO_CODE = "ZZZZZZZ"
ROLES = ("visitor", "analyst", "countersigner", "keeper", "steward", "reader")
SIGNED_IN = frozenset(ROLES) - {"visitor"}
EVERYBODY = frozenset(ROLES)


@dataclass(frozen=True)
class Case:
    """Who may, what an allowed one is answered, and what is sent.

    ``token`` is what a script with an analyst's token is answered, whose scopes are all ticked.
    """

    who: frozenset[str]
    status: int
    address: str | None = None
    body: dict[str, Any] | None = None
    refused: int = 403
    visitor: int = 401
    token: int = 403


def only(*roles: str) -> frozenset[str]:
    return frozenset(roles)


REASON = {"reason": "cloudy"}
ANALYST, KEEPER, STEWARD = only("analyst"), only("keeper"), only("steward")
COUNTERSIGNER = only("countersigner")
BENCH = only("analyst", "countersigner")
HOLDERS = only("analyst", "countersigner", "keeper")
RELEASERS = only("keeper", "countersigner")
LOGGERS = only("analyst", "keeper")
NO_LOT = f"/stores/standard-lots/{NOBODY}"
PULL = {"reason": "the flask was not clean"}
BEGIN = {
    "lot_code": "NOCODE00",
    "recipe_id": NOBODY,
    "standard_lot_id": NOBODY,
    "balance_id": NOBODY,
    "burette_id": NOBODY,
}
CALIBRATION = {
    "certificate_number": "C-1",
    "issuer": "calibration house",
    "done_on": "2026-05-01",
    "due_on": "2027-05-01",
    "due_basis": "own plan",
    "document": {},
}
NO_INSTRUMENT = f"/api/instruments/{NOBODY}"
PLAN = {"done_on": "2026-05-01", "due_on": "2027-05-01", "due_basis": "own plan"}
PERSON = {
    "sign_in_name": "",
    "printed_name": "Nobody Yet",
    "roles": ["reader"],
    "password": "words that stand far apart",
}
SETTINGS = {"name": "x", "address": "", "zone": "Europe/Zurich", "revision": 999}
LABELS_FORM = {"stock": "62x40", "first_place": "1", "dots_per_inch": "300"}
HAZARDS = {
    "titrant": "NaOH",
    "nominal": "0.1",
    "confirmed_by": "Maren Lind",
    "confirmed_on": "2026-05-01",
    "signal_word": "Warning",
    "revision": 999,
}
WITHDRAW = {"titrant": "NaOH", "nominal": "0.1", "reason": "x", "revision": 999}
HOLD = {"kind": "lot", "thing": "NOCODE00", "reason": "cloudy"}

# names.md, "People": act by act. An allowed one gets past the role: 404 for a thing that is not
# there, 422 for a value that cannot be taken, 409 for a revision that is none.
PAGES: dict[str, Case] = {
    "GET /": Case(EVERYBODY, 200),
    "GET /shelf/list.csv": Case(EVERYBODY, 200, token=200),
    "GET /b/{code}": Case(EVERYBODY, 200),
    "GET /B/{code}": Case(EVERYBODY, 200),
    "POST /b/{code}/used-up": Case(ANALYST, 404, f"/b/{NO_CODE}/used-up"),
    "POST /b/{code}/opened": Case(ANALYST, 404, f"/b/{NO_CODE}/opened"),
    "POST /b/{code}/moved": Case(ANALYST, 404, f"/b/{NO_CODE}/moved", {"place": "Shelf 9"}),
    "POST /b/{code}/uses": Case(LOGGERS, 404, f"/b/{NO_CODE}/uses", {"result_id": "W-1"}),
    "POST /b/{code}/uses/{use_id}/strike": Case(
        LOGGERS, 404, f"/b/{NO_CODE}/uses/{NOBODY}/strike", REASON
    ),
    "POST /watch": Case(SIGNED_IN, 404, None, {"kind": "bottle", "thing": NO_CODE}),
    "POST /watch/stop": Case(SIGNED_IN, 404, None, {"kind": "bottle", "thing": NO_CODE}),
    "GET /notices": Case(SIGNED_IN, 200),
    "POST /notices/read": Case(SIGNED_IN, 422, None, {"until": "never"}),
    "POST /notices/address": Case(SIGNED_IN, 422, None, {"address": "nowhere"}),
    "POST /me/tokens": Case(
        SIGNED_IN, 422, None, {"name": "x", "days": "1", "password": "{password}"}
    ),
    "POST /me/tokens/{token_id}/revoke": Case(SIGNED_IN, 404, f"/me/tokens/{NOBODY}/revoke"),
    "GET /sign-in": Case(EVERYBODY, 200),
    "POST /sign-in": Case(SIGNED_IN, 303),
    "POST /sign-out": Case(EVERYBODY, 303),
    "GET /setup": Case(EVERYBODY, 303),
    "POST /setup": Case(frozenset(), 0, None, {"setup_code": "x"}, visitor=403),
    "GET /me": Case(SIGNED_IN, 200),
    "POST /me": Case(SIGNED_IN, 422, None, {"old": "x", "new": "short"}),
    "GET /bench": Case(SIGNED_IN, 200),
    "GET /bench/begin": Case(only("analyst", "keeper"), 200, "/bench/begin?lot={lot}"),
    "POST /bench": Case(ANALYST, 404, None, BEGIN),
    "GET /bench/{sheet_id}": Case(SIGNED_IN, 200),
    "GET /bench/{sheet_id}/hand-in": Case(ANALYST, 200),
    "POST /bench/{sheet_id}/hand-in": Case(
        ANALYST, 404, f"/bench/{NOBODY}/hand-in", {"revision": "1"}
    ),
    "POST /bench/{sheet_id}/abandon": Case(ANALYST, 404, f"/bench/{NOBODY}/abandon", REASON),
    "POST /bench/{sheet_id}/let-be-used": Case(
        KEEPER, 404, f"/bench/{NOBODY}/let-be-used", {"what": "balance", **REASON}
    ),
    "GET /sheets/{sheet_id}/curves/{replicate}": Case(
        SIGNED_IN, 200, "/sheets/{curve_sheet}/curves/1"
    ),
    "GET /sheets/{sheet_id}/curves/{replicate}/part": Case(
        SIGNED_IN, 200, "/sheets/{curve_sheet}/curves/1/part"
    ),
    "GET /countersign": Case(SIGNED_IN, 200),
    "GET /countersign/{sheet_id}": Case(BENCH, 200),
    "POST /countersign/{sheet_id}": Case(
        COUNTERSIGNER, 404, f"/countersign/{NOBODY}", {"revision": "1", "password": "{password}"}
    ),
    "POST /countersign/{sheet_id}/send-back": Case(
        COUNTERSIGNER, 404, f"/countersign/{NOBODY}/send-back", {"revision": "1", "remark": "x"}
    ),
    "GET /certificates/{number}": Case(SIGNED_IN, 200),
    "GET /certificates/{number}.pdf": Case(SIGNED_IN, 200),
    "GET /certificates/{number}.json": Case(SIGNED_IN, 200),
    "GET /certificates/{number}.jws": Case(SIGNED_IN, 200),
    "GET /certificates/{number}.dcc.xml": Case(SIGNED_IN, 200),
    "GET /certificates/{number}.bench-record.json": Case(SIGNED_IN, 200),
    "GET /stores": Case(SIGNED_IN, 200),
    "GET /stores/standard-lots/new": Case(KEEPER, 200),
    "POST /stores/standard-lots/new": Case(KEEPER, 422),
    "GET /stores/standard-lots/{standard_lot_id}": Case(SIGNED_IN, 200),
    "POST /stores/standard-lots/{standard_lot_id}/opened": Case(LOGGERS, 404, f"{NO_LOT}/opened"),
    "POST /stores/standard-lots/{standard_lot_id}/dryings": Case(LOGGERS, 404, f"{NO_LOT}/dryings"),
    "POST /stores/standard-lots/{standard_lot_id}/uses": Case(LOGGERS, 404, f"{NO_LOT}/uses"),
    "POST /stores/standard-lots/{standard_lot_id}/counts": Case(LOGGERS, 404, f"{NO_LOT}/counts"),
    "POST /stores/standard-lots/{standard_lot_id}/retests": Case(KEEPER, 404, f"{NO_LOT}/retests"),
    "POST /stores/standard-lots/{standard_lot_id}/strike": Case(LOGGERS, 404, f"{NO_LOT}/strike"),
    "POST /stores/standard-lots/{standard_lot_id}/certificate": Case(
        KEEPER, 404, f"{NO_LOT}/certificate"
    ),
    "GET /stores/standard-lots/list.csv": Case(SIGNED_IN, 200, token=200),
    "GET /files/{file_id}": Case(SIGNED_IN, 200),
    "GET /planner": Case(SIGNED_IN, 200),
    "GET /stores/recipes/new": Case(KEEPER, 200),
    "POST /stores/recipes/new": Case(KEEPER, 422),
    "GET /stores/recipes/{recipe_id}": Case(SIGNED_IN, 200),
    "GET /instruments": Case(SIGNED_IN, 200),
    "GET /instruments/list.csv": Case(SIGNED_IN, 200, token=200),
    "GET /instruments/new": Case(KEEPER, 200),
    "POST /instruments/new": Case(KEEPER, 422, None, {"kind": "teapot"}),
    "GET /instruments/{instrument_id}": Case(SIGNED_IN, 200),
    "GET /instruments/{instrument_id}/calibrations/new": Case(KEEPER, 200),
    "POST /instruments/{instrument_id}/calibrations/new": Case(KEEPER, 422),
    "GET /instruments/{instrument_id}/calibrations/{version}": Case(
        SIGNED_IN, 200, "/instruments/{instrument_id}/calibrations/1"
    ),
    "POST /instruments/{instrument_id}/identity": Case(KEEPER, 422),
    "POST /instruments/{instrument_id}/limits": Case(KEEPER, 422),
    "POST /instruments/{instrument_id}/checks": Case(LOGGERS, 422),
    "POST /instruments/{instrument_id}/strike": Case(LOGGERS, 404),
    "GET /instruments/{instrument_id}/class/new": Case(
        KEEPER, 200, "/instruments/{ware_id}/class/new"
    ),
    "POST /instruments/{instrument_id}/class/new": Case(
        KEEPER, 422, "/instruments/{ware_id}/class/new"
    ),
    "GET /instruments/{instrument_id}/runs/new": Case(KEEPER, 200),
    "POST /instruments/{instrument_id}/runs/new": Case(KEEPER, 422, None, {"do": "record"}),
    "GET /instruments/{instrument_id}/drops/new": Case(
        LOGGERS, 200, "/instruments/{burette_id}/drops/new"
    ),
    "POST /instruments/{instrument_id}/drops/new": Case(
        LOGGERS, 422, "/instruments/{burette_id}/drops/new"
    ),
    "GET /instruments/{instrument_id}/imports/new": Case(KEEPER, 200),
    "POST /instruments/{instrument_id}/imports/new": Case(KEEPER, 422),
    "GET /instruments/{instrument_id}/imports/{file_id}": Case(KEEPER, 200),
    "POST /instruments/{instrument_id}/imports/{file_id}": Case(KEEPER, 422),
    "GET /lots": Case(SIGNED_IN, 200),
    "GET /lots/list.csv": Case(SIGNED_IN, 200, token=200),
    "GET /lots/{code}/uses.csv": Case(SIGNED_IN, 200, "/lots/{lot}/uses.csv", token=200),
    "GET /lots/new": Case(ANALYST, 200),
    "POST /lots/new": Case(ANALYST, 422),
    "GET /lots/{code}": Case(SIGNED_IN, 200, "/lots/{lot}"),
    "GET /lots/{code}/methods": Case(SIGNED_IN, 200, "/lots/{lot}/methods"),
    "GET /lots/{code}/export.zip": Case(SIGNED_IN, 200, "/lots/{lot}/export.zip"),
    "GET /labels": Case(SIGNED_IN, 200, "/labels?thing={lot}"),
    "POST /labels": Case(LOGGERS, 422, None, LABELS_FORM),
    "GET /labels/prints/{number}": Case(SIGNED_IN, 200, "/labels/prints/{print}"),
    "GET /labels/prints/{number}.pdf": Case(SIGNED_IN, 200, "/labels/prints/{print}.pdf"),
    "GET /labels/prints/{number}.png": Case(SIGNED_IN, 200, "/labels/prints/{print}.png"),
    "POST /lots/{code}/bottles": Case(ANALYST, 404, f"/lots/{NO_CODE}/bottles", {"count": "1"}),
    "POST /lots/{code}/propose-pull": Case(KEEPER, 404, f"/lots/{NO_CODE}/propose-pull", PULL),
    "POST /lots/{code}/confirm-pull": Case(COUNTERSIGNER, 404, f"/lots/{NO_CODE}/confirm-pull"),
    "POST /hold": Case(HOLDERS, 404, None, HOLD),
    "POST /release": Case(RELEASERS, 404, None, HOLD),
    "GET /trail": Case(SIGNED_IN, 200),
    "GET /trail/list.csv": Case(SIGNED_IN, 200, token=200),
    "GET /trail/list.jsonl": Case(SIGNED_IN, 200, token=200),
    "GET /people": Case(STEWARD, 200),
    "POST /people/new": Case(STEWARD, 422, None, PERSON),
    "POST /people/{person_id}/roles": Case(
        STEWARD, 404, f"/people/{NOBODY}/roles", {"revision": "1", "roles": ["reader"]}
    ),
    "POST /people/{person_id}/close": Case(STEWARD, 404, f"/people/{NOBODY}/close"),
    "GET /laboratory": Case(STEWARD, 200),
    "POST /laboratory/hazards": Case(STEWARD, 409, None, {**HAZARDS, "revision": "999"}),
    "POST /laboratory/hazards/withdraw": Case(STEWARD, 409, None, {**WITHDRAW, "revision": "999"}),
    "POST /laboratory": Case(STEWARD, 409, None, {**SETTINGS, "revision": "999"}),
    "GET /about": Case(EVERYBODY, 200),
}
API: dict[str, Case] = {
    "POST /api/session": Case(SIGNED_IN, 201),
    "GET /api/session": Case(SIGNED_IN, 200),
    "DELETE /api/session": Case(SIGNED_IN, 204),
    "POST /api/session/password": Case(SIGNED_IN, 422, None, {"old": "x", "new": "short"}),
    "GET /api/bottles/{code}": Case(EVERYBODY, 200, token=200),
    "POST /api/bottles/{code}/used-up": Case(ANALYST, 404, f"/api/bottles/{NO_CODE}/used-up"),
    "POST /api/bottles/{code}/opened": Case(ANALYST, 404, f"/api/bottles/{NO_CODE}/opened"),
    "POST /api/bottles/{code}/moved": Case(
        ANALYST, 404, f"/api/bottles/{NO_CODE}/moved", {"place": "Shelf 9"}
    ),
    "GET /api/bottles/{code}/uses": Case(SIGNED_IN, 200, token=200),
    "POST /api/bottles/{code}/uses": Case(
        LOGGERS, 404, f"/api/bottles/{NO_CODE}/uses", {"result_id": "W-1"}, token=404
    ),
    "POST /api/bottles/{code}/uses/{use_id}/strike": Case(
        LOGGERS, 404, f"/api/bottles/{NO_CODE}/uses/{NOBODY}/strike", REASON
    ),
    "GET /api/lots/{code}/uses": Case(SIGNED_IN, 200, "/api/lots/{lot}/uses", token=200),
    "GET /api/notices": Case(SIGNED_IN, 200),
    "POST /api/watches": Case(SIGNED_IN, 404, None, {"kind": "bottle", "thing": NO_CODE}),
    "POST /api/watches/stop": Case(SIGNED_IN, 404, None, {"kind": "bottle", "thing": NO_CODE}),
    "POST /api/notices/read": Case(SIGNED_IN, 422, None, {"until": "never"}),
    "POST /api/notices/address": Case(SIGNED_IN, 422, None, {"address": "nowhere"}),
    "GET /api/tokens": Case(SIGNED_IN, 200),
    "POST /api/tokens": Case(
        SIGNED_IN, 422, None, {"name": "x", "scopes": [], "password": "{password}"}
    ),
    "POST /api/tokens/{token_id}/revoke": Case(SIGNED_IN, 404, f"/api/tokens/{NOBODY}/revoke"),
    "GET /api/shelf": Case(EVERYBODY, 200, token=200),
    "GET /api/sheets": Case(SIGNED_IN, 200),
    "POST /api/sheets": Case(ANALYST, 404, None, BEGIN),
    "GET /api/sheets/{sheet_id}": Case(SIGNED_IN, 200),
    "POST /api/sheets/{sheet_id}/entries": Case(
        ANALYST,
        404,
        f"/api/sheets/{NOBODY}/entries",
        {"entries": [{"id": NOBODY, "replicate": 0, "slot": "temperature", "text": "21.0"}]},
    ),
    "POST /api/sheets/{sheet_id}/curves/preview": Case(
        ANALYST,
        404,
        f"/api/sheets/{NOBODY}/curves/preview",
        {"replicate": 1, "pasted": "0.00; 4.01"},
    ),
    "GET /api/sheets/{sheet_id}/curves/{replicate}": Case(
        SIGNED_IN, 200, "/api/sheets/{curve_sheet}/curves/1"
    ),
    "GET /api/sheets/{sheet_id}/curves/{replicate}/chart": Case(
        SIGNED_IN, 200, "/api/sheets/{curve_sheet}/curves/1/chart"
    ),
    "GET /api/sheets/{sheet_id}/hand-in": Case(ANALYST, 200),
    "POST /api/sheets/{sheet_id}/hand-in": Case(
        ANALYST, 404, f"/api/sheets/{NOBODY}/hand-in", {"revision": 1, "password": "x"}
    ),
    "POST /api/sheets/{sheet_id}/abandon": Case(
        ANALYST, 404, f"/api/sheets/{NOBODY}/abandon", REASON
    ),
    "POST /api/sheets/{sheet_id}/let-be-used": Case(
        KEEPER, 404, f"/api/sheets/{NOBODY}/let-be-used", {"what": "balance", **REASON}
    ),
    "GET /api/countersign": Case(SIGNED_IN, 200),
    "GET /api/sheets/{sheet_id}/countersign": Case(BENCH, 200),
    "POST /api/sheets/{sheet_id}/countersign": Case(
        COUNTERSIGNER,
        404,
        f"/api/sheets/{NOBODY}/countersign",
        {"revision": 1, "password": "{password}"},
    ),
    "POST /api/sheets/{sheet_id}/send-back": Case(
        COUNTERSIGNER, 404, f"/api/sheets/{NOBODY}/send-back", {"revision": 1, "remark": "x"}
    ),
    "GET /api/certificates/{number}": Case(SIGNED_IN, 200, token=200),
    "GET /api/certificates/{number}.pdf": Case(SIGNED_IN, 200, token=200),
    "GET /api/certificates/{number}.json": Case(SIGNED_IN, 200, token=200),
    "GET /api/certificates/{number}.jws": Case(SIGNED_IN, 200, token=200),
    "GET /api/certificates/{number}.dcc.xml": Case(SIGNED_IN, 200, token=200),
    "GET /api/certificates/{number}.bench-record.json": Case(SIGNED_IN, 200, token=200),
    "GET /.well-known/jwks.json": Case(EVERYBODY, 200, token=200),
    "POST /api/lots": Case(ANALYST, 422, None, {"titrant": "NaOH", "nominal": "-1"}),
    "GET /api/lots/{code}": Case(SIGNED_IN, 200, "/api/lots/{lot}"),
    "GET /api/lots/{code}/methods": Case(SIGNED_IN, 200, "/api/lots/{lot}/methods"),
    "GET /api/lots/{code}/export.zip": Case(SIGNED_IN, 200, "/api/lots/{lot}/export.zip"),
    "GET /api/labels": Case(SIGNED_IN, 200),
    "POST /api/labels": Case(LOGGERS, 422, None, {"bottles": [], "stock": "62x40"}),
    "GET /api/labels/{number}": Case(SIGNED_IN, 200, "/api/labels/{print}"),
    "GET /api/labels/{number}.pdf": Case(SIGNED_IN, 200, "/api/labels/{print}.pdf"),
    "GET /api/labels/{number}.png": Case(SIGNED_IN, 200, "/api/labels/{print}.png"),
    "POST /api/lots/{code}/bottles": Case(
        ANALYST, 404, f"/api/lots/{NO_CODE}/bottles", {"place": "x", "volume_mL": "1000"}
    ),
    "POST /api/lots/{code}/propose-pull": Case(
        KEEPER, 404, f"/api/lots/{NO_CODE}/propose-pull", PULL
    ),
    "POST /api/lots/{code}/confirm-pull": Case(
        COUNTERSIGNER, 404, f"/api/lots/{NO_CODE}/confirm-pull"
    ),
    "POST /api/holds": Case(HOLDERS, 404, None, HOLD),
    "POST /api/releases": Case(RELEASERS, 404, None, HOLD),
    "GET /api/stores": Case(SIGNED_IN, 200),
    "POST /api/standard-lots": Case(
        KEEPER,
        422,
        None,
        {
            "name": "",
            "substance": "KHP",
            "certificate_number": "x",
            "issuer": "x",
            "due_on": "2027-01-01",
            "due_basis": "x",
            "mass_fraction": {},
        },
    ),
    "GET /api/standard-lots/{standard_lot_id}": Case(SIGNED_IN, 200),
    "POST /api/standard-lots/{standard_lot_id}/opened": Case(
        LOGGERS, 404, f"/api/standard-lots/{NOBODY}/opened", {"day": "2026-05-01"}
    ),
    "POST /api/standard-lots/{standard_lot_id}/dryings": Case(
        LOGGERS, 404, f"/api/standard-lots/{NOBODY}/dryings", {"ended_at": "2026-05-01T10:00"}
    ),
    "POST /api/standard-lots/{standard_lot_id}/uses": Case(
        LOGGERS, 404, f"/api/standard-lots/{NOBODY}/uses", {"mass_g": "1", "says": "x"}
    ),
    "POST /api/standard-lots/{standard_lot_id}/counts": Case(
        LOGGERS, 404, f"/api/standard-lots/{NOBODY}/counts", {"mass_g": "1"}
    ),
    "POST /api/standard-lots/{standard_lot_id}/retests": Case(
        KEEPER,
        404,
        f"/api/standard-lots/{NOBODY}/retests",
        {"done_on": "2026-05-01", "next_on": "2027-05-01", "says": "unchanged"},
    ),
    "POST /api/standard-lots/{standard_lot_id}/strike": Case(
        LOGGERS, 404, f"/api/standard-lots/{NOBODY}/strike", {"line_id": NOBODY, **REASON}
    ),
    "POST /api/standard-lots/{standard_lot_id}/certificate": Case(
        KEEPER,
        404,
        f"/api/standard-lots/{NOBODY}/certificate",
        {"file_name": "a.pdf", "content_base64": "JVBERi0="},
    ),
    "GET /api/files/{file_id}": Case(SIGNED_IN, 200),
    "GET /api/planner": Case(SIGNED_IN, 200),
    "GET /api/lots": Case(SIGNED_IN, 200),
    "POST /api/recipes": Case(KEEPER, 422, None, {"name": "", "document": {}}),
    "GET /api/recipes/{recipe_id}": Case(SIGNED_IN, 200),
    "GET /api/instruments": Case(SIGNED_IN, 200),
    "POST /api/instruments": Case(
        KEEPER,
        422,
        None,
        {"kind": "teapot", "name": "x", "maker": "", "type": "", "serial": "", "location": ""},
    ),
    "GET /api/instruments/{instrument_id}": Case(SIGNED_IN, 200),
    "POST /api/instruments/{instrument_id}/calibrations": Case(
        KEEPER, 404, f"/api/instruments/{NOBODY}/calibrations", CALIBRATION
    ),
    "GET /api/instruments/{instrument_id}/calibrations/{version}": Case(
        SIGNED_IN, 200, "/api/instruments/{instrument_id}/calibrations/1"
    ),
    "POST /api/instruments/{instrument_id}/identity": Case(
        KEEPER,
        404,
        f"{NO_INSTRUMENT}/identity",
        {"described": {"location": "x"}, "seen": {}, **REASON},
    ),
    "POST /api/instruments/{instrument_id}/runs": Case(
        KEEPER, 404, f"{NO_INSTRUMENT}/runs", {"run": {}, **PLAN}
    ),
    "POST /api/instruments/{instrument_id}/runs/preview": Case(KEEPER, 200, None, {"run": {}}),
    "POST /api/instruments/{instrument_id}/class": Case(
        KEEPER, 404, f"{NO_INSTRUMENT}/class", {"nominal": "10", **PLAN}
    ),
    "POST /api/instruments/{instrument_id}/imports": Case(
        KEEPER,
        422,
        None,
        {"file_name": "a.csv", "content_base64": "PCFET0NUWVBFIHg+"},
    ),
    "GET /api/instruments/{instrument_id}/imports/{file_id}": Case(KEEPER, 200),
    "POST /api/instruments/{instrument_id}/limits": Case(
        KEEPER, 404, f"{NO_INSTRUMENT}/limits", {"document": {}}
    ),
    "POST /api/instruments/{instrument_id}/checks": Case(
        LOGGERS, 404, f"{NO_INSTRUMENT}/checks", {"reading": "100.0"}
    ),
    "POST /api/instruments/{instrument_id}/drops": Case(
        LOGGERS, 404, f"{NO_INSTRUMENT}/drops", {"drops": 20, "run": {}}
    ),
    "POST /api/instruments/{instrument_id}/log/{line_id}/strike": Case(
        LOGGERS, 404, f"{NO_INSTRUMENT}/log/{NOBODY}/strike", REASON
    ),
    "GET /api/trail": Case(SIGNED_IN, 200),
    "GET /api/people": Case(STEWARD, 200),
    "POST /api/people": Case(STEWARD, 422, None, PERSON),
    "POST /api/people/{person_id}/roles": Case(
        STEWARD, 404, f"/api/people/{NOBODY}/roles", {"revision": 1, "roles": ["reader"]}
    ),
    "POST /api/people/{person_id}/close": Case(STEWARD, 404, f"/api/people/{NOBODY}/close", {}),
    "GET /api/laboratory": Case(STEWARD, 200),
    "POST /api/laboratory/hazards": Case(STEWARD, 409, None, HAZARDS),
    "POST /api/laboratory/hazards/withdraw": Case(STEWARD, 409, None, WITHDRAW),
    "POST /api/laboratory": Case(STEWARD, 409, None, SETTINGS),
    "GET /health": Case(EVERYBODY, 200, token=200),
}
MATRIX = PAGES | API
#: Routes that ask nobody who he is, so that a token neither opens nor closes them.
ASKS_NOBODY = frozenset({"GET /health", "GET /.well-known/jwks.json"})
#: Beginning and ending sessions is tried on sessions of their own.
SESSIONS = frozenset(
    {"POST /sign-in", "POST /sign-out", "POST /api/session", "DELETE /api/session"}
)


def routes() -> Iterator[tuple[str, str]]:
    """Every route of the application, with its method."""
    for prefix, router in ROUTERS:
        for route in router.routes:
            for method in sorted(route.methods - {"HEAD"}):  # type: ignore[attr-defined]
                yield method, prefix + route.path  # type: ignore[attr-defined]


@pytest.fixture(scope="module")
def people(shared_web: Any) -> Callable[[str], Any]:
    """Somebody for each role, and a visitor; each signed in once."""
    found = {role: shared_web.client(name) for role, name in shared_web.roles.items()}

    def somebody(role: str) -> Any:
        return shared_web.visitor() if role == "visitor" else found[role]

    return somebody


@pytest.fixture(scope="module")
def things(shared_web: Any) -> dict[str, str]:
    """Things of the demonstration that addresses name."""
    reader = shared_web.client("rosa")
    bottle = shared_web.demo.bottles_in_force[0]
    card = reader.get(f"/api/bottles/{bottle}").json()
    stores = reader.get("/api/stores").json()
    standard_lot = stores["standard_lots"][0]["id"]
    kept = reader.get(f"/api/standard-lots/{standard_lot}").json()["file"]
    instruments = reader.get("/api/instruments").json()["instruments"]
    printed = shared_web.client("jonas").post(
        "/api/labels", {"bottles": [bottle], "stock": "62x40"}
    )
    lots = [one["id"] for one in shared_web.client("imke").get("/api/sheets").json()["lots"]]
    return {
        "code": bottle,
        "lot": lots[0],
        "number": card["certificate"]["number"],
        "print": str(printed.json()["number"]),
        "sheet_id": shared_web.demo.waiting_sheet_id,
        "open_sheet_id": shared_web.demo.sent_back_sheet_id,
        "curve_sheet": shared_web.demo.curve_sheet_id,
        "standard_lot_id": standard_lot,
        "file_id": kept["url"].removeprefix("/files/"),
        "recipe_id": stores["recipes"][0]["id"],
        "instrument_id": instruments[0]["id"],
        "burette_id": next(one["id"] for one in instruments if one["kind"] == "burette"),
        "ware_id": next(one["id"] for one in instruments if one["kind"] == "pipette"),
    }


def test_matrix_holds_every_route_and_no_other() -> None:
    assert {f"{method} {path}" for method, path in routes()} == set(MATRIX)


def _address(name: str, case: Case, things: dict[str, str]) -> str:
    address = case.address or name.partition(" ")[2]
    if name.endswith("/hand-in"):
        things = {**things, "sheet_id": things["open_sheet_id"]}
    for thing, value in things.items():
        address = address.replace(f"{{{thing}}}", value)
    return address


def _send(somebody: Any, name: str, address: str, case: Case) -> Any:
    method = name.partition(" ")[0]
    client = getattr(somebody, "client", somebody)
    if method == "GET":
        return client.get(address)
    body = dict(case.body or {})
    if body.get("password") == "{password}":
        body["password"] = getattr(somebody, "password", "x")
    token = getattr(somebody, "token", "none")
    if address.startswith("/api"):
        return client.request(method, address, json=body, headers={"X-Form-Token": token})
    if token == "none" and address in {"/sign-in", "/setup"}:
        token = _visitor_token(client)
    return client.post(address, data={"form_token": token, "key": str(uuid4()), **body})


def _visitor_token(client: Any) -> str:
    page: str = client.get("/sign-in").text
    return page.partition('name="form_token" value="')[2].partition('"')[0]


@pytest.mark.parametrize("role", ROLES)
@pytest.mark.parametrize("name", sorted(set(MATRIX) - SESSIONS))
def test_route_for_role_answers_what_the_table_says(
    name: str, role: str, people: Callable[[str], Any], things: dict[str, str]
) -> None:
    case = MATRIX[name]
    if role in case.who:
        wanted = case.status
    else:
        wanted = case.visitor if role == "visitor" else case.refused

    answer = _send(people(role), name, _address(name, case, things), case)

    assert answer.status_code == wanted, answer.text[:2000]


@pytest.fixture(scope="module")
def scripts(shared_web: Any) -> Callable[..., Any]:
    """Makers of scripts: each comes with an analyst's token of some scopes, and nothing else."""
    owner, found = shared_web.client("imke"), {}

    def script(*scopes: str) -> Any:
        if scopes not in found:
            asked = {"name": "script", "scopes": list(scopes), "password": owner.password}
            made = owner.post("/api/tokens", asked).json()
            client = shared_web.visitor()
            client.headers["Authorization"] = f"Bearer {made['token']}"
            found[scopes] = client
        return found[scopes]

    return script


@pytest.mark.parametrize("name", sorted(MATRIX))
def test_route_for_token_answers_what_the_table_says(
    name: str, scripts: Callable[..., Any], things: dict[str, str]
) -> None:
    case = MATRIX[name]
    address = _address(name, case, things)

    answer = _send(scripts(*Scope), name, address, case)
    assert answer.status_code == case.token, answer.text[:2000]
    assert "set-cookie" not in answer.headers
    if name in TOKEN_ROUTES:
        others = [scope for scope in Scope if scope is not TOKEN_ROUTES[name]]
        assert _send(scripts(*others), name, address, case).status_code == 403


def test_token_opens_the_routes_of_the_table_and_what_asks_nobody() -> None:
    asks_nobody = {name for name in MATRIX if name in ASKS_NOBODY}
    opened = {name for name, case in MATRIX.items() if case.token != 403}
    assert opened == set(TOKEN_ROUTES) | asks_nobody


@pytest.mark.parametrize("role", ROLES)
def test_sign_in_for_role_answers_what_the_table_says(role: str, shared_web: Any) -> None:
    name = shared_web.roles.get(role, "nobody")
    given = {"name": name, "password": shared_web.passwords.get(name, "nothing")}
    by_page, by_api = shared_web.visitor(), shared_web.visitor()
    form = {"form_token": _visitor_token(by_page), "key": "1", **given}
    page, api = (MATRIX[f"POST {path}"] for path in ("/sign-in", "/api/session"))

    answer = by_page.post("/sign-in", data=form)
    assert answer.status_code == (page.status if role in page.who else page.visitor)
    answer = by_api.post("/api/session", json=given)
    assert answer.status_code == (api.status if role in api.who else api.visitor)
    assert by_page.get("/me").status_code == by_api.get("/me").status_code
    assert by_page.get("/me").status_code == (200 if role in page.who else 401)


@pytest.mark.parametrize("role", ROLES)
def test_sign_out_for_role_ends_only_a_session_that_is_there(role: str, shared_web: Any) -> None:
    if role == "visitor":
        visitor = shared_web.visitor()
        assert visitor.post("/sign-out", data={}, headers=FORM).status_code == 303
        assert visitor.delete("/api/session").status_code == 401
        return
    by_page, by_api = (shared_web.client(shared_web.roles[role]) for _ in range(2))

    assert by_page.form("/sign-out").status_code == 303
    headers = {"X-Form-Token": by_api.token}
    assert by_api.client.delete("/api/session", headers=headers).status_code == 204

    assert by_page.get("/me").status_code == 401
    assert by_api.get("/me").status_code == 401


FORM = {"Content-Type": "application/x-www-form-urlencoded"}

"""The application, put together from its parts."""

from collections.abc import AsyncIterator
from contextlib import asynccontextmanager

from fastapi import APIRouter, FastAPI
from starlette.middleware import Middleware

from server.web.api import bottles as api_bottles
from server.web.api import certificates as api_certificates
from server.web.api import countersigning as api_countersigning
from server.web.api import curves as api_curves
from server.web.api import files as api_files
from server.web.api import health, keys
from server.web.api import instruments as api_instruments
from server.web.api import labels as api_labels
from server.web.api import laboratory as api_laboratory
from server.web.api import lots as api_lots
from server.web.api import notices as api_notices
from server.web.api import people as api_people
from server.web.api import planner as api_planner
from server.web.api import session as api_session
from server.web.api import sheets as api_sheets
from server.web.api import standard_lots as api_standard_lots
from server.web.api import stores as api_stores
from server.web.api import tokens as api_tokens
from server.web.api import trail as api_trail
from server.web.api import uses as api_uses
from server.web.api.desk import PROBLEMS
from server.web.chart_bundle import chart_router
from server.web.errors import add_error_handlers
from server.web.guards import Guards, Heads, Incidents
from server.web.headers import SecurityHeaders
from server.web.pages import (
    about,
    bench,
    bottles,
    calibrations,
    certificates,
    countersign,
    curves,
    files,
    holds,
    instruments,
    labels,
    laboratory,
    lists,
    lots,
    notices,
    people,
    planner,
    session,
    shelf,
    standard_lots,
    stores,
    tokens,
    trail,
)
from server.web.parts import Parts
from server.web.quick_look_up import QuickLookUp
from server.web.static_files import StaticFiles, static_router

_PAGES = (
    # lists first: an address such as /lots/list.csv is not that of a lot
    lists, shelf, bottles, session, tokens, notices, bench, curves, planner, countersign,
    certificates, stores, standard_lots, files, instruments, calibrations, lots, labels, holds,
    trail, people, laboratory, about,
)  # fmt: skip
_API = (
    api_session, api_tokens, api_bottles, api_uses, api_notices, api_sheets, api_curves,
    api_countersigning, api_certificates, api_lots, api_stores, api_standard_lots, api_planner,
    api_files, api_instruments, api_labels, api_trail, api_people, api_laboratory,
)  # fmt: skip
API_PREFIX = "/api"
#: Every router with the beginning of its addresses; tests go through all of their routes.
ROUTERS: tuple[tuple[str, APIRouter], ...] = (
    *(("", page.router) for page in _PAGES),
    *((API_PREFIX, api.router) for api in _API),
    ("", health.router),
    ("", keys.router),
)


def create_app(parts: Parts, static: StaticFiles) -> FastAPI:
    """Return the application; when it ends, its database is closed."""

    @asynccontextmanager
    async def life(_: FastAPI) -> AsyncIterator[None]:
        yield
        for end in parts.at_end:
            end()
        parts.transactions.close()

    app = FastAPI(
        title="Titrant Ledger",
        version=parts.version,
        lifespan=life,
        openapi_url="/api/openapi.json",
        docs_url=None,
        redoc_url=None,
        middleware=[
            Middleware(SecurityHeaders, secure=parts.secure),
            Middleware(Heads),
            Middleware(Incidents),
            Middleware(Guards),
        ],
    )
    app.state.parts = parts
    add_error_handlers(app)
    if parts.transactions.database.is_sqlite:
        # before the route that it takes the plain case from
        app.router.routes.append(QuickLookUp(f"{API_PREFIX}/bottles/{{code}}", parts))
    for prefix, router in ROUTERS:
        described = bool(router.tags)
        app.include_router(
            router,
            prefix=prefix,
            include_in_schema=described,
            responses=PROBLEMS if described else None,
        )
    app.include_router(static_router(static))
    app.include_router(chart_router(parts.chart_bundle))
    return app

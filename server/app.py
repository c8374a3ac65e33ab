"""The application, composed from settings, and served."""

import random
import socket
from collections.abc import Callable
from datetime import UTC, datetime
from importlib.metadata import PackageNotFoundError, version
from pathlib import Path

import uvicorn
from fastapi import FastAPI

from server.credentials.signing_keys import KeyProblem, open_signing_keys
from server.demo.laboratory import DemoSummary, fill_demo
from server.files import find_folder
from server.lab.codes import new_code
from server.records.database import DatabaseProblem, open_database
from server.records.migrating import migrate
from server.records.queries.loading import there_is_a_laboratory
from server.records.transaction import Transactions
from server.settings import DATABASE_VARIABLE, Settings, SettingsProblem
from server.upkeep.post_office import PostOffice
from server.web.parts import Parts
from server.web.static_files import StaticFiles
from server.web.templating import Templating
from server.web.unknown_codes import UnknownCodes
from server.web.wiring import create_app

_SIGN_INS = "demo-sign-ins.txt"
_DEMO_ZONE = "Europe/Zurich"


def utc_now() -> datetime:
    """Return the present instant in UTC, to the microsecond."""
    return datetime.now(UTC)


def release() -> str:
    """Return the release of this program, empty where it runs from a bare tree."""
    try:
        return version("titrant-ledger")
    except PackageNotFoundError:
        return ""


def build_app(
    settings: Settings,
    *,
    transactions: Transactions | None = None,
    clock: Callable[[], datetime] = utc_now,
    setup_code: str | None = None,
) -> FastAPI:
    """Return the application on a migrated database.

    ``transactions``: those of a database that is open already. ``setup_code``: what the set-up page
    of an empty database asks for, a new one where none is given. The signing keys lie in the data
    folder; the first one is made where there is none.

    Raises:
        KeyProblem: others may read the keys, or a file is none.
    """
    static = StaticFiles(find_folder("static"))
    opened = transactions or Transactions(open_database(settings.database_url))
    office = PostOffice(opened, settings.mail, clock=clock) if settings.mail else None
    parts = Parts(
        transactions=opened,
        clock=clock,
        templating=Templating(find_folder("templates"), static),
        secure=settings.is_secure,
        setup_code=setup_code or new_code(random.SystemRandom()),
        version=release() or "0",
        unknown_codes=UnknownCodes(),
        keys=open_signing_keys(settings.key_folder, now=clock()),
        sends_mail=office is not None,
        at_end=(office.close,) if office else (),
    )
    if office is not None:
        office.start()
    return create_app(parts, static)


def serve(settings: Settings, *, demo: bool) -> int:
    """Migrate and serve until stopped; ``demo`` fills an empty database first."""
    if settings.keeps_file:
        _make_folder(settings.data)
    listener = _listener(settings)
    try:
        database = open_database(settings.database_url)
    except DatabaseProblem as problem:
        raise SettingsProblem(f"{problem} ({DATABASE_VARIABLE} or --data)") from problem
    report = migrate(database)
    if report.before != report.after:
        _say(f"The database was brought from {report.before or 'empty'} to {report.after}.")
    transactions = Transactions(database)
    if demo:
        _show_demo(transactions, settings.data / _SIGN_INS)
    setup_code = new_code(random.SystemRandom())
    try:
        app = build_app(settings, transactions=transactions, setup_code=setup_code)
    except (KeyProblem, OSError) as problem:
        says = f"The signing keys in {settings.key_folder} cannot be used: {problem}"
        raise SettingsProblem(says) from problem
    _say(f"Titrant Ledger: {_address(settings)}")
    if not transactions.read(there_is_a_laboratory):
        _say(f"Nobody is here yet: open {_address(settings)}setup with the code {setup_code}")
    config = uvicorn.Config(
        app,
        ssl_certfile=settings.tls_cert,
        ssl_keyfile=settings.tls_key,
        proxy_headers=settings.behind_proxy,
        server_header=False,
        log_level="warning",
    )
    uvicorn.Server(config).run(sockets=[listener])
    return 0


def _make_folder(folder: Path) -> None:
    try:
        folder.mkdir(mode=0o700, parents=True, exist_ok=True)
    except OSError as problem:
        says = f"The data folder {folder} cannot be made: {problem.strerror}."
        raise SettingsProblem(says) from problem


def _listener(settings: Settings) -> socket.socket:
    """Return the socket to serve on, taken before anything is written or announced."""
    try:
        address = socket.getaddrinfo(settings.host, settings.port, type=socket.SOCK_STREAM)[0]
        listener = socket.socket(address[0], socket.SOCK_STREAM)
        listener.setsockopt(socket.SOL_SOCKET, socket.SO_REUSEADDR, 1)
        listener.bind(address[4])
    except OSError as problem:
        says = f"{settings.host}, port {settings.port} cannot be used: {problem.strerror}."
        raise SettingsProblem(says) from problem
    return listener


def _show_demo(transactions: Transactions, kept: Path) -> None:
    """Fill an empty database with the demonstration and print who can sign in; later, print that.

    The passwords are new for every data folder; they are kept beside the database, for its owner
    alone, so that a second start can print them again.
    """
    if transactions.read(there_is_a_laboratory):
        told = kept.read_text(encoding="utf-8") if kept.is_file() else ""
        _say(told or "There is a laboratory here already; the demonstration was not filled in.")
        return
    summary = fill_demo(transactions, now=utc_now(), zone=_DEMO_ZONE, progress=_say)
    told = _told(summary)
    kept.parent.mkdir(mode=0o700, parents=True, exist_ok=True)
    kept.touch(mode=0o600)
    kept.write_text(told, encoding="utf-8")
    _say(told)


def _told(summary: DemoSummary) -> str:
    lines = ["", "The demonstration laboratory. Sign in as"]
    for one in summary.people:
        roles = ", ".join(one.roles)
        lines.append(f"  {one.sign_in_name:<10} {one.password:<28} {one.printed_name} ({roles})")
    lines.append(f"Bottles in force: {', '.join(summary.bottles_in_force)}")
    return "\n".join([*lines, ""])


def _address(settings: Settings) -> str:
    scheme = "https" if settings.tls_cert is not None else "http"
    host = f"[{settings.host}]" if ":" in settings.host else settings.host
    return f"{scheme}://{host}:{settings.port}/"


def _say(line: str) -> None:
    print(line, flush=True)  # noqa: T201 - what the program says when it starts

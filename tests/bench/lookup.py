"""The look-up over HTTP against a bare route and against the usual way of writing it.

    python tests/bench/lookup.py [BOTTLES] [SECONDS]

Fills a SQLite file with the demonstration laboratory and so many bottles (default 100000), then
serves, each in a process of its own with uvloop and httptools: the whole application, a bare
Starlette route that answers a fixed JSON of the same size, and a FastAPI `def` route with an ORM
select. 32 connections ask for 2000 of the bottles for so many seconds (default 5), each server once
to warm up and then three times in turns; the best of each is printed. To reach: 0.45 of the bare
route, 8 times the usual way.
"""

import asyncio
import json
import multiprocessing
import random
import socket
import sys
import tempfile
import time
from collections.abc import Callable
from datetime import UTC, datetime
from pathlib import Path
from uuid import uuid4

import sqlalchemy as sa
import uvicorn
from fastapi import FastAPI
from sqlalchemy.orm import Session
from starlette.applications import Starlette
from starlette.requests import Request
from starlette.responses import JSONResponse, Response
from starlette.routing import Route

from server.app import build_app
from server.demo.laboratory import fill_demo
from server.lab.codes import new_code
from server.records.database import open_database, sqlite_url
from server.records.migrating import migrate
from server.records.tables.bench import Certificate
from server.records.tables.lots import Bottle, Lot
from server.records.transaction import Transactions
from server.settings import Settings

BOTTLES, SECONDS, CONNECTIONS, ROUNDS = 100_000, 5.0, 32, 3
OF_BARE, OF_USUAL = 0.45, 8.0
_ASKED = 2000


def fill(folder: Path, bottles: int) -> list[str]:
    """Make the database; return codes of bottles in force."""
    transactions = Transactions(open_database(sqlite_url(folder / "ledger.sqlite")))
    migrate(transactions.database)
    demo = fill_demo(
        transactions, now=datetime.now(UTC), zone="Europe/Zurich", progress=lambda _: None
    )
    drawn = random.Random(1)
    codes = {new_code(drawn) for _ in range(bottles)}

    def add(session: Session) -> None:
        first = sa.select(Bottle).where(Bottle.code == demo.bottles_in_force[0])
        like = session.scalars(first).one()
        columns = {one.name: getattr(like, one.name) for one in Bottle.__table__.columns}
        rows = [
            columns | {"id": str(uuid4()), "code": code, "number": 1000 + number}
            for number, code in enumerate(sorted(codes))
        ]
        session.execute(sa.insert(Bottle), rows)

    transactions.write(add)
    transactions.close()
    return drawn.sample(sorted(codes), min(_ASKED, len(codes)))


def whole(folder: Path, _: bytes) -> FastAPI:
    """The whole application."""
    return build_app(Settings(data=folder, database_url=sqlite_url(folder / "ledger.sqlite")))


def bare(_: Path, body: bytes) -> Starlette:
    """A route that answers a fixed JSON of the same size."""
    fixed = json.loads(body)

    async def answer(request: Request) -> Response:
        del request
        return JSONResponse(fixed)

    return Starlette(routes=[Route("/api/bottles/{code}", answer)])


def usual(folder: Path, _: bytes) -> FastAPI:
    """What is usually written: a `def` route, an ORM session for each request, the rows as JSON."""
    engine = sa.create_engine(sqlite_url(folder / "ledger.sqlite"))
    app = FastAPI()

    @app.get("/api/bottles/{code}")
    def bottle(code: str) -> dict[str, object]:
        with Session(engine) as session:
            found = session.scalars(sa.select(Bottle).where(Bottle.code == code)).one()
            lot = session.get_one(Lot, found.lot_id)
            newest = sa.select(Certificate).where(Certificate.lot_id == lot.id)
            certificate = session.scalars(newest.order_by(Certificate.issued_at.desc())).first()
            document = json.loads(certificate.document) if certificate else {}
            return {
                "bottle": found.code, "titrant": lot.titrant, "lot": lot.name,
                "concentration": document["result"]["concentration"],
            }  # fmt: skip

    return app


def serve(make: Callable[[Path, bytes], Starlette], folder: Path, body: bytes, port: int) -> None:
    """Serve one of them until the process is ended."""
    uvicorn.run(
        make(folder, body), port=port, loop="uvloop", http="httptools",
        log_level="error", access_log=False,
    )  # fmt: skip


async def _ask(port: int, codes: list[str], until: float) -> int:
    reader, writer = await asyncio.open_connection("127.0.0.1", port)
    done = 0
    while time.perf_counter() < until:
        code = codes[done % len(codes)]
        writer.write(f"GET /api/bottles/{code} HTTP/1.1\r\nHost: 127.0.0.1\r\n\r\n".encode())
        head = await reader.readuntil(b"\r\n\r\n")
        if not head.startswith(b"HTTP/1.1 200"):
            raise SystemExit(head.decode())
        length = int(head.lower().partition(b"content-length: ")[2].partition(b"\r\n")[0])
        await reader.readexactly(length)
        done += 1
    writer.close()
    return done


async def load(port: int, codes: list[str], seconds: float) -> float:
    """Return how many requests a second are answered."""
    start = time.perf_counter()
    shuffled = [random.Random(i).sample(codes, len(codes)) for i in range(CONNECTIONS)]
    asking = [_ask(port, one, start + seconds) for one in shuffled]
    return sum(await asyncio.gather(*asking)) / (time.perf_counter() - start)


def _free_port() -> int:
    with socket.socket() as found:
        found.bind(("127.0.0.1", 0))
        port: int = found.getsockname()[1]
        return port


def _wait(port: int) -> None:
    for _ in range(600):
        with socket.socket() as tried:
            if tried.connect_ex(("127.0.0.1", port)) == 0:
                return
        time.sleep(0.1)
    raise SystemExit("a server did not start")


async def _body(port: int, code: str) -> bytes:
    reader, writer = await asyncio.open_connection("127.0.0.1", port)
    writer.write(
        f"GET /api/bottles/{code} HTTP/1.1\r\nHost: x\r\nConnection: close\r\n\r\n".encode()
    )
    answer = await reader.read()
    writer.close()
    return answer.partition(b"\r\n\r\n")[2]


def main() -> None:
    """Print the table; end with 1 where a figure is missed."""
    bottles = int(sys.argv[1]) if len(sys.argv) > 1 else BOTTLES
    seconds = float(sys.argv[2]) if len(sys.argv) > 2 else SECONDS
    spawn = multiprocessing.get_context("spawn")
    best = {"whole": 0.0, "bare": 0.0, "usual": 0.0}
    with tempfile.TemporaryDirectory() as name:
        folder = Path(name)
        codes = fill(folder, bottles)
        body, servers, ports = b"{}", [], {}
        for what, make in {"whole": whole, "bare": bare, "usual": usual}.items():
            ports[what] = _free_port()
            started = spawn.Process(target=serve, args=(make, folder, body, ports[what]))
            started.start()
            servers.append(started)
            _wait(ports[what])
            if what == "whole":
                body = asyncio.run(_body(ports[what], codes[0]))
        try:
            for port in ports.values():
                asyncio.run(load(port, codes, 2 * seconds))
            for _ in range(ROUNDS):
                for what, port in ports.items():
                    best[what] = max(best[what], asyncio.run(load(port, codes, seconds)))
        finally:
            for one in servers:
                one.terminate()
                one.join()
    for what, rate in best.items():
        print(f"{what:8}{rate:9.0f} requests a second")
    of_bare, of_usual = best["whole"] / best["bare"], best["whole"] / best["usual"]
    print(f"{bottles} bottles, {len(body)} bytes: {of_bare:.2f} of bare (to reach {OF_BARE}), "
          f"{of_usual:.1f} times the usual way (to reach {OF_USUAL:g})")  # fmt: skip
    raise SystemExit(1 if of_bare < OF_BARE or of_usual < OF_USUAL else 0)


if __name__ == "__main__":
    main()

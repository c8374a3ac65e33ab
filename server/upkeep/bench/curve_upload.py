"""The whole analysis of an uploaded curve, read, by every method and stored, against the fit alone.

It is stored as at the bench: through the entries' one door, on a sheet of the demonstration
laboratory, in a database file of its own that is written through to the disk at each commit.
"""

import time
from base64 import b64encode
from collections.abc import Callable, Iterator
from dataclasses import dataclass
from datetime import UTC, datetime
from functools import partial
from pathlib import Path
from tempfile import TemporaryDirectory
from uuid import uuid4

import numpy as np

from server.curves.circumstances import Circumstances
from server.curves.entrance import analysed
from server.curves.model.charge_balance import ChargeBalance, Flask
from server.curves.model.fit import fit_model
from server.curves.model.systems import SYSTEMS
from server.demo.laboratory import fill_demo
from server.intake.curve_upload import SentCurve
from server.intake.curve_workbook import read_curve_file
from server.lab.actor import Actor
from server.lab.curve_entry import SLOT
from server.lab.ink import standing
from server.procedures.curves import CurvesRead, find_curve_source, read_curve_of
from server.procedures.entries import WriteEntries, write_entries
from server.procedures.new_entries import NewEntry
from server.records.database import open_database, sqlite_url
from server.records.migrating import migrate
from server.records.queries.load_sheet import load_sheet_facts
from server.records.transaction import Transactions
from server.upkeep.bench.known_curve import (
    AMOUNT_MMOL,
    FLASK_ML,
    Floats,
    KnownCurve,
    volumes_by_drops,
    volumes_by_hand,
)
from server.upkeep.bench.table import Line

#: What is to be reached.
MOST_FITS = 20.0
_READING_U = 0.01
_SECONDS_PER_ML = 20.0
_TIMES, _TIMES_OF_THE_FIT = 5, 60
_NOW, _ZONE = datetime(2026, 12, 1, 14, 0, tzinfo=UTC), "Europe/Zurich"


def lines(
    *, times: int = _TIMES, made: Callable[[Path], tuple[Transactions, str]] | None = None
) -> Iterator[Line]:
    """Yield the table line by line: a curve by hand and one by drops, with and without seconds.

    ``made`` makes a laboratory in a folder and names its open sheet with a curve; None: the
    demonstration.
    """
    yield Line(
        "A file of a titration curve read, analysed by every method and stored on a bench sheet; "
        f"to reach: {MOST_FITS:g} times the model fit alone. A demonstration laboratory is made "
        "first."
    )
    with TemporaryDirectory() as folder:
        bench = _open_bench(*(made or _demonstration)(Path(folder)))
        try:
            for V in (volumes_by_hand(0.5), volumes_by_drops(300, 0.5)):
                for timed in (False, True):
                    yield _line(bench, V, timed=timed, times=times)
        finally:
            bench.transactions.close()


@dataclass(slots=True)
class _Bench:
    """A bench sheet, its analyst, and the curve of its first replicate that stands."""

    transactions: Transactions
    sheet_id: str
    actor: Actor
    standing: str

    def take(self, data: bytes, known: Circumstances) -> None:
        """Read a curve's file, analyse it, and write it in place of the curve that stands."""
        sent = SentCurve(file_name="run.csv", content_base64=b64encode(data).decode("ascii"))
        entry = NewEntry(
            id=str(uuid4()),
            replicate=1,
            slot=SLOT,
            text="",
            strikes=self.standing,
            reason="measured again",
            curve=sent,
        )
        source = self.transactions.read(partial(find_curve_source, sheet_id=self.sheet_id))
        read = read_curve_of(sent, source)
        analysed(read.table.points(), known).to_document()
        command = WriteEntries(self.sheet_id, (entry,), CurvesRead(source, {entry.id: read}))
        self.transactions.write(
            lambda session: write_entries(session, command, actor=self.actor, now=_NOW)
        )
        self.standing = entry.id


def _demonstration(folder: Path) -> tuple[Transactions, str]:
    database = open_database(sqlite_url(folder / "ledger.sqlite"))
    migrate(database)
    transactions = Transactions(database)
    made = fill_demo(transactions, now=_NOW, zone=_ZONE, progress=lambda _: None)
    return transactions, made.open_curve_sheet_id


def _open_bench(transactions: Transactions, sheet_id: str) -> _Bench:
    facts = transactions.read(lambda session: load_sheet_facts(session, sheet_id))
    by = facts.begun_by
    actor = Actor(by.id, by.printed_name, by.initials, frozenset({"analyst"}), _ZONE)
    return _Bench(transactions, sheet_id, actor, standing(facts.entries)[(1, SLOT, 1)].id)


def _line(bench: _Bench, V: Floats, *, timed: bool, times: int) -> Line:
    truth = KnownCurve(carbonate=0.005)
    rng = np.random.default_rng(1)
    y = truth.pH(V) + rng.normal(0, _READING_U, V.size)
    system = SYSTEMS["khp-naoh"]
    known = Circumstances(system=system, flask_volume_mL=FLASK_ML, amount_mmol=AMOUNT_MMOL)
    balance = ChargeBalance(system, Flask(FLASK_ML, AMOUNT_MMOL))
    files = iter([_file(V, y + rng.normal(0, 1e-3, V.size), timed=timed) for _ in range(times)])
    data = _file(V, y, timed=timed)
    fit = _median_ms(
        lambda: fit_model(balance, V, y, start_mL=truth.effective_mL), _TIMES_OF_THE_FIT
    )
    alone = _median_ms(lambda: analysed(read_curve_file(data).points(), known), times)
    whole = _median_ms(lambda: bench.take(next(files), known), times)
    says = (
        f"{V.size:4d} points{', timed' if timed else '':7s} | fit {fit:6.3f} ms | read and "
        f"analysed {alone:7.3f} ms = {alone / fit:.1f} fits | stored too {whole:7.3f} ms = "
        f"{whole / fit:.1f} fits"
    )
    return Line(says, ("time",) if whole > MOST_FITS * fit else ())


def _file(V: Floats, y: Floats, *, timed: bool) -> bytes:
    rows = ["volume (mL),pH,time (s)" if timed else "volume (mL),pH"]
    for volume, reading in zip(V, y, strict=True):
        row = f"{volume:.4f},{reading:.3f}"
        rows.append(f"{row},{_SECONDS_PER_ML * volume:.1f}" if timed else row)
    return "\n".join(rows).encode()


def _median_ms(work: Callable[[], object], times: int) -> float:
    taken = []
    for _ in range(times):
        began = time.perf_counter()
        work()
        taken.append(time.perf_counter() - began)
    return 1000 * float(np.median(taken))

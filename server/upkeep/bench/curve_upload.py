"""The whole analysis of an uploaded curve, read and by every method, against the fit alone."""

import time
from collections.abc import Callable, Iterator

import numpy as np

from server.curves.circumstances import Circumstances
from server.curves.entrance import analysed
from server.curves.model.charge_balance import ChargeBalance, Flask
from server.curves.model.fit import fit_model
from server.curves.model.systems import SYSTEMS
from server.intake.curve_workbook import read_curve_file
from server.upkeep.bench.known_curve import (
    AMOUNT_MMOL,
    FLASK_ML,
    Floats,
    KnownCurve,
    volumes_by_drops,
    volumes_by_hand,
)
from server.upkeep.bench.table import Line

#: What is to be reached: so many times the fit alone.
MOST_FITS = 20.0
_READING_U = 0.01
_SECONDS_PER_ML = 20.0
_TIMES = 20


def lines(*, times: int = _TIMES) -> Iterator[Line]:
    """Yield the table line by line: a curve by hand and one by drops, with and without seconds."""
    yield Line(
        f"A file of a titration curve read and analysed by every method; to reach: {MOST_FITS:g} "
        "times the model fit alone. Storing it is not part of this."
    )
    for V in (volumes_by_hand(0.5), volumes_by_drops(300, 0.5)):
        for timed in (False, True):
            yield _line(V, timed=timed, times=times)


def _line(V: Floats, *, timed: bool, times: int) -> Line:
    truth = KnownCurve(carbonate=0.005)
    y = truth.pH(V) + np.random.default_rng(1).normal(0, _READING_U, V.size)
    data = _file(V, y, timed=timed)
    system = SYSTEMS["khp-naoh"]
    known = Circumstances(system=system, flask_volume_mL=FLASK_ML, amount_mmol=AMOUNT_MMOL)
    balance = ChargeBalance(system, Flask(FLASK_ML, AMOUNT_MMOL))
    fit = _median_ms(lambda: fit_model(balance, V, y, start_mL=truth.effective_mL), 3 * times)
    read = _median_ms(lambda: read_curve_file(data), times)
    whole = _median_ms(lambda: analysed(read_curve_file(data).points(), known).to_document(), times)
    says = (
        f"{V.size:4d} points{', timed' if timed else '':7s} | fit {fit:6.3f} ms | reading "
        f"{read:6.3f} ms | whole {whole:7.3f} ms = {whole / fit:.1f} fits"
    )
    return Line(says, ("time",) if whole > MOST_FITS * fit else ())


def _file(V: Floats, y: Floats, *, timed: bool) -> bytes:
    header = "volume (mL),pH,time (s)" if timed else "volume (mL),pH"
    rows = [header]
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

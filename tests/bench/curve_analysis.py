"""The whole analysis of an uploaded curve, parsed and by every method, against the fit alone.

    python tests/bench/curve_analysis.py

Both on the same curve in the same run; storing is not part of it.
"""

import json
import time
from pathlib import Path

import numpy as np

from server.curves.circumstances import Circumstances
from server.curves.entrance import analysed
from server.curves.model.charge_balance import ChargeBalance, Flask
from server.curves.model.fit import fit_model
from server.curves.model.systems import SYSTEMS
from server.intake.curve_workbook import read_curve_file

CURVES = json.loads(
    (Path(__file__).parents[1] / "reference" / "curves" / "simulated.json").read_text()
)["curves"]


def timed(work, times):
    """The median time of a piece of work in ms."""
    taken = []
    for _ in range(times):
        began = time.perf_counter()
        work()
        taken.append(time.perf_counter() - began)
    return 1000 * float(np.median(taken))


def line(name, *, recorded):
    """One line of the table: a known curve, with or without its times."""
    set_ = CURVES[name]
    V, y = np.array(set_["V"]), np.array(set_["y"])
    columns = [V, y, 20 * V] if recorded else [V, y]
    header = "volume (mL),pH,time (s)" if recorded else "volume (mL),pH"
    rows = (",".join(map(str, row)) for row in zip(*columns, strict=True))
    data = "\n".join([header, *rows]).encode()
    flask = Flask(set_["V0_mL"], set_["n_acid_mmol"])
    known = Circumstances(
        system=SYSTEMS["khp-naoh"],
        flask_volume_mL=flask.volume_mL,
        amount_mmol=flask.amount_mmol,
    )
    balance = ChargeBalance(SYSTEMS["khp-naoh"], flask)
    fit = timed(lambda: fit_model(balance, V, y, start_mL=set_["equivalence_mL"]), 60)
    parse = timed(lambda: read_curve_file(data), 20)
    whole = timed(lambda: analysed(read_curve_file(data).points(), known).to_document(), 20)
    print(
        f"{name:22s} {V.size:4d} points{', timed' if recorded else '':8s} fit {fit:6.2f} ms | "
        f"parse {parse:6.2f} ms | whole {whole:7.2f} ms = {whole / fit:5.1f} fits",
        flush=True,
    )


def main():
    for name in ("khp-manual-burette", "khp-drop-counter", "khp-probe-lag"):
        for recorded in (False, True):
            line(name, recorded=recorded)


if __name__ == "__main__":
    main()

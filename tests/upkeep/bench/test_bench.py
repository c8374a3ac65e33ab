"""Measurements: their tables hold what they should and say what is not reached; no timed test."""

import re
import sqlite3

import numpy as np
import pytest

from server.cli import NOT_SO, REFUSED, Verbs, run
from server.records.database import open_database, sqlite_url
from server.records.transaction import Transactions
from server.upkeep.bench import curve_fit, curve_upload, named
from server.upkeep.bench.curve_fit import CASES, Case
from server.upkeep.bench.known_curve import KnownCurve, fit_by_roots, volumes_by_hand
from server.upkeep.bench.table import Bench, Line

VERBS = Verbs(serve=lambda *_: 0)


def test_bench_without_a_name_lists_the_names(capsys) -> None:
    assert run(["bench"], VERBS) == 0
    said = capsys.readouterr().out
    assert "curves" in said
    assert "upload" in said


def test_bench_of_an_unknown_name_ends_with_2_and_the_names(capsys) -> None:
    assert run(["bench", "clouds"], VERBS) == REFUSED
    said = capsys.readouterr().err
    assert "no measurement clouds" in said
    assert "curves" in said


@pytest.mark.parametrize(
    ("lines", "status", "says"),
    [
        ([Line("a")], 0, "All figures are reached."),
        ([Line("a"), Line("b", ("time", "bias"))], NOT_SO, "Not reached: 2 figures."),
    ],
)
def test_bench_ends_with_1_where_a_figure_is_not_reached(
    lines, status, says, monkeypatch, capsys
) -> None:
    bench = Bench("quick", "nothing", lambda: iter(lines))
    monkeypatch.setattr(named, "BENCHES", (bench,))
    assert run(["bench", "quick"], VERBS) == status
    said = capsys.readouterr().out
    assert said.splitlines()[-1] == says
    assert ("NOT REACHED: time, bias" in said) == bool(status)


def test_cases_are_60_and_300_points_with_and_without_each() -> None:
    assert len({(c.points, c.activities, c.carbonate > 0, c.volume_u > 0) for c in CASES}) == 16
    assert {c.points for c in CASES} == {60, 300}


def test_table_of_the_fit_prints_both_raw_figures_and_their_ratio() -> None:
    case = Case(60, activities=True, carbonate=0.012, volume_u=0.003)
    *_, line = curve_fit.lines(cases=(case,), curves=6)
    times = re.search(r"fit +([\d.]+) ms, lmfit +([\d.]+) ms = 1/(\d+)", line.says)
    ours, theirs, ratio = map(float, times.groups())
    assert ratio == pytest.approx(theirs / ours, rel=0.02)
    errors = re.findall(r"RMS ([\d.]+) µL over bound ([\d.]+) µL = ([\d.]+)", line.says)
    assert len(errors) == 2
    for rms, bound, ratio in errors:
        assert float(ratio) == pytest.approx(float(rms) / float(bound), abs=0.01)


def test_table_of_the_fit_names_what_is_not_reached(monkeypatch) -> None:
    monkeypatch.setattr(curve_fit, "RMS_OVER_BOUND", 0.01)
    monkeypatch.setattr(curve_fit, "BIAS_OVER_RMS", 0.0)
    case = Case(60, activities=False, carbonate=0.0, volume_u=0.0)
    *_, line = curve_fit.lines(cases=(case,), curves=3)
    assert {"RMS, scatter given", "bias, scatter learnt"} <= set(line.missed)


def test_missing_lmfit_is_said_and_counts_as_not_reached(monkeypatch) -> None:
    def missing(name: str) -> None:
        raise ImportError(name)

    monkeypatch.setattr(curve_fit, "import_module", missing)
    case = Case(60, activities=False, carbonate=0.0, volume_u=0.0)
    _, said, line = curve_fit.lines(cases=(case,), curves=2)
    assert "lmfit is missing" in said.says
    assert said.missed == ("time",)
    assert "lmfit" not in line.says
    assert "RMS" in line.says


@pytest.fixture
def laboratory(forger, tmp_path):
    """A copy of the demonstration, and its open sheet with curves."""

    def made(folder):
        copy = sqlite3.connect(tmp_path / "copy.sqlite")
        source = sqlite3.connect(forger.database.url.database)
        source.backup(copy)
        (sheet,) = copy.execute(
            "SELECT DISTINCT s.id FROM sheet s JOIN entry e ON e.sheet_id = s.id"
            " WHERE e.slot = 'curve' AND s.handed_in_at IS NULL"
        ).fetchone()
        source.close()
        copy.close()
        database = open_database(sqlite_url(tmp_path / "copy.sqlite"))
        return Transactions(database), sheet

    return made


def test_table_of_the_upload_has_both_ratios_and_stores_each_curve(laboratory, tmp_path) -> None:
    lines = list(curve_upload.lines(times=1, made=laboratory))
    assert len(lines) == 5
    for line in lines[1:]:
        figures = re.findall(r"([\d.]+) ms = ([\d.]+) fits", line.says)
        fit = float(re.search(r"fit +([\d.]+) ms", line.says)[1])
        assert len(figures) == 2
        for taken, ratio in figures:
            assert float(ratio) == pytest.approx(float(taken) / fit, rel=0.02, abs=0.06)
        assert bool(line.missed) == (float(figures[1][1]) > curve_upload.MOST_FITS)
    with sqlite3.connect(tmp_path / "copy.sqlite") as kept:
        struck = "SELECT count(*) FROM entry WHERE reason = 'measured again'"
        assert kept.execute(struck).fetchone() == (4,)
    kept.close()


def test_yardstick_finds_the_end_point_too() -> None:
    import lmfit

    truth = KnownCurve(carbonate=0.004)
    V = volumes_by_hand(0.3)
    y = truth.pH(V) + np.random.default_rng(4).normal(0, 0.01, V.size)
    found = fit_by_roots(V, y, start_mL=20.05, activities=True, lmfit=lmfit)
    assert found == pytest.approx(truth.effective_mL, abs=0.003)

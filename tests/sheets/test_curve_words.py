"""A curve in words: which method to believe for curves that are sound, slow, or without a model."""

import json
import re
from dataclasses import replace
from datetime import UTC, datetime
from pathlib import Path

import pytest

from server.curves.circumstances import Circumstances, system_named
from server.curves.entrance import analysed
from server.curves.points import Points
from server.evaluation.sheet_curves import SheetCurve, why_unable
from server.lab.curve_entry import CurveEntry
from server.lab.ink import WrittenEntry
from server.lab.sheet_facts import InstrumentFact
from server.sheets.parts.curve_probe import probe_beside
from server.sheets.parts.curve_view import curve_view
from server.sheets.parts.curve_words import apart_words, believe

#: Made for this project by a charge balance of its own; what is true of each stands in the file.
CURVES = json.loads(
    (Path(__file__).parents[1] / "reference" / "curves" / "simulated.json").read_text("utf-8")
)["curves"]
SYSTEMS = {"khp": "khp-naoh", "tri": "tris-hcl", "car": "carbonate-hcl"}
NOW = datetime(2026, 12, 1, 10, 4, tzinfo=UTC)


def analysis_of(name):
    one = CURVES[name]
    amount = one.get("n_acid_mmol") or one.get("n_base_mmol")
    known = Circumstances(system_named(SYSTEMS.get(name[:3])), one.get("V0_mL"), amount)
    return analysed(Points(one["kind"], tuple(one["V"]), tuple(one["y"])), known)


@pytest.fixture(scope="module")
def found():
    names = (
        "khp-manual-burette",
        "khp-probe-lag",
        "fe-ce-redox-mV",
        "khp-probe-96pct-slope-offset",
    )
    return {name: analysis_of(name) for name in names}


def entry(slot="curve", text="run.csv, 58 points, pH", reason=None):
    return WrittenEntry(
        "e", 1, 2, slot, 1, text, None, None, None, reason, "p", "Ida Mohnke", "IM", "p",
        None, None, None, None, NOW, late=False,
    )  # fmt: skip


def view_of(analysis, taken, *, recipe="model fit", changed=None):
    curve = analysis.curve
    texts = [tuple(f"{one:.4f}" for one in values) for values in (curve.V, curve.y)]
    told = SheetCurve(
        2, "2", entry(), CurveEntry(curve.kind, *texts, None, {}), analysis,
        why_unable(analysis, taken), taken, recipe, changed,
    )  # fmt: skip
    return curve_view(told, sheet_id="s", zone="Europe/Berlin", probe=None)


def test_sound_curve_speaks_for_the_model_fit_with_its_grounds(found):
    says = believe(found["khp-manual-burette"])
    assert re.match(r"Believe the model fit, 21\.7\d+ mL: it rests on all 58 points", says)
    assert "residuals look like scatter" in says
    assert "first derivative agrees to" in says
    assert says.count(".") == len(re.findall(r"\d\.\d", says)) + 1  # one sentence


def test_slow_probe_speaks_against_the_model_fit_and_names_what_fails(found):
    says = believe(found["khp-probe-lag"])
    assert says.startswith("Believe the first derivative, 9.4")
    assert "does not hold in lag" in says


def test_redox_curve_has_no_model_and_says_why(found):
    says = believe(found["fe-ce-redox-mV"])
    assert says.startswith("Believe the first derivative, 20.2")
    assert "no acid-base system was named" in says


def test_volume_that_is_taken_against_the_advice_is_told_with_its_distance(found):
    slow = found["khp-probe-lag"]
    says = apart_words(slow, "model fit")
    apart = slow.outcome("model fit").volume_mL - slow.outcome("first derivative").volume_mL
    millilitres = float(re.search(r"is ([\d.]+) mL", says)[1])
    assert millilitres == pytest.approx(abs(apart), rel=0.05)
    assert ("more" in says) == (apart > 0)
    assert apart_words(slow, "first derivative") == ""


def test_view_tells_who_took_another_method_and_why(found):
    changed = entry("end_point_method", "first derivative", reason="the probe was slow")
    view = view_of(found["khp-probe-lag"], "first derivative", changed=changed)
    assert "by an entry of Ida Mohnke" in view.choice
    assert "the probe was slow" in view.choice
    assert "The recipe names the model fit." in view.choice
    assert [one.method for one in view.methods if one.taken] == ["first derivative"]


def test_view_of_a_method_without_an_answer_says_what_has_one(found):
    view = view_of(found["fe-ce-redox-mV"], "model fit")
    assert view.volume == ""
    assert "The model fit has no answer for this curve." in view.problem
    assert "What has one: steepest segment" in view.problem
    assert {one.method: one.volume is None for one in view.methods}["model fit"]
    assert view.pictures.residuals == ""
    assert view.pictures.whole


def test_view_without_a_named_method_says_that_the_program_proposes(found):
    analysis = found["khp-manual-burette"]
    view = view_of(analysis, "model fit", recipe=None)
    assert view.choice == "Nobody named a method: the program proposes the model fit."


def test_curve_without_points_of_a_curve_has_its_problem_and_no_picture():
    told = SheetCurve(
        1, "1", entry(), CurveEntry("pH", ("1",), ("4",), None, {}), None,
        "A curve needs at least 6 points; here are 1.", "model fit", "model fit", None,
    )  # fmt: skip
    view = curve_view(told, sheet_id="s", zone="Europe/Berlin", probe=None)
    assert (view.methods, view.pictures.whole, view.believe) == ((), "", "")
    assert view.problem.startswith("A curve needs at least 6 points")


def test_probes_slope_and_offset_come_out_as_they_were_put_in(found):
    beside = probe_beside(found["khp-probe-96pct-slope-offset"], None)
    slope, offset = beside.lines
    # the curve was made with 96 % and +0.11 at pH 7; 59.16 mV are one pH at 25 Cel
    assert float(slope.from_curve.split()[0]) == pytest.approx(96, abs=0.6)
    assert float(offset.from_curve.split()[0]) == pytest.approx(-0.11 * 59.16, abs=1.5)
    assert slope.from_buffers == "not known"
    assert "No probe was named" in beside.says


def test_probe_stands_beside_what_its_buffers_said(found):
    probe = InstrumentFact(
        "probe", "i-1", "Probe 3", {}, "c-1", 1, "PB-7", "own", "2026-11-30", NOW, "plan",
        {"slope_percent": "98.6", "offset_mV": "-4.2"}, (),
    )  # fmt: skip
    beside = probe_beside(found["khp-manual-burette"], probe)
    slope, offset = beside.lines
    assert (slope.from_buffers, offset.from_buffers) == ("98.6 %", "-4.2 mV")
    assert beside.calibration == "PB-7, 30 Nov 2026"
    assert beside.url == "/instruments/i-1"
    odd = replace(probe, document={"slope_percent": "", "offset_mV": "x"})
    assert [one.from_buffers for one in probe_beside(found["khp-manual-burette"], odd).lines] == [
        "not known", "not known",
    ]  # fmt: skip
    assert probe_beside(found["fe-ce-redox-mV"], probe) is None


def test_no_method_is_believed_on_points_that_end_before_the_end_point():
    one = CURVES["khp-manual-burette"]
    read = [at for at, V in enumerate(one["V"]) if one["equivalence_mL"] - 0.2 > V]
    V, y = (tuple(one[key][at] for at in read) for key in ("V", "y"))
    known = Circumstances(system_named("khp-naoh"), one["V0_mL"], one["n_acid_mmol"])
    says = believe(analysed(Points("pH", V, y), known))
    assert says.startswith("Believe none of them as it stands, not the steepest segment either")
    assert says.endswith("only the steepest of what was read.")

"""Running values of a sheet that is still being written."""

import pytest

from server.evaluation.assembly import Missing
from server.evaluation.circumstances import Circumstances, EndPoint
from server.evaluation.from_sheet import PreparedSheet
from server.evaluation.running import running

RECORD = {
    "format": "bench-record/1",
    "titrant": {"substance": "NaOH", "nominal": {"value": "0.1", "unit": "mol/L"}},
    "route": "weighed",
    "standard": {"substance": "KHP", "mass_fraction": {"value": "1.0", "u": "0.0003"}},
    "balance": {"linearity": {"unit": "g", "half_width": "0.00015", "shape": "rectangular"}},
    "burette": {"capacity": {"value": "25", "unit": "mL"}},
}


def replicate(label, mass, end, **more):
    found = {"label": label, "mass": mass, "burette": [["0.00", end]], **more}
    return {key: value for key, value in found.items() if value is not None}


def prepared(*replicates, missing=(), circumstances=None):
    return PreparedSheet(
        sheet_id="s",
        revision=1,
        document=None,
        draft={**RECORD, "replicates": list(replicates)},
        missing=tuple(missing),
        circumstances=circumstances or Circumstances(),
        input_digest="",
    )


def test_running_of_one_value_has_no_mean() -> None:
    found = running(prepared(replicate("1", "0.4000", "19.60")), wanted=4)
    # 0.4000 g / 204.22 g/mol / 19.60 mL, to the molar mass's four figures
    assert found.replicates[0].value == pytest.approx(0.4 / 204.22 / 0.01960, rel=5e-5)
    assert (found.mean, found.rsd_percent, found.to_go, found.finding) == (None, None, 3, None)


def test_running_leaves_out_what_is_excluded_or_unfinished() -> None:
    found = running(
        prepared(
            replicate("1", "0.4000", "19.60"),
            replicate("2", "0.4000", "19.58"),
            replicate("3", "0.4000", "18.00", excluded="spilled: on the bench"),
            {"label": "4", "mass": "0.4000"},
        ),
        wanted=4,
    )
    values = [one.value for one in found.replicates]
    assert values[3] is None
    assert found.replicates[3].says
    assert found.mean == pytest.approx((values[0] + values[1]) / 2)
    assert [one.excluded for one in found.replicates] == [False, False, True, False]
    assert found.to_go == 2


def test_running_tells_a_wide_spread_before_the_sheet_is_whole() -> None:
    found = running(
        prepared(replicate("1", "0.4000", "19.60"), replicate("2", "0.4000", "19.90")), wanted=6
    )
    assert (found.finding["name"], found.finding["verdict"]) == ("spread", "fails")


def test_running_does_not_call_a_row_to_come_a_finding() -> None:
    circumstances = Circumstances(end_point=EndPoint("visual", "phenolphthalein"))
    good = (replicate("1", "0.4000", "19.60"), replicate("2", "0.4000", "19.60"))
    asked = (
        Missing(0, "temperature", "not yet"),
        Missing(0, "indicator", "not yet"),
        Missing(0, "blank", "not yet"),
    )
    waiting = running(prepared(*good, missing=asked, circumstances=circumstances), wanted=3)
    assert waiting.finding is None
    told = running(prepared(*good, circumstances=circumstances), wanted=3)
    assert (told.finding["name"], told.finding["verdict"]) == ("temperature", "look")


def test_running_of_an_odd_record_gives_words_instead_of_an_error() -> None:
    odd = prepared(replicate("1", "0.4000", "19.60"), replicate("2", "0.4000", "19.60"))
    odd.draft["standard"] = {"substance": "Unobtainium"}
    found = running(odd, wanted=3)
    assert [one.value for one in found.replicates] == [None, None]
    assert all(one.says for one in found.replicates)

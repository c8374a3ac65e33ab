"""The checks of an instrument between two calibrations, as they are read."""

from collections.abc import Mapping, Sequence

from server.drawing.control_chart import CheckPoint, Limits, control_chart
from server.lab.actor import Actor
from server.lab.calibration.check_log import (
    CHART_OF_KIND,
    CHARTS,
    CHECK_OF_KIND,
    DROP_VOLUME,
    Chart,
    Checked,
    charts_of,
    judged_checks,
)
from server.lab.roles import Act
from server.lab.sheet_facts import LogFact
from server.lab.validity import local_day
from server.metrology.rounding import rounded, rounded_pair, rounding_exponent
from server.sheets.instruments import ChartView
from server.sheets.parts.telling import (
    count_words,
    day_words,
    moment_words,
    plain_words,
    quantity_words,
)
from server.sheets.standard_lots import LineView

#: So many checks stand on a chart, and so many lines below it; the log keeps them all.
MOST_ON_CHART, MOST_LINES = 60, 40


def chart_views(log: Sequence[LogFact], kind: str, zone: str) -> tuple[ChartView, ...]:
    """Return the charts of an instrument that stand, each with its checks as a picture."""
    return tuple(_chart(one, log, kind, zone) for one in charts_of(log, kind))


def line_views(log: Sequence[LogFact], kind: str, reader: Actor) -> tuple[LineView, ...]:
    """Return the lines of the log, the newest first, struck ones among them."""
    outcomes = {one.line.id: one for one in judged_checks(log, kind)}
    shown = [one for one in reversed(log) if one.what in _kinds(kind)]
    return tuple(_line(one, outcomes.get(one.id), reader) for one in shown[:MOST_LINES])


def _kinds(kind: str) -> tuple[str, ...]:
    own = (CHECK_OF_KIND.get(kind, ""), CHART_OF_KIND.get(kind, ""), DROP_VOLUME)
    return tuple(one for one in own if one)


def _chart(chart: Chart, log: Sequence[LogFact], kind: str, zone: str) -> ChartView:
    checks = judged_checks(log, kind, chart_name=chart.name)[-MOST_ON_CHART:]
    points = [
        CheckPoint(day_words(local_day(one.line.at, zone)), one.off, one.outcome.verdict)
        for one in checks
    ]
    limits = Limits(chart.name, chart.unit, chart.warning, chart.action)
    last = checks[-1] if checks else None
    return ChartView(
        id=chart.line.id,
        name=chart.name,
        says=_limit_words(chart),
        basis=chart.basis,
        picture=control_chart(points, limits) if points else "",
        last_verdict=last.outcome.verdict if last else "",
        last_says=f"{moment_words(last.line.at, zone)}: {last.outcome.says}" if last else "",
    )


def _limit_words(chart: Chart) -> str:
    """Return the limits to two digits and the centre to the same decimal, as JCGM 100 prints U."""
    warning, action = (plain_words(one, 2) for one in (chart.warning, chart.action))
    around = ""
    if chart.centre:
        centre = rounded(chart.centre, rounding_exponent(chart.warning))
        around = f"around {centre} {chart.unit}, "
    return f"{around}warning ± {warning} {chart.unit}, action ± {action} {chart.unit}"


def _line(line: LogFact, checked: Checked | None, reader: Actor) -> LineView:
    struck = ""
    if line.struck is not None:
        at = moment_words(line.struck.at, reader.zone)
        struck = f"struck through by {line.struck.by.printed_name}, {at}: {line.struck.reason}"
    needed = Act.KEEP if line.what in CHARTS else Act.LOG
    return LineView(
        id=line.id,
        what=line.what,
        day=moment_words(line.at, reader.zone),
        says=_words(line, checked),
        by=line.by.printed_name,
        struck=struck,
        may_strike=line.struck is None and reader.may(needed),
    )


def _drop(volume: Mapping[str, str]) -> str:
    value, u = rounded_pair(float(volume["value"]), float(volume["u"]))
    return quantity_words({**volume, "value": value, "u": u})


def _words(line: LogFact, checked: Checked | None) -> str:
    document = line.document
    if line.what == DROP_VOLUME:
        weighings = count_words(int(document["weighings"]), "weighing")
        return f"one drop {_drop(document['volume'])}, {weighings} of {document['drops']} drops"
    if line.what in CHARTS:
        name = document.get("name") or f"{document.get('buffer')}, {document.get('set')}"
        return f"limits set for {name}"
    remark = f" {document['remark']}" if document.get("remark") else ""
    if checked is not None:
        return f"{checked.outcome.verdict}: {checked.outcome.says}{remark}"
    typed = document.get("reading") or f"pH {document.get('pH')}"
    return f"{typed}{remark}"

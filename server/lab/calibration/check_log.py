"""The checks of an instrument between two calibrations, from the lines of its log."""

from collections.abc import Callable, Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from datetime import datetime
from types import MappingProxyType

from server.lab.calibration.check import Check
from server.lab.calibration.check_buffers import judge_buffer, read_buffer_chart
from server.lab.calibration.check_weights import judge_check, read_check_weight
from server.lab.log_lines import standing_lines
from server.lab.refusal import Unacceptable
from server.lab.sheet_facts import BALANCE, PROBE, InstrumentFact, LogFact
from server.lab.validity import local_day

WEIGHT_CHART, CHECK_WEIGHING = "check weight", "check weighing"
BUFFER_CHART, BUFFER_CHECK = "check buffer", "buffer check"
DROP_VOLUME = "drop volume"
#: What a kind of instrument is checked by, and what sets that check's limits.
CHECK_OF_KIND: Mapping[str, str] = MappingProxyType({BALANCE: CHECK_WEIGHING, PROBE: BUFFER_CHECK})
CHART_OF_KIND: Mapping[str, str] = MappingProxyType({BALANCE: WEIGHT_CHART, PROBE: BUFFER_CHART})
CHARTS = tuple(CHART_OF_KIND.values())
_GRAVITY = {"holds": 0, "look": 1, "fails": 2}
#: How many readings before one count for its verdict.
_BEFORE = 2


@dataclass(frozen=True, slots=True)
class Chart:
    """The limits of one check weight or check buffer, by its line in the log.

    ``centre``, ``warning`` and ``action`` in ``unit``; the limits lie around the centre.
    """

    line: LogFact
    name: str
    unit: str
    centre: float
    warning: float
    action: float
    basis: str


@dataclass(frozen=True, slots=True)
class Checked:
    """One check as it was judged: its line, and the outcome against the chart of its day."""

    line: LogFact
    chart: Chart
    outcome: Check

    @property
    def off(self) -> float:
        """How far it lies off its chart's centre."""
        return self.outcome.figure or 0.0


def charts_of(
    log: Iterable[LogFact], kind: str, *, as_of: datetime | None = None
) -> tuple[Chart, ...]:
    """Return the charts of an instrument that stand, oldest first; of one name the newest."""
    what = CHART_OF_KIND.get(kind)
    if what is None:
        return ()
    named: dict[str, Chart] = {}
    for one in standing_lines(log, what, as_of=as_of):
        chart = chart_of(one)
        named.pop(chart.name, None)
        named[chart.name] = chart
    return tuple(named.values())


def chart_of(line: LogFact) -> Chart:
    """Return the limits that a chart's line states.

    Raises:
        Unacceptable: its document cannot be taken.
    """
    if line.what == WEIGHT_CHART:
        weight = read_check_weight(line.document)
        limits = (float(weight.centre), float(weight.warning), float(weight.action))
        return Chart(line, weight.name, "g", *limits, weight.basis)
    buffer = read_buffer_chart(line.document)
    return Chart(
        line, buffer.name, "pH", 0.0, float(buffer.warning), float(buffer.action), buffer.basis
    )


def judge_line(chart: Chart, line: LogFact, before: Sequence[LogFact]) -> Checked:
    """Return one check's outcome against a chart; ``before`` are those on it, oldest first.

    Raises:
        Unacceptable: the reading cannot be taken.
    """
    lately = [one.document for one in before[-_BEFORE:]]
    if line.what == CHECK_WEIGHING:
        text = str(line.document.get("reading", ""))
        readings = [str(one["reading"]) for one in lately]
        outcome = judge_check(read_check_weight(chart.line.document), text, readings)
    else:
        outcome = judge_buffer(read_buffer_chart(chart.line.document), line.document, lately)
    return Checked(line, chart, outcome)


def judged_checks(
    log: Sequence[LogFact], kind: str, *, chart_name: str | None = None
) -> tuple[Checked, ...]:
    """Return the standing checks of an instrument, oldest first, on one chart or on all.

    Each is judged by the limits that it was written against: new limits judge what comes later.
    """
    found = []
    before: dict[str, list[LogFact]] = {}
    for line, chart in _on_charts(log, kind):
        if chart_name is None or chart.name == chart_name:
            found.append(judge_line(chart, line, before.setdefault(chart.name, [])))
            before[chart.name].append(line)
    return tuple(found)


def check_that_counts(
    instrument: InstrumentFact, *, at: datetime, zone: str, as_of: datetime | None = None
) -> Checked | None:
    """Return an instrument's last check before an instant, healed by a calibration after it."""

    def healed(line: LogFact) -> bool:
        entered = instrument.recorded_at
        # the day it was done is stated, the instant it was entered is known: both come after
        after = entered is not None and line.at < entered
        return after and local_day(line.at, zone).isoformat() <= instrument.done_on

    return last_checked(instrument.log, instrument.kind, at=at, as_of=as_of, healed=healed)


def last_checked(
    log: Sequence[LogFact],
    kind: str,
    *,
    at: datetime,
    as_of: datetime | None = None,
    healed: Callable[[LogFact], bool] = lambda _: False,
) -> Checked | None:
    """Return the check before an instant that counts, as the log stood at ``as_of``, or None.

    Of each chart the last one counts; where there are several charts, the gravest of them, for a
    check of one weight does not heal that of another. One that fails and is ``healed`` is only
    to be looked at.
    """
    by_chart: dict[str, list[tuple[LogFact, Chart]]] = {}
    for line, chart in _on_charts(log, kind, as_of=as_of):
        if line.at <= at:
            by_chart.setdefault(chart.name, []).append((line, chart))
    last = [
        judge_line(pairs[-1][1], pairs[-1][0], [line for line, _ in pairs[:-1]])
        for pairs in by_chart.values()
    ]
    last = [_healed(one) if healed(one.line) else one for one in last]
    return max(last, key=lambda one: (_GRAVITY[one.outcome.verdict], one.line.at), default=None)


def _healed(one: Checked) -> Checked:
    if one.outcome.verdict != "fails":
        return one
    says = f"{one.outcome.says} It was calibrated after that."
    return replace(one, outcome=replace(one.outcome, verdict="look", says=says))


def _on_charts(
    log: Sequence[LogFact], kind: str, *, as_of: datetime | None = None
) -> list[tuple[LogFact, Chart]]:
    """Return the standing checks, each with the chart that it was written against."""
    what = CHECK_OF_KIND.get(kind)
    if what is None:
        return []
    lines = standing_lines(log, what, as_of=as_of)
    asked = {str(one.document.get("chart")) for one in lines}
    charts = {one.id: chart_of(one) for one in log if one.id in asked and one.what in CHARTS}
    pairs = ((one, charts.get(str(one.document.get("chart")))) for one in lines)
    return [(line, chart) for line, chart in pairs if chart is not None]


def need_chart(log: Sequence[LogFact], kind: str, chart_id: str) -> Chart:
    """Return the standing chart of an id; an empty id means the only one.

    Raises:
        Unacceptable: there is none, or there are several and none is named.
    """
    charts = charts_of(log, kind)
    if not charts:
        says = f"No {CHART_OF_KIND.get(kind, 'chart')} is set up yet; a keeper sets its limits."
        raise Unacceptable(says, field="chart")
    if not chart_id and len(charts) == 1:
        return charts[0]
    found = next((one for one in charts if one.line.id == chart_id), None)
    if found is None:
        names = ", ".join(one.name for one in charts)
        raise Unacceptable(f"Pick one of {names}.", field="chart")
    return found

"""The demo's instruments: registered, calibrated here or elsewhere, checked day by day."""

from collections.abc import Iterable, Mapping
from datetime import datetime, timedelta
from decimal import Decimal
from typing import Any

from server.demo import cast, runs
from server.demo.cast import BASHIR, IMKE, JONAS, Tool
from server.demo.hands import Hands, minutes
from server.lab.validity import local_day
from server.procedures.calibration_runs import RecordRun, StateClass, record_run, state_class
from server.procedures.instrument_log import SetLimits, WriteCheck, set_limits, write_check
from server.procedures.instruments import (
    RecordCalibration,
    RegisterInstrument,
    record_calibration,
    register_instrument,
)

_USED = {"balance_id": cast.BALANCE, "thermometer_id": cast.THERMOMETER, "room_id": cast.ROOM}


class Workshop:
    """The keeper's work on the instruments; ``ids`` are theirs by name."""

    def __init__(self, hands: Hands, now: datetime) -> None:
        self._hands, self._now = hands, now
        self.ids: dict[str, str] = {}

    def stock(self, at: datetime) -> None:
        """Register what there is: with certificates from elsewhere, own runs, a class tolerance."""
        for tool in cast.TOOLS:
            self._register(tool, at)
            if tool.document:
                self._record(tool, at)
        self._run(cast.BURETTE, runs.BURETTE_RUN, at)
        self._register(runs.PIPETTE, at)
        self._run(runs.PIPETTE, runs.PIPETTE_RUN, at)
        self._register(runs.FLASK, at)
        stated = StateClass(
            instrument_id=self.ids[runs.FLASK.name],
            nominal="1000",
            done_on=self._day(runs.FLASK.done_days_ago),
            due_on=self._day(-runs.FLASK.due_in_days),
            due_basis="looked over yearly for damage",
            grade="A",
            glass_expansion="9.9e-6",
        )
        self._hands.do(state_class, stated, JONAS, at)
        limits: dict[str, Any] = {
            "name": runs.CHECK_WEIGHT,
            "step": cast.BALANCE.identity["resolution"],
            "first": list(runs.FIRST_READINGS),
        }
        self._hands.do(set_limits, SetLimits(self.ids[cast.BALANCE.name], limits), JONAS, at)

    def check_balance(self, days: Iterable[float], *, steps: int | None = None) -> None:
        """Write a check weighing before the work of each of some days, counted back."""
        for day in days:
            usual = runs.CHECK_STEPS[int(day) % len(runs.CHECK_STEPS)]
            off = Decimal("0.0001") * (usual if steps is None else steps)
            reading = str(Decimal(runs.CHECK_CENTRE_G) + off)
            check = WriteCheck(self.ids[cast.BALANCE.name], reading=reading)
            self._hands.do(write_check, check, IMKE, self._before(day) - minutes(25))

    def find_a_crumb(self) -> None:
        """Let a check lie beyond the warning limit, and the next one hold again."""
        self.check_balance([runs.DAY_OF_THE_CRUMB], steps=2)
        self.check_balance([runs.DAY_OF_THE_CRUMB - 0.01], steps=0)

    def calibrate_probe(self) -> None:
        """Register a probe, read it in three buffers, and set the limits of its check."""
        at = self._before(1.6)
        self._register(runs.PROBE, at)
        self._run(runs.PROBE, runs.PROBE_RUN, at)
        limits = {"set": "JIS Z 8802:2011", "buffer": "phosphate"}
        self._hands.do(set_limits, SetLimits(self.ids[runs.PROBE.name], limits), JONAS, at)

    def check_probe(self, days: float, *, pH: str, celsius: str) -> None:
        """Write a buffer check of the probe."""
        check = WriteCheck(self.ids[runs.PROBE.name], pH=pH, temperature=celsius)
        self._hands.do(write_check, check, BASHIR, self._before(days))

    def _register(self, tool: Tool, at: datetime) -> None:
        command = RegisterInstrument(kind=tool.kind, name=tool.name, **tool.identity)
        self.ids[tool.name] = self._hands.do(register_instrument, command, JONAS, at)

    def _record(self, tool: Tool, at: datetime) -> None:
        calibration = RecordCalibration(
            instrument_id=self.ids[tool.name],
            certificate_number=tool.certificate_number,
            issuer=tool.issuer,
            done_on=self._day(tool.done_days_ago),
            due_on=self._day(-tool.due_in_days),
            due_basis=_due_basis(tool),
            document=dict(tool.document),
        )
        self._hands.do(record_calibration, calibration, JONAS, at)

    def _run(self, tool: Tool, run: Mapping[str, Any], at: datetime) -> None:
        """Record a run; ware is weighed with the house's own balance."""
        ware = tool.kind in {"burette", "pipette"}
        command = RecordRun(
            instrument_id=self.ids[tool.name],
            run=dict(run),
            done_on=self._day(tool.done_days_ago),
            due_on=self._day(-tool.due_in_days),
            due_basis=_due_basis(tool),
            certificate_number=tool.certificate_number,
            issuer=tool.issuer,
            **{key: self.ids[used.name] for key, used in _USED.items() if ware},
        )
        self._hands.do(record_run, command, JONAS, at)

    def _before(self, days: float) -> datetime:
        return self._now - timedelta(days=days)

    def _day(self, days_ago: int) -> str:
        return local_day(self._before(days_ago), self._hands.zone).isoformat()


def _due_basis(tool: Tool) -> str:
    if tool is runs.PROBE:
        return "weekly, own plan"
    return "12 months, own plan" if tool.due_in_days > 90 else "6 months, own plan"

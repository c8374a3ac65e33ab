"""What a sheet by a recipe may rest on now: standard lots and instruments, in date first."""

from collections.abc import Iterable, Mapping
from dataclasses import dataclass
from datetime import datetime
from urllib.parse import urlencode

from sqlalchemy.orm import Session

from server.lab.in_use import flag_of, judge, off_limits
from server.lab.lot_log import done_words, drying_of, last_drying
from server.lab.recipe import RecipeDocument
from server.lab.rig import rig_of
from server.lab.sheet_facts import (
    BALANCE,
    BURETTE,
    ROOM,
    THERMOMETER,
    InstrumentFact,
    StandardLotFact,
)
from server.lab.slots import replicate_rows, sheet_rows
from server.lab.states import IN_DATE
from server.records.queries.list_stores import (
    CHECK_SPAN,
    ListedInstrument,
    listed_instruments,
)
from server.records.queries.load_standard_lots import standard_lot_facts
from server.sheets.bench import Choice
from server.sheets.parts.telling import last_day_words, moment_words, quantity_words

#: The kinds of instruments that a weighed sheet is asked for, by the form's field.
FIELDS: Mapping[str, str] = {
    BALANCE: "balance_id",
    BURETTE: "burette_id",
    THERMOMETER: "thermometer_id",
    ROOM: "room_id",
}
_LOT_FIELD = "standard_lot_id"


@dataclass(frozen=True, slots=True)
class Materials:
    """What is picked for a sheet: the standard lot and the instruments, as far as there are any."""

    standard_lot: StandardLotFact | None
    instruments: tuple[InstrumentFact, ...]


class Offered:
    """What a recipe may rest on now; ``picked`` names things by field where somebody picked."""

    def __init__(
        self,
        session: Session,
        recipe: RecipeDocument,
        now: datetime,
        zone: str,
        *,
        picked: Mapping[str, str] | None = None,
    ) -> None:
        self._recipe, self._now, self._zone = recipe, now, zone
        self._picked = picked or {}
        self._instruments = listed_instruments(session, since=now - CHECK_SPAN)
        self._lots = {one.id: one for one in standard_lot_facts(session, substance=recipe.standard)}
        self.standard_lots = _usable_first(self._standard_lot(one) for one in self._lots.values())

    def kinds(self) -> tuple[str, ...]:
        """Return the kinds of instruments that the recipe asks for."""
        return tuple(kind for kind in FIELDS if kind != ROOM or self._recipe.buoyancy)

    def of_kind(self, kind: str) -> tuple[Choice, ...]:
        """Return the instruments of a kind."""
        found = (one for one in self._instruments if one.instrument.kind == kind)
        return _usable_first(self._instrument(one) for one in found)

    def materials(self) -> Materials:
        """Return what is picked, or else what the page proposes: the first that is in date."""
        found = (self._chosen(kind) for kind in self.kinds())
        lot_id = self.lot_id()
        return Materials(
            standard_lot=self._lots.get(lot_id) if lot_id else None,
            instruments=tuple(one for one in found if one is not None),
        )

    def lot_id(self) -> str:
        """Return the standard lot that is picked or proposed, empty where there is none."""
        picked = self._picked.get(_LOT_FIELD, "")
        return picked if picked in self._lots else _first_usable(self.standard_lots)

    def picks(self) -> dict[str, str]:
        """Return what is picked or proposed, by field."""
        found = {FIELDS[one.kind]: one.instrument_id for one in self.materials().instruments}
        lot_id = self.lot_id()
        return {_LOT_FIELD: lot_id, **found} if lot_id else found

    def plan_url(self, recipe_id: str) -> str:
        """Return the planner's address for what is picked or proposed."""
        return f"/planner?{urlencode({'recipe_id': recipe_id, **self.picks()})}"

    def asked(self) -> tuple[str, ...]:
        """Return the rows that the sheet will ask for, each once."""
        rig = rig_of(list(self.materials().instruments))
        rows = (*sheet_rows(self._recipe, rig), *replicate_rows(self._recipe, rig, 1))
        return tuple(dict.fromkeys(row.label for row in rows if row.required))

    def _chosen(self, kind: str) -> InstrumentFact | None:
        facts = {
            one.instrument.id: one.fact for one in self._instruments if one.instrument.kind == kind
        }
        picked = facts.get(self._picked.get(FIELDS[kind], ""))
        return picked or facts.get(_first_usable(self.of_kind(kind)))

    def _standard_lot(self, one: StandardLotFact) -> Choice:
        fraction = quantity_words(one.document.get("mass_fraction"))
        drying = one.document.get("drying")
        dried = last_drying(one.log, before=self._now)
        done = ""
        if dried is not None:
            log = drying_of(dried)
            done = f"last dried {done_words(log)}, {moment_words(log.ended_at, self._zone)}"
        good = f"good until {last_day_words(one.due_at, self._zone)}"
        says = ", ".join(part for part in (f"mass fraction {fraction}", drying, done, good) if part)
        return Choice(one.id, one.name, says, self._refused(one, "certificate"))

    def _instrument(self, one: ListedInstrument) -> Choice:
        row, fact = one.instrument, one.fact
        if fact is None:
            refused = "It has no calibration yet; a keeper records one."
            return Choice(row.id, row.name, row.document.get("type", ""), refused)
        about = (row.document.get("type"), row.document.get("location"))
        due = f"calibrated until {last_day_words(fact.due_at, self._zone)}"
        says = ", ".join(part for part in (*about, due) if part)
        invalid = self._refused(fact, "calibration")
        stopped = off_limits(fact, at=self._now, zone=self._zone)
        flag = "" if stopped else flag_of(fact, at=self._now, zone=self._zone)
        why = " ".join(part for part in (invalid, stopped) if part)
        return Choice(row.id, row.name, says, why or None, flag)

    def _refused(self, thing: StandardLotFact | InstrumentFact, what: str) -> str | None:
        state, says = judge(
            thing.name, due_at=thing.due_at, basis=thing.due_basis, holds=thing.holds,
            used_at=self._now, zone=self._zone, what=what,
        )  # fmt: skip
        return None if state == IN_DATE else says


def _usable_first(choices: Iterable[Choice]) -> tuple[Choice, ...]:
    return tuple(sorted(choices, key=lambda one: one.refused is not None))


def _first_usable(choices: Iterable[Choice]) -> str:
    return next((one.id for one in choices if one.refused is None), "")

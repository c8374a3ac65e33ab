"""The demo laboratory of a fictitious waterworks, filled through the procedures."""

import secrets
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from datetime import datetime, timedelta
from functools import partial
from random import Random

from server.demo import cast, runs, shelf, stores
from server.demo.cast import BASHIR, IMKE, JONAS, OTTILIE, STEWARD, Member
from server.demo.hands import Hands, minutes
from server.demo.probe_bench import ProbeBench
from server.demo.simulated import Line, Truth, replicate_lines, sheet_lines
from server.demo.workshop import Workshop
from server.lab.validity import local_day
from server.procedures.bench import BeginSheet
from server.procedures.holds import HoldThing, hold_thing
from server.procedures.laboratory import SetUpLaboratory, set_up_laboratory
from server.procedures.lots import (
    FillBottles,
    MakeUpLot,
    UseUpBottle,
    fill_bottles,
    make_up_lot,
    use_up_bottle,
)
from server.procedures.people import AddPerson, add_person, hash_new_password
from server.procedures.send_back import SendBack, send_back_sheet
from server.procedures.stores import (
    ReceiveStandardLot,
    WriteRecipe,
    receive_standard_lot,
    write_recipe,
)
from server.records.queries.load_sheet import load_sheet_facts
from server.records.transaction import Transactions

_SEED = 20170


@dataclass(frozen=True, slots=True)
class DemoPerson:
    """Who can sign in to the demo, and how."""

    printed_name: str
    sign_in_name: str
    password: str
    roles: tuple[str, ...]


@dataclass(frozen=True, slots=True)
class DemoSummary:
    """What to print after filling: people with passwords, bottles in force, a sheet that waits."""

    people: tuple[DemoPerson, ...]
    bottles_in_force: tuple[str, ...]
    bottles: tuple[str, ...]
    open_sheet_id: str
    waiting_sheet_id: str
    sent_back_sheet_id: str
    curve_sheet_id: str
    open_curve_sheet_id: str


def fill_demo(
    transactions: Transactions, *, now: datetime, zone: str, progress: Callable[[str], None]
) -> DemoSummary:
    """Fill an empty database with the demo laboratory; dates are relative to ``now``."""
    random = Random(_SEED)  # noqa: S311 - scatter and codes, nothing secret
    story = _Story(Hands(transactions, zone, random), now)
    progress("People and instruments …")
    people = story.set_up()
    story.stock()
    progress("Lots, bottles and bench sheets …")
    for say, part in story.parts():
        progress(say)
        part()
    return DemoSummary(
        people=people,
        bottles_in_force=tuple(story.in_force),
        bottles=tuple(story.bottles),
        open_sheet_id=story.sheets["open"],
        waiting_sheet_id=story.sheets["waiting"],
        sent_back_sheet_id=story.sheets["sent back"],
        curve_sheet_id=story.sheets["by probe"],
        open_curve_sheet_id=story.sheets["open, by probe"],
    )


class _Story:
    """Four months of the laboratory, in the order of time."""

    def __init__(self, hands: Hands, now: datetime) -> None:
        self._hands, self._now = hands, now
        self._workshop = Workshop(hands, now)
        self._standards: dict[str, str] = {}
        self._recipes: dict[str, str] = {}
        self._lots: dict[str, str] = {}
        self.bottles: list[str] = []
        self.in_force: list[str] = []
        self.sheets: dict[str, str] = {}

    def set_up(self) -> tuple[DemoPerson, ...]:
        """Set up the laboratory and its people; their passwords are new each time."""
        at, people = self._before(120), []
        for member in cast.MEMBERS:
            password = _password()
            hashed = hash_new_password(password, names=(member.printed_name,))
            if member is STEWARD:
                first = SetUpLaboratory(
                    name=cast.NAME,
                    address=cast.ADDRESS,
                    zone=self._hands.zone,
                    sign_in_name=member.sign_in_name,
                    printed_name=member.printed_name,
                    password=password,
                    country=cast.COUNTRY,
                )
                person_id = self._hands.transactions.write(
                    partial(set_up_laboratory, command=first, password_hash=hashed, now=at)
                )
            else:
                command = AddPerson(
                    member.sign_in_name, member.printed_name, member.roles, password
                )
                person_id = self._hands.do(add_person, command, STEWARD, at, password_hash=hashed)
            self._hands.ids[member.sign_in_name] = person_id
            people.append(
                DemoPerson(member.printed_name, member.sign_in_name, password, member.roles)
            )
        return tuple(people)

    def stock(self) -> None:
        """Let the keeper register instruments, standard lots and recipes."""
        at = self._before(119)
        self._workshop.stock(at)
        for substance, stated in cast.STANDARD_LOTS.items():
            command = ReceiveStandardLot(
                substance=substance,
                due_on=self._day(-300),
                received_on=self._day(119),
                **stated,
                **stores.certificate_file(substance, stated),
            )
            self._standards[substance] = self._hands.do(receive_standard_lot, command, JONAS, at)
        for name, document in cast.RECIPES.items():
            written = WriteRecipe(name, dict(document))
            self._recipes[document["titrant"]["substance"]] = self._hands.do(
                write_recipe, written, JONAS, at
            )
        with self._hands.chance_of(_SEED + 3):
            written = WriteRecipe(cast.PROBE_RECIPE_NAME, dict(cast.PROBE_RECIPE))
            self._recipes[cast.PROBE_RECIPE_NAME] = self._hands.do(write_recipe, written, JONAS, at)

    def parts(self) -> list[tuple[str, Callable[[], None]]]:
        """Return the parts of the story with what to say before each."""
        shop = self._workshop
        return [
            ("Check weighings …", partial(shop.check_balance, range(110, 62, -6))),
            ("An acid …", self._acid),
            ("More check weighings …", partial(shop.check_balance, range(57, 41, -5))),
            ("A lye that lapsed …", self._lapsed_lye),
            ("A crumb on the pan …", shop.find_a_crumb),
            ("The acid again; its next check is due …", self._acid_again),
            ("Check weighings once more …", partial(shop.check_balance, range(22, 12, -3))),
            ("A lye in force …", self._lye_in_force),
            ("A sheet sent back …", self._sent_back),
            ("A probe in its buffers …", shop.calibrate_probe),
            ("A new lye …", self._new_lye),
            ("A lye by its curves …", self._by_probe),
            ("A lye that waits for a second person …", self._waiting),
            ("Curves that are not all there yet …", self._open_by_probe),
            ("A sheet open half-way …", self._open),
            ("The probe once more …", partial(shop.check_probe, 0.02, pH="6.87", celsius="24.4")),
        ]

    def _acid(self) -> None:
        self._make_up("acid", "HCl", BASHIR, 62, made_from="ampoule of concentrate, 1 L flask")
        self.in_force += self._fill("acid", BASHIR, 62, place="Shelf 2", count=1)
        stores.opened(self._hands, self._standards["TRIS"], BASHIR, self._before(61.2))
        sheet = self._begin("acid", "TRIS", BASHIR, 61)
        self._titrate(sheet, Truth("TRIS", 0.09985, 21.2), BASHIR, 61, count=4)
        self._certify(sheet, BASHIR, 61)
        shelf.open_acid(self._hands, self.in_force[0], self._before(60))

    def _acid_again(self) -> None:
        sheet = self._begin("acid", "TRIS", IMKE, 26)
        self._titrate(sheet, Truth("TRIS", 0.09988, 20.8), IMKE, 26, count=5, off={4: 0.9})
        criterion = ("titrated past the end point", "yellow before the last drop was seen")
        self._hands.leave_out(sheet, 4, criterion, IMKE, self._before(26) + minutes(80))
        self._certify(sheet, IMKE, 26)

    def _lapsed_lye(self) -> None:
        self._make_up("old lye", "NaOH", IMKE, 41, made_from="50 % caustic, clear supernatant")
        self._fill("old lye", IMKE, 41, place="Shelf 1", count=1)
        stores.opened(self._hands, self._standards["KHP"], IMKE, self._before(40.4))
        stores.used_by_hand(self._hands, self._standards["KHP"], self._before(40.3))
        self._dry(IMKE, 40)
        sheet = self._begin("old lye", "KHP", IMKE, 40)
        self._titrate(sheet, Truth("KHP", 0.10042, 20.3), IMKE, 40, count=6)
        self._certify(sheet, IMKE, 40)

    def _lye_in_force(self) -> None:
        self._make_up("lye", "NaOH", IMKE, 12, made_from="50 % caustic, clear supernatant")
        used_up, held, good = self._fill("lye", IMKE, 12, place="Shelf 1", count=3)
        self._dry(IMKE, 11)
        first = self._begin("lye", "KHP", IMKE, 11)
        self._titrate(first, Truth("KHP", 0.10216, 20.6), IMKE, 11, count=6)
        self._certify(first, IMKE, 11)
        at = self._before(4) - minutes(40)
        stores.dried_with_a_slip(self._hands, self._standards["KHP"], BASHIR, at)
        second = self._begin("lye", "KHP", BASHIR, 4)
        self._titrate(second, Truth("KHP", 0.10211, 21.1), BASHIR, 4, count=6, slip=3)
        self._certify(second, BASHIR, 4)
        self._hands.do(use_up_bottle, UseUpBottle(used_up), IMKE, self._before(3))
        shelf.watch(self._hands, held, self._before)
        shelf.tell_uses(self._hands, self.in_force[0], self._before)
        doubt = HoldThing("bottle", held, "stood open over the weekend")
        self._hands.do(hold_thing, doubt, BASHIR, self._before(2))
        self.in_force.append(good)

    def _sent_back(self) -> None:
        self._dry(IMKE, 1.9)
        sheet = self._begin("old lye", "KHP", IMKE, 1.9)
        truth = Truth("KHP", 0.10031, 20.4)
        self._titrate(sheet, truth, IMKE, 1.9, count=4, off={3: -0.55})
        reasons = {"spread": "replicate 3 lies low, no cause found"}
        self._hands.hand_in(sheet, IMKE, self._before(1.9) + minutes(95), reasons=reasons)
        self._send_back(sheet, "Replicate 3: was the burette read at rest? Titrate one more.", 1.7)
        self.sheets["sent back"] = sheet

    def _new_lye(self) -> None:
        self._make_up("new lye", "NaOH", IMKE, 1.5, made_from="50 % caustic, clear supernatant")
        self._fill("new lye", IMKE, 1.5, place="Shelf 1", count=1)

    def _waiting(self) -> None:
        self._dry(BASHIR, 0.5)
        sheet = self._begin("new lye", "KHP", BASHIR, 0.5)
        truth = Truth("KHP", 0.10118, 21.4)
        self._titrate(sheet, truth, BASHIR, 0.5, count=5, off={2: 0.62})
        reasons = {
            "spread": "replicate 2 is high; the drop may have hung at the tip, kept in the mean",
            "outlier": "no cause found on the day, so it stays in",
        }
        self._hands.hand_in(sheet, BASHIR, self._before(0.5) + minutes(100), reasons=reasons)
        self.sheets["waiting"] = sheet

    def _open(self) -> None:
        sheet = self._begin("acid", "TRIS", BASHIR, 0.06)
        truth = Truth("TRIS", 0.09986, 20.9)
        at = self._before(0.06)
        self._hands.write(sheet, self._sheet_lines(truth), BASHIR, at + minutes(4))
        lines = [replicate_lines(truth, n, self._hands.random, tared=True) for n in (1, 2, 3)]
        self._hands.write(sheet, lines[0], BASHIR, at + minutes(16))
        self._write_with_slip(sheet, lines[1], BASHIR, at + minutes(28))
        self._hands.write(sheet, lines[2][:2], BASHIR, at + minutes(38))
        self.sheets["open"] = sheet

    def _by_probe(self) -> None:
        """Let a lye be made up, titrated by probe and countersigned; one curve is taken again."""
        with self._hands.chance_of(_SEED + 1):
            self._make_up("probe lye", "NaOH", IMKE, 1.4, made_from="50 % caustic, boiled water")
            self._workshop.check_probe(1.23, pH="6.86", celsius="24.6")
            self._dry(IMKE, 1.2)
            sheet = self._begin("probe lye", "KHP", IMKE, 1.2, by_probe=True)
            bench = ProbeBench(self._hands, sheet, Truth("KHP", 0.10087, 20.8), IMKE)
            at = self._before(1.2)
            bench.open(at + minutes(5))
            for replicate in (1, 2, 3, 4):
                bench.titrate(replicate, at + minutes(14 * replicate), again=replicate == 2)
            self._certify(sheet, IMKE, 1.2)
        self.sheets["by probe"] = sheet

    def _open_by_probe(self) -> None:
        """Leave a sheet open in which the fourth replicate is weighed and waits for its curve."""
        with self._hands.chance_of(_SEED + 2):
            self._workshop.check_probe(0.33, pH="6.85", celsius="24.8")
            self._dry(IMKE, 0.3)
            sheet = self._begin("probe lye", "KHP", IMKE, 0.3, by_probe=True)
            bench = ProbeBench(self._hands, sheet, Truth("KHP", 0.10091, 20.9), IMKE)
            at = self._before(0.3)
            bench.open(at + minutes(5))
            for replicate in (1, 2, 3):
                bench.titrate(replicate, at + minutes(14 * replicate))
            bench.weigh(4, at + minutes(58))
        self.sheets["open, by probe"] = sheet

    def _make_up(
        self, key: str, titrant: str, member: Member, days: float, *, made_from: str
    ) -> None:
        steps = "water boiled out and cooled\nmixed 5 minutes"
        command = MakeUpLot(titrant, "0.1", made_from=made_from, preparation=steps)
        self._lots[key] = self._hands.do(
            make_up_lot, command, member, self._before(days), source=self._hands.random
        )

    def _fill(
        self, key: str, member: Member, days: float, *, place: str, count: int
    ) -> tuple[str, ...]:
        command = FillBottles(self._lots[key], place, "1000", count)
        at = self._before(days) + minutes(25)
        codes = self._hands.do(fill_bottles, command, member, at, source=self._hands.random)
        self.bottles += codes
        return codes

    def _begin(
        self, key: str, standard: str, member: Member, days: float, *, by_probe: bool = False
    ) -> str:
        visual = "NaOH" if standard == "KHP" else "HCl"
        command = BeginSheet(
            lot_code=self._lots[key],
            recipe_id=self._recipes[cast.PROBE_RECIPE_NAME if by_probe else visual],
            standard_lot_id=self._standards[standard],
            balance_id=self._workshop.ids[cast.BALANCE.name],
            burette_id=self._workshop.ids[cast.BURETTE.name],
            thermometer_id=self._workshop.ids[cast.THERMOMETER.name],
            room_id=self._workshop.ids[cast.ROOM.name],
            probe_id=self._workshop.ids[runs.PROBE.name] if by_probe else None,
        )
        self._workshop.check_balance([days])
        return self._hands.begin(command, member, self._before(days))

    def _dry(self, member: Member, days: float) -> None:
        """Let somebody dry the KHP before a sheet is begun."""
        at = self._before(days) - minutes(40)
        stores.dried(self._hands, self._standards["KHP"], member, at)

    def _titrate(
        self,
        sheet: str,
        truth: Truth,
        member: Member,
        days: float,
        *,
        count: int,
        off: Mapping[int, float] | None = None,
        slip: int = 0,
    ) -> None:
        """Write a whole sheet, a replicate every twelve minutes; correct a slip in one."""
        at, tared = self._before(days) + minutes(5), truth.standard == "TRIS"
        self._hands.write(sheet, self._sheet_lines(truth), member, at)
        for replicate in range(1, count + 1):
            lines = replicate_lines(
                truth, replicate, self._hands.random, tared=tared,
                off_percent=(off or {}).get(replicate, 0.0),
            )  # fmt: skip
            write = self._write_with_slip if replicate == slip else self._hands.write
            write(sheet, lines, member, at + minutes(12 * replicate))

    def _write_with_slip(
        self, sheet: str, lines: Sequence[Line], member: Member, at: datetime
    ) -> None:
        """Write the end of a titration a millilitre too high, and correct it in ink."""
        slot = "burette_end"
        right = next(line for line in lines if line[1] == slot)
        slipped = (right[0], slot, f"{float(right[2]) + 1:.2f}")
        wrong = [slipped if line == right else line for line in lines]
        self._hands.write(sheet, wrong, member, at)
        reason = "misread by a whole millilitre"
        self._hands.correct(sheet, right, reason, member, at + minutes(1))

    def _sheet_lines(self, truth: Truth) -> list[Line]:
        tris = truth.standard == "TRIS"
        drying = None if tris else "2 h at 120 °C, cooled in the desiccator"
        return sheet_lines(truth, each_temperature=tris, drying=drying)

    def _certify(self, sheet: str, member: Member, days: float) -> None:
        handed_in = self._before(days) + minutes(95)
        self._hands.hand_in(sheet, member, handed_in)
        self._hands.countersign(sheet, OTTILIE, handed_in + minutes(140))

    def _send_back(self, sheet: str, remark: str, days: float) -> None:
        facts = self._hands.transactions.read(lambda session: load_sheet_facts(session, sheet))
        command = SendBack(sheet, facts.revision, remark)
        self._hands.do(send_back_sheet, command, OTTILIE, self._before(days))

    def _before(self, days: float) -> datetime:
        return self._now - timedelta(days=days)

    def _day(self, days_ago: int) -> str:
        return local_day(self._before(days_ago), self._hands.zone).isoformat()


def _password() -> str:
    """Return a password of three words and a number, drawn anew for each data folder."""
    words = [secrets.choice(cast.WORDS) for _ in range(3)]
    return f"{'-'.join(words)}-{secrets.randbelow(90) + 10}"

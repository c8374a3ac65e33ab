"""A bench sheet titrated by probe: weighings as before, a meter's file for each replicate."""

from dataclasses import dataclass
from datetime import datetime

from server.demo.cast import Member
from server.demo.hands import Hands, minutes
from server.demo.simulated import Line, Truth, amount_of, replicate_lines, sheet_lines
from server.demo.simulated_curve import Flask, curve_text
from server.lab.in_use import is_mass


@dataclass(frozen=True, slots=True)
class ProbeBench:
    """Somebody at the bench with a probe, on one sheet."""

    hands: Hands
    sheet: str
    truth: Truth
    member: Member

    def open(self, at: datetime) -> None:
        """Write what holds for the whole sheet; on a curve there is no indicator and no blank."""
        lines = sheet_lines(
            self.truth, each_temperature=False, drying="2 h at 120 °C, cooled in the desiccator"
        )
        kept = [line for line in lines if line[1] not in {"indicator", "blank"}]
        self.hands.write(self.sheet, kept, self.member, at)

    def weigh(self, replicate: int, at: datetime) -> list[Line]:
        """Write a replicate's weighings, and return them."""
        lines = replicate_lines(self.truth, replicate, self.hands.random, tared=False)
        masses = [line for line in lines if is_mass(line[1])]
        self.hands.write(self.sheet, masses, self.member, at)
        return masses

    def titrate(self, replicate: int, at: datetime, *, again: bool = False) -> None:
        """Write a replicate with its curve; ``again``: after a short file, which is struck."""
        amount = amount_of(self.truth, self.weigh(replicate, at))
        at = at + minutes(9)
        text = curve_text(self._flask(amount), self.hands.random)
        if again:
            part = (replicate, f"run{replicate}-short.csv", _every_other(text))
            self.hands.write_curve(self.sheet, part, self.member, at)
            at = at + minutes(3)
        whole = (replicate, f"run{replicate}.csv", text)
        why = "exported with every second reading only" if again else ""
        self.hands.write_curve(self.sheet, whole, self.member, at, again=why)

    def _flask(self, amount_mmol: float) -> Flask:
        """Return the flask: the certified number is the effective one, carbonate comes on top."""
        scatter = self.hands.random.gauss(1.0, 0.0002)
        carbonate = 0.003
        lye = self.truth.mol_per_L * scatter / (1 - carbonate)
        return Flask(amount_mmol, lye, self.truth.celsius, carbonate)


def _every_other(text: str) -> str:
    """Return a curve with every second reading left out."""
    header, *lines = text.splitlines()
    return "\n".join([header, *lines[::2]]) + "\n"

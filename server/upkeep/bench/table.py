"""What a measurement answers: lines of a table, each with what it reached and what it should."""

from collections.abc import Callable, Iterator
from dataclasses import dataclass


@dataclass(frozen=True, slots=True)
class Line:
    """A line of the table; ``missed`` names the figures that were not reached."""

    says: str
    missed: tuple[str, ...] = ()

    def text(self) -> str:
        """Return the line as it is printed."""
        return f"{self.says}  NOT REACHED: {', '.join(self.missed)}" if self.missed else self.says


@dataclass(frozen=True, slots=True)
class Bench:
    """A measurement by name: what it measures, and how its lines come about, one by one."""

    name: str
    says: str
    lines: Callable[[], Iterator[Line]]

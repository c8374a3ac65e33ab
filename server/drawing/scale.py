"""Where a value stands on a picture, and which round values are worth a line."""

from dataclasses import dataclass
from math import ceil, floor, log10


@dataclass(frozen=True, slots=True)
class Scale:
    """A straight scale from values ``low`` to ``high`` onto pixels ``start`` to ``end``."""

    low: float
    high: float
    start: float
    end: float

    def at(self, value: float) -> float:
        """Return the pixel of a value."""
        return self.start + (value - self.low) / (self.high - self.low) * (self.end - self.start)


def scale_around(
    values: list[float], *, start: float, end: float, room: float = 0.12, least: float = 1e-12
) -> Scale:
    """Return a scale that holds all values with ``room`` (a fraction of their range) around.

    ``least`` is the smallest range shown, so that equal values stand in the middle.
    """
    low, high = min(values), max(values)
    spare = max((high - low) * room, (least - (high - low)) / 2, 1e-300)
    return Scale(low=low - spare, high=high + spare, start=start, end=end)


def round_values(low: float, high: float, *, about: int = 4) -> list[float]:
    """Return the multiples of 1, 2 or 5 times a power of ten inside the range, about so many."""
    raw = (high - low) / about
    power: float = 10.0 ** floor(log10(raw))
    step = next(power * m for m in (1, 2, 5, 10) if power * m >= raw * (1 - 1e-9))
    first, last = ceil(low / step - 1e-9), floor(high / step + 1e-9)
    return [n * step for n in range(first, last + 1)]

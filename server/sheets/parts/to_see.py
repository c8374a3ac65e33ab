"""What a second person is shown before she signs: strikes, late entries, wrong clocks."""

from collections.abc import Callable, Iterable, Iterator

from server.lab.sheet_facts import SheetFacts
from server.lab.slots import place_words
from server.sheets.bench import BenchGroup, BenchRow, EntryView
from server.sheets.countersign import ToSee
from server.sheets.parts.telling import count_words

_Rows = tuple[tuple[str, str], ...]


def things_to_see(facts: SheetFacts, groups: Iterable[BenchGroup]) -> tuple[ToSee, ...]:
    """Return what stands out in what was written, each with its rows."""
    return tuple(_things(facts, tuple(groups)))


def anchor_of(row: BenchRow) -> str:
    """Return the anchor of a row on the page."""
    return f"row-{row.replicate}-{row.slot.replace(':', '-')}-{row.segment}"


def _things(facts: SheetFacts, groups: tuple[BenchGroup, ...]) -> Iterator[ToSee]:
    rows = [row for group in groups for row in group.rows if row.slot != "excluded"]
    struck = sum(len(row.struck) for row in rows)
    if struck:
        words = count_words(struck, "entry struck through", "entries struck through")
        yield ToSee(words, _where(rows, lambda row: bool(row.struck)))
    late = _where(rows, lambda row: any(one.late for one in _entries(row)))
    if late:
        words = count_words(len(late), "row with a late entry", "rows with a late entry")
        yield ToSee(f"{words}: it came more than 15 min after it was written", late)
    off = _where(rows, lambda row: any("clock" in one.clock_says for one in _entries(row)))
    if off:
        words = count_words(len(off), "row", "rows")
        yield ToSee(f"{words} written by a clock that was more than 2 min wrong", off)
    left_out = [str(group.replicate) for group in groups if group.excluded]
    if left_out:
        yield ToSee(f"Left out of the mean: replicate {', '.join(left_out)}")
    for one in facts.overrides:
        yield ToSee(f"{one.by.printed_name} let the {one.what} be used: {one.reason}")
    if facts.returns:
        yield ToSee(f"Sent back {count_words(len(facts.returns), 'time')} before")


def _entries(row: BenchRow) -> Iterator[EntryView]:
    if row.value:
        yield row.value
    yield from (one.entry for one in row.struck)


def _where(rows: Iterable[BenchRow], wanted: Callable[[BenchRow], bool]) -> _Rows:
    return tuple(
        (place_words(row.replicate, row.label), anchor_of(row)) for row in rows if wanted(row)
    )

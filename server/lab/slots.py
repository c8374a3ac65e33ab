"""The rows that a recipe asks for, in the order in which the work is done."""

from collections.abc import Iterable, Mapping, Sequence
from dataclasses import dataclass, replace
from decimal import Decimal

from server.lab.curve_entry import CURVE_METHODS
from server.lab.curve_entry import METHOD_SLOT as END_POINT_METHOD
from server.lab.curve_entry import SLOT as CURVE
from server.lab.ink import COUNTS_AGAIN, EXCLUSION_CRITERIA, Place, WrittenEntry, excluded, standing
from server.lab.recipe import RecipeDocument
from server.lab.refusal import Unacceptable
from server.lab.rig import Rig, Span

MOST_REPLICATES = 20
MOST_SEGMENTS = 9
CURVE_KIND = "curve"
_CURVE_HINT = "Drop a file or paste two columns: volume, then pH or mV."
#: Common indicators of the trade, offered besides the recipe's own.
INDICATORS = (
    "phenolphthalein",
    "thymolphthalein",
    "bromothymol blue",
    "methyl red",
    "methyl orange",
    "bromocresol green",
    "bromocresol green and methyl red",
    "bromophenol blue",
    "starch",
    "ferroin",
    "potassium chromate",
    "eriochrome black T",
    "none, own colour of the titrant",
)


@dataclass(frozen=True, slots=True)
class Row:
    """One row of the bench sheet, empty.

    ``kind``: number, step, choice, text or curve. ``low`` and ``high`` are what is possible;
    ``usual_low`` and ``usual_high`` what is usual: outside it a reason is asked.
    """

    replicate: int
    slot: str
    segment: int
    label: str
    unit: str | None = None
    hint: str = ""
    kind: str = "number"
    decimals: int | None = None
    signed: bool = False
    required: bool = True
    choices: tuple[str, ...] = ()
    low: str | None = None
    high: str | None = None
    usual_low: str | None = None
    usual_high: str | None = None

    @property
    def place(self) -> Place:
        """Replicate (0 is the sheet), slot and segment."""
        return self.replicate, self.slot, self.segment


def sheet_rows(recipe: RecipeDocument, rig: Rig) -> tuple[Row, ...]:
    """Return the rows that hold for the whole sheet: steps, indicator, temperatures, air, blank."""
    rows = [
        Row(0, f"step:{step.key}", 1, step.label, kind="step")
        for step in recipe.steps
        if step.when == "before"
    ]
    if recipe.end_point.indicator:
        own = recipe.end_point.indicator
        choices = (own, *(one for one in INDICATORS if one != own))
        rows.append(Row(0, "indicator", 1, "Indicator used", kind="choice", choices=choices))
    if recipe.temperature == "once":
        rows.append(_temperature(0, recipe, rig))
    if recipe.buoyancy:
        rows += _air()
    if recipe.blank:
        rows.append(_blank(recipe.blank, rig))
    rows.append(Row(0, "remark", 1, "Remark", kind="text", required=False))
    return tuple(rows)


def replicate_rows(
    recipe: RecipeDocument, rig: Rig, replicate: int, *, segments: int = 1
) -> tuple[Row, ...]:
    """Return the rows of one replicate with as many fillings of the burette as were begun."""
    rows = [
        Row(replicate, f"step:{step.key}", 1, step.label, kind="step")
        for step in recipe.steps
        if step.when == "replicate"
    ]
    rows += _masses(recipe, rig, replicate)
    if recipe.end_point.takes_curve:
        rows.append(Row(replicate, CURVE, 1, "Titration curve", hint=_CURVE_HINT, kind=CURVE_KIND))
    else:
        for segment in range(1, segments + 1):
            rows += _burette(rig, replicate, segment)
    if recipe.temperature == "each":
        rows.append(_temperature(replicate, recipe, rig))
    if recipe.end_point.takes_curve:
        rows.append(
            Row(
                replicate, END_POINT_METHOD, 1, "End point taken by",
                hint="Only where another method than the recipe's is to count; give the reason.",
                kind="choice", required=False, choices=CURVE_METHODS,
            )
        )  # fmt: skip
    rows.append(
        Row(
            replicate, "excluded", 1, "Left out of the mean",
            hint="Pick the criterion and give the reason; the replicate stays visible.",
            kind="choice", required=False, choices=(*EXCLUSION_CRITERIA, COUNTS_AGAIN),
        )
    )  # fmt: skip
    return tuple(rows)


def all_rows(recipe: RecipeDocument, rig: Rig, entries: Sequence[WrittenEntry]) -> tuple[Row, ...]:
    """Return every row of a sheet as it stands: as many replicates as wanted or begun."""
    now = standing(entries)
    rows = list(sheet_rows(recipe, rig))
    for replicate in range(1, replicates_shown(recipe, entries) + 1):
        segments = segments_begun(now, replicate)
        rows += replicate_rows(recipe, rig, replicate, segments=segments)
    return tuple(rows)


def replicates_shown(recipe: RecipeDocument, entries: Iterable[WrittenEntry]) -> int:
    """Return how many replicates the page shows: those wanted, one more for each left out."""
    entries = tuple(entries)
    left_out = len(excluded(entries))
    begun = max((place[0] for place in standing(entries)), default=0)
    return min(MOST_REPLICATES, max(recipe.replicates + left_out, begun))


def segments_begun(now: Mapping[Place, WrittenEntry], replicate: int) -> int:
    """Return how many fillings of the burette a replicate has, at least one."""
    found = [
        segment
        for (number, slot, segment) in now
        if number == replicate and slot in {"burette_start", "burette_end"}
    ]
    return max(found, default=1)


def row_at(recipe: RecipeDocument, rig: Rig, place: Place) -> Row:
    """Return the row at a place.

    Raises:
        Unacceptable: the recipe asks for no such row.
    """
    replicate, slot, segment = place
    if not 0 <= replicate <= MOST_REPLICATES:
        says = f"replicate must be from 0 (the sheet) to {MOST_REPLICATES}."
        raise Unacceptable(says, field="replicate", example="1")
    if not 1 <= segment <= MOST_SEGMENTS:
        says = f"segment must be from 1 to {MOST_SEGMENTS}."
        raise Unacceptable(says, field="segment", example="1")
    if slot == "remark":
        return Row(replicate, slot, segment, "Remark", kind="text", required=False)
    rows = (
        sheet_rows(recipe, rig)
        if replicate == 0
        else replicate_rows(recipe, rig, replicate, segments=segment)
    )
    for row in rows:
        if row.place == place:
            return row
    where = "the sheet" if replicate == 0 else f"replicate {replicate}"
    raise Unacceptable(f"This recipe has no row “{slot[:40]}” for {where}.", field="slot")


def place_words(replicate: int, label: str) -> str:
    """Return a row with its replicate, as a sentence names it: ``Replicate 2, Burette, end``."""
    return f"Replicate {replicate}, {label}" if replicate else f"Sheet, {label}"


def _masses(recipe: RecipeDocument, rig: Rig, replicate: int) -> list[Row]:
    def mass(slot: str, label: str, hint: str = "", *, required: bool = True) -> Row:
        span = rig.balance_table or rig.balance
        return Row(
            replicate, slot, 1, label, "g", hint,
            decimals=rig.balance_decimals, required=required,
            low=span.low if span else "0", high=span.high if span else None,
        )  # fmt: skip

    if recipe.route != "weighed":
        return []
    if recipe.weighing == "difference":
        return [
            mass("container_and_standard", "Container with standard"),
            mass("container_less_standard", "Container after"),
        ]
    rows = [mass("mass", "Standard, tared")]
    if rig.balance_table is not None:
        rows.insert(0, mass("tare_load", "Load before taring", "The vessel that was tared."))
    return rows


def _burette(rig: Rig, replicate: int, segment: int) -> list[Row]:
    span = _narrower(rig.burette, rig.burette_table)
    after = "" if segment == 1 else f", filling {segment}"
    start = Row(
        replicate, "burette_start", segment, f"Burette, start{after}", "mL",
        decimals=rig.burette_decimals,
        low=span.low if span else "0", high=span.high if span else None,
    )  # fmt: skip
    hint = "" if segment == 1 else "The volumes of all fillings are added."
    return [start, replace(start, slot="burette_end", label=f"Burette, end{after}", hint=hint)]


def _narrower(scale: Span | None, table: Span | None) -> Span | None:
    return table or scale


def _temperature(replicate: int, recipe: RecipeDocument, rig: Rig) -> Row:
    # Volumes are reckoned by the density of water where no expansion is stated: 0 to 40 °C.
    span = Span("0", "40" if recipe.liquid_expansion is None else "100")
    table = rig.thermometer_table
    if table is not None:
        span = Span(max(span.low, table.low, key=Decimal), min(span.high, table.high, key=Decimal))
    return Row(
        replicate, "temperature", 1, "Temperature of the titrant", "Cel",
        "Read in the titrant at the burette.",
        decimals=rig.thermometer_decimals,
        low=span.low, high=span.high, usual_low="15", usual_high="30",
    )  # fmt: skip


def _air() -> list[Row]:
    # The usual spans are those for which the CIPM-2007 equation is stated to hold.
    return [
        Row(0, "air_temperature", 1, "Air temperature", "Cel", low="0", high="50",
            usual_low="15", usual_high="27"),
        Row(0, "air_pressure", 1, "Air pressure", "hPa", "At the balance, not at sea level.",
            low="500", high="1100", usual_low="600", usual_high="1100"),
        Row(0, "air_humidity", 1, "Air humidity", "%", low="0", high="100"),
    ]  # fmt: skip


def _blank(kind: str, rig: Rig) -> Row:
    return Row(
        0, "blank", 1, f"Blank, {kind}", "mL", "Same reagents and volume, no standard.",
        decimals=rig.burette_decimals, low="0", high="5", usual_low="0", usual_high="1",
    )  # fmt: skip

"""From a bench sheet's facts to its record, its circumstances and its evaluation."""

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass, fields, replace
from typing import Any

from server.evaluation.assembly import EntryValue, Missing, SheetMaterials, assemble
from server.evaluation.bench_record import RecordProblem
from server.evaluation.circumstances import (
    Circumstances,
    EndPoint,
    InDate,
    Interim,
    LastCertificate,
    Limits,
    Probe,
    Resolution,
    SampleMass,
    to_document,
)
from server.evaluation.drying_of_sheet import drying_of_sheet
from server.evaluation.entrance import evaluate
from server.evaluation.snapshot import make_snapshot
from server.lab.calibration.check_log import CHECK_OF_KIND, charts_of, check_that_counts
from server.lab.canonical import canonical, digest
from server.lab.curve_entry import METHOD_SLOT
from server.lab.curve_entry import SLOT as CURVE_SLOT
from server.lab.in_use import InUse, things_in_use
from server.lab.ink import COUNTS_AGAIN, WrittenEntry, excluded, standing
from server.lab.recipe import RecipeDocument
from server.lab.refusal import Unacceptable
from server.lab.rig import rig_of
from server.lab.sheet_facts import (
    BALANCE,
    BURETTE,
    PROBE,
    ROOM,
    THERMOMETER,
    CertificateFact,
    InstrumentFact,
    SheetFacts,
    StandardLotFact,
)
from server.lab.slots import all_rows
from server.lab.validity import last_day, local_day

#: Monte Carlo trials that a hand in runs at least; the simulation adds more where it needs them.
HAND_IN_TRIALS = 100_000
_RECORD_PARTS = {
    BALANCE: ("linearity", "error_table", "error_u"),
    BURETTE: ("capacity", "delivery", "error_table", "glass_expansion"),
    THERMOMETER: ("reading", "error_table"),
    ROOM: ("temperature", "pressure", "humidity"),
}


@dataclass(frozen=True, slots=True)
class PreparedSheet:
    """A sheet read for evaluation. ``document`` is None while something required is missing.

    ``draft`` is the record of what is there; ``input_digest`` covers record and circumstances.
    """

    sheet_id: str
    revision: int
    document: dict[str, Any] | None
    draft: dict[str, Any]
    missing: tuple[Missing, ...]
    circumstances: Circumstances
    input_digest: str


@dataclass(frozen=True, slots=True)
class EvaluatedSheet:
    """An evaluation that was made with no transaction open, and what it was made from."""

    sheet_id: str
    revision: int
    input_digest: str
    calculation: str
    result: dict[str, Any]
    snapshot: str
    snapshot_digest: str


def prepare_sheet(facts: SheetFacts) -> PreparedSheet:
    """Return what the evaluation of a sheet starts from, and what is missing for it."""
    assembled = assemble(materials_of(facts))
    circumstances = circumstances_of(facts)
    missing = (*_missing_rows(facts, assembled.missing), *assembled.missing)
    both = {"record": assembled.draft, "circumstances": to_document(circumstances)}
    return PreparedSheet(
        sheet_id=facts.id,
        revision=facts.revision,
        document=None if missing else assembled.document,
        draft=assembled.draft,
        missing=missing,
        circumstances=circumstances,
        input_digest=digest(canonical(both)),
    )


def evaluate_sheet(prepared: PreparedSheet, *, trials: int = HAND_IN_TRIALS) -> EvaluatedSheet:
    """Return the evaluation of a prepared sheet with its snapshot.

    Raises:
        Unacceptable: a required entry is missing, or the record cannot be evaluated.
    """
    if prepared.document is None:
        first = prepared.missing[0]
        raise Unacceptable(first.says, field=first.slot or None)
    try:
        result = evaluate(prepared.document, circumstances=prepared.circumstances, trials=trials)
    except RecordProblem as problem:
        raise Unacceptable(problem.says, field=problem.path, example=problem.example) from problem
    snapshot = make_snapshot(prepared.document, prepared.circumstances, result, trials=trials)
    calculation = result["calculation"]
    return EvaluatedSheet(
        sheet_id=prepared.sheet_id,
        revision=prepared.revision,
        input_digest=prepared.input_digest,
        calculation=f"{calculation['name']} {calculation['version']}",
        result=result,
        snapshot=snapshot.text,
        snapshot_digest=snapshot.digest,
    )


def materials_of(facts: SheetFacts) -> SheetMaterials:
    """Return a sheet's facts as the fragments of a bench record."""
    entries = tuple(
        EntryValue(one.replicate, one.slot, one.segment, _text(one), one.unit)
        for one in standing(facts.entries).values()
        if one.text != COUNTS_AGAIN
    )
    papers = materials_on(facts.recipe.document, facts.standard_lot, facts.instruments)
    return replace(papers, entries=entries)


def materials_on(
    recipe: RecipeDocument, lot: StandardLotFact | None, used: Sequence[InstrumentFact]
) -> SheetMaterials:
    """Return what a sheet would rest on before anything is written on it."""
    instruments = {one.kind: one for one in used}
    return SheetMaterials(
        titrant_substance=recipe.titrant.substance,
        nominal=recipe.titrant.nominal,
        medium=recipe.titrant.medium,
        route=recipe.route,
        ratio=recipe.ratio,
        liquid_expansion=recipe.liquid_expansion,
        standard=_standard(lot),
        balance=_fragment(instruments.get(BALANCE)),
        buoyancy=recipe.buoyancy,
        burette=_fragment(instruments.get(BURETTE)) or {},
        thermometer=_fragment(instruments.get(THERMOMETER)),
        temperature_each=recipe.temperature == "each",
        room=_fragment(instruments.get(ROOM)),
        repeatability=_without(recipe.repeatability, "source"),
        blank_kind=recipe.blank,
        blank=_blank(instruments.get(BURETTE)),
        excess=recipe.excess,
        replicates_wanted=recipe.replicates,
        weighing=recipe.weighing,
        takes_curve=recipe.end_point.takes_curve,
        end_point=_on_curve(recipe),
        entries=(),
        roots=_roots(lot, used),
    )


def circumstances_of(facts: SheetFacts) -> Circumstances:
    """Return all around a sheet that its findings need and its record does not hold."""
    recipe = facts.recipe.document
    written = standing(facts.entries)
    indicator = written.get((0, "indicator", 1))
    return Circumstances(
        limits=limits_of(facts.laboratory.settings.get("limits") or {}, recipe.limits),
        end_point=EndPoint(
            mode=recipe.end_point.mode,
            indicator_expected=recipe.end_point.indicator,
            indicator_used=indicator.text if indicator else None,
            used_with=_mode_of_use(recipe.valid_for),
        ),
        resolution=_resolution(facts),
        sample_mass=_sample_mass(facts),
        in_date=tuple(_in_date(one, facts.laboratory.zone) for one in things_in_use(facts)),
        drying=drying_of_sheet(facts),
        last_certificate=_last(facts.last_certificate),
        probe=_probe(facts.instrument(PROBE)),
        interim=tuple(_interim(facts)),
        own_where_larger=recipe.repeatability is not None,
        analysts=_analysts(facts),
    )


def limits_of(of_laboratory: Mapping[str, str], of_recipe: Mapping[str, str]) -> Limits:
    """Return the limits that count: the recipe's before the laboratory's before the defaults."""
    texts = {**of_laboratory, **of_recipe}
    bases = dict.fromkeys(of_laboratory, "set by the laboratory")
    bases |= dict.fromkeys(of_recipe, "set by the recipe")
    kinds: dict[str, Any] = {one.name: type(one.default) for one in fields(Limits)}
    values: dict[str, Any] = {name: kinds[name](text) for name, text in texts.items()}
    return Limits(**values, bases=bases)


def _mode_of_use(valid_for: str) -> str | None:
    """Return the end-point mode that the recipe's words name first, or None."""
    first = valid_for.replace(",", " ").split()
    return first[0] if first and first[0] in {"visual", "potentiometric"} else None


def _missing_rows(facts: SheetFacts, already: tuple[Missing, ...]) -> tuple[Missing, ...]:
    """Return required rows of the sheet and of begun replicates that assembling does not ask."""
    written = standing(facts.entries)
    begun = {place[0] for place in written if place[1] not in {"excluded", "remark", METHOD_SLOT}}
    left_out = excluded(facts.entries)
    asked = {(one.replicate, one.slot) for one in already}
    rows = all_rows(facts.recipe.document, rig_of(facts.instruments), facts.entries)
    return tuple(
        Missing(
            row.replicate, row.slot, f"{_where(row.replicate)}: {row.label} is not written yet."
        )
        for row in rows
        if row.required
        and row.place not in written
        and (row.replicate, row.slot) not in asked
        and (row.replicate == 0 or (row.replicate in begun and row.replicate not in left_out))
    )


def _where(replicate: int) -> str:
    return f"Replicate {replicate}" if replicate else "Sheet"


def _blank(burette: InstrumentFact | None) -> dict[str, str] | None:
    """Return what is known of one blank: the difference of two readings of the burette.

    Each lies within half a step; the difference of two rectangular errors is triangular.
    """
    step = _step(burette)
    if step is None:
        return None
    source = "one blank, two readings of the burette"
    return {"half_width": f"{step:.10f}".rstrip("0"), "shape": "triangular", "source": source}


def _standard(lot: StandardLotFact | None) -> dict[str, Any] | None:
    if lot is None:
        return None
    keys = ("mass_fraction", "basis", "molar_mass", "density")
    stated = {key: lot.document[key] for key in keys if lot.document.get(key) is not None}
    return {"substance": lot.substance, **stated}


def _fragment(instrument: InstrumentFact | None) -> dict[str, Any] | None:
    if instrument is None:
        return None
    document = instrument.document
    parts = _RECORD_PARTS[instrument.kind]
    return {key: document[key] for key in parts if document.get(key) is not None}


def _without(document: dict[str, Any] | None, key: str) -> dict[str, Any] | None:
    return None if document is None else {k: v for k, v in document.items() if k != key}


def _text(entry: WrittenEntry) -> str:
    """Return an entry's text; a curve's points, the reason where a replicate is left out."""
    if entry.slot == CURVE_SLOT:
        return entry.raw or ""
    return f"{entry.text}: {entry.reason}" if entry.slot == "excluded" else entry.text


def _on_curve(recipe: RecipeDocument) -> dict[str, Any] | None:
    """Return how the recipe wants curves read, None where it takes none."""
    asked = recipe.end_point
    if not asked.takes_curve:
        return None
    found: dict[str, Any] = {"method": asked.method, "system": asked.system}
    if asked.flask_volume_mL is not None:
        found["flask_volume"] = {"value": asked.flask_volume_mL, "unit": "mL"}
    return {key: value for key, value in found.items() if value is not None}


def _roots(lot: StandardLotFact | None, used: Sequence[InstrumentFact]) -> dict[str, str]:
    names = {BALANCE: "balance", BURETTE: "burette", THERMOMETER: "thermometer", ROOM: "room"}
    roots = {
        names[one.kind]: f"calibration {one.calibration_id}" for one in used if one.kind in names
    }
    if lot is not None:
        roots["standard"] = f"standard lot {lot.id}"
    return roots


def _resolution(facts: SheetFacts) -> Resolution:
    rig = rig_of(facts.instruments)
    return Resolution(
        balance_g=_step(facts.instrument(BALANCE)),
        balance_decimals=rig.balance_decimals,
        burette_mL=_step(facts.instrument(BURETTE)),
        burette_decimals=rig.burette_decimals,
    )


def _step(instrument: InstrumentFact | None) -> float | None:
    resolution = instrument.identity.get("resolution") if instrument else None
    return float(resolution) if resolution else None


def _sample_mass(facts: SheetFacts) -> SampleMass:
    balance, lot = facts.instrument(BALANCE), facts.standard_lot
    of_lot = lot.document.get("minimum_sample_g") if lot else None
    of_balance = None
    if balance is not None:
        # what the serving calibration found goes before what was registered
        stated = balance.document.get("minimum_g")
        of_balance = stated or balance.identity.get("minimum_g")
    return SampleMass(
        lot_minimum_g=float(of_lot) if of_lot else None,
        balance_minimum_g=float(of_balance) if of_balance else None,
    )


def _in_date(one: InUse, zone: str) -> InDate:
    return InDate(
        what=one.name,
        due=last_day(one.due_at, zone).isoformat(),
        used=local_day(one.used_at, zone).isoformat(),
        in_date=one.state == "in date",
        override=one.override.reason if one.override else None,
    )


def _probe(instrument: InstrumentFact | None) -> Probe | None:
    if instrument is None:
        return None
    document = instrument.document
    return Probe(
        slope_percent=float(document["slope_percent"]),
        offset_mV=float(document["offset_mV"]),
        source=f"calibration of {instrument.name}, {instrument.certificate_number}",
    )


def _interim(facts: SheetFacts) -> Iterator[Interim]:
    """Yield the checks of the instruments of which checks are kept."""
    zone, as_of = facts.laboratory.zone, facts.log_as_of
    for used in things_in_use(facts):
        instrument = facts.instrument(used.kind)
        if instrument is None or not charts_of(instrument.log, used.kind, as_of=as_of):
            continue
        last = check_that_counts(instrument, at=used.used_at, zone=zone, as_of=as_of)
        yield Interim(
            name=CHECK_OF_KIND[used.kind],
            thing=instrument.name,
            used=local_day(used.used_at, zone).isoformat(),
            on=local_day(last.line.at, zone).isoformat() if last else None,
            verdict=last.outcome.verdict if last else None,
            says=last.outcome.says if last else "",
            basis=last.outcome.basis if last else "",
        )


def _last(certificate: CertificateFact | None) -> LastCertificate | None:
    if certificate is None:
        return None
    result = certificate.document["result"]
    return LastCertificate(
        number=certificate.number,
        value=float(result["concentration"]["value"]),
        u=float(result["concentration"]["u"]),
        components={one["id"]: float(one["relative"]) for one in result.get("components") or ()},
    )


def _analysts(facts: SheetFacts) -> tuple[str, ...]:
    """Return who read the end of each begun replicate's titration, in order."""
    names: dict[int, str] = {}
    for (replicate, slot, _), entry in sorted(standing(facts.entries).items()):
        if replicate and slot not in {"excluded", "remark", METHOD_SLOT} and ":" not in slot:
            last = slot in {"burette_end", CURVE_SLOT} or replicate not in names
            names[replicate] = entry.printed_name if last else names[replicate]
    return tuple(names[number] for number in sorted(names))

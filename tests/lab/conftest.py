"""A bench sheet as plain values, made without any database."""

from collections.abc import Callable
from dataclasses import replace
from datetime import UTC, datetime, timedelta
from itertools import count
from typing import Any

import pytest

from server.lab.ink import WrittenEntry
from server.lab.recipe import RecipeDocument, read_recipe
from server.lab.sheet_facts import (
    EvaluationFact,
    InstrumentFact,
    LaboratoryFact,
    LotFact,
    PersonFact,
    RecipeFact,
    SheetFacts,
    SignatureFact,
    StandardLotFact,
)

NOW = datetime(2026, 5, 4, 8, 30, tzinfo=UTC)
MAKER = PersonFact("p-maker", "Pavel Orrin", "PO")
WRITER = PersonFact("p-writer", "Ida Mohnke", "IM")
SECOND = PersonFact("p-second", "Lene Tiedt", "LT")
KEEPER = PersonFact("p-keeper", "Nils Obermark", "NO")
RECIPE: dict[str, Any] = {
    "title": "Sodium hydroxide 0.1 mol/L against potassium hydrogen phthalate",
    "titrant": {"substance": "NaOH", "nominal": "0.1", "medium": "water"},
    "standard": "KHP",
    "replicates": 3,
    "end_point": {"mode": "visual", "indicator": "phenolphthalein"},
    "buoyancy": False,
    "interval_days": 14,
    "notice_days": 3,
    "steps": [{"key": "mixed", "label": "Lot mixed thoroughly"}],
}


@pytest.fixture
def recipe() -> Callable[..., RecipeDocument]:
    """A maker of recipes: the usual one with some keys changed."""
    return lambda **changed: read_recipe(RECIPE | changed)


@pytest.fixture
def entry() -> Callable[..., WrittenEntry]:
    """A maker of entries: positions rise, a minute lies between two."""
    positions = count(1)

    def make(replicate: int, slot: str, text: str, **changed: Any) -> WrittenEntry:
        position = next(positions)
        usual = WrittenEntry(
            id=f"e-{position}", position=position, replicate=replicate, slot=slot, segment=1,
            text=text, unit=None, raw=None, strikes=None, reason=None, person_id=WRITER.id,
            printed_name=WRITER.printed_name, initials=WRITER.initials, posted_by=WRITER.id,
            device_id=None, device_sequence=None, device_at=None, device_zone=None,
            received_at=NOW + timedelta(minutes=position), late=False,
        )  # fmt: skip
        return replace(usual, **changed)

    return make


def an_instrument(kind: str, **changed: Any) -> InstrumentFact:
    """Return an instrument in date until the end of 2026."""
    stated: dict[str, tuple[dict[str, Any], dict[str, Any]]] = {
        "balance": ({"resolution": "0.0001", "capacity": "220"}, {}),
        "burette": ({"resolution": "0.01"}, {"capacity": {"value": "25", "unit": "mL"}}),
        "thermometer": ({"resolution": "0.1"}, {}),
    }
    identity, document = stated[kind]
    usual = InstrumentFact(
        kind=kind, instrument_id=f"i-{kind}", name=f"{kind} 1".capitalize(), identity=identity,
        calibration_id=f"c-{kind}", version=1, certificate_number="C-17", issuer="house",
        done_on="2026-01-12", due_at=datetime(2026, 12, 31, 23, tzinfo=UTC), due_basis="own plan",
        document=document, holds=(),
    )  # fmt: skip
    return replace(usual, **changed)


@pytest.fixture
def facts(recipe: Callable[..., RecipeDocument]) -> Callable[..., SheetFacts]:
    """A maker of sheets: an open one without entries, with some facts changed."""

    def make(**changed: Any) -> SheetFacts:
        usual = SheetFacts(
            id="s-1", number="S-2026-0001", revision=1,
            lot=LotFact(
                "l-1", "LOTCODE1", "NaOH lot", "NaOH", "0.1", "water", {}, MAKER, NOW, False
            ),
            recipe=RecipeFact("r-1", "NaOH against KHP", 1, recipe()),
            standard_lot=StandardLotFact(
                "k-1", "KHP lot 7", "KHP", "RM-7", "house", datetime(2028, 2, 1, tzinfo=UTC),
                "expiry", {"mass_fraction": {"value": "0.9999"}}, (),
            ),
            instruments=tuple(map(an_instrument, ("balance", "burette", "thermometer"))),
            overrides=(), begun_by=WRITER, begun_at=NOW, handed_in_at=None, sent_back_at=None,
            sent_back_remark=None, countersigned_at=None, abandoned_at=None, entries=(),
            signatures=(), evaluation=None,
            laboratory=LaboratoryFact("Laboratory", "1 Lane", "Europe/Berlin", {}, False),
            last_certificate=None,
        )  # fmt: skip
        return replace(usual, **changed)

    return make


def a_signature(person: PersonFact, meaning: str, **changed: Any) -> SignatureFact:
    """Return a signature on the usual sheet's evaluation, not yet bound to a digest."""
    usual = SignatureFact(
        id=f"g-{meaning}", person_id=person.id, printed_name=person.printed_name, meaning=meaning,
        at=NOW + timedelta(hours=2), zone="Europe/Berlin", evaluation_id="v-1", signed_digest="",
        reasons={}, remark=None,
    )  # fmt: skip
    return replace(usual, **changed)


def an_evaluation(**changed: Any) -> EvaluationFact:
    """Return an evaluation with one finding that fails."""
    result = {
        "concentration": {"reported": "0.10214 ± 0.00020 mol/L (k = 2.0)"},
        "findings": [
            {"name": "nominal", "verdict": "holds", "says": "near"},
            {"name": "replicates", "verdict": "fails", "says": "one"},
        ],
    }
    usual = EvaluationFact("v-1", "standardization 1", "in", "{}", "snap", result, NOW)
    return replace(usual, **changed)


@pytest.fixture
def sheet_parts() -> dict[str, Any]:
    """People and makers that tests of whole sheets need."""
    return {
        "now": NOW, "maker": MAKER, "writer": WRITER, "second": SECOND, "keeper": KEEPER,
        "signature": a_signature, "evaluation": an_evaluation, "instrument": an_instrument,
    }  # fmt: skip

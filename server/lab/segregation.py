"""Who may countersign: somebody else than whoever made, wrote, signed or let pass."""

from collections.abc import Iterable

from server.lab.sheet_facts import SheetFacts


def countersign_refusal(facts: SheetFacts, person_id: str) -> str | None:
    """Return in words why this person may not countersign this sheet, or None where she may.

    A laboratory of one person may allow its own signature; the certificate then says that nobody
    else has reviewed it.
    """
    if facts.laboratory.own_signature:
        return None
    return own_part(facts, person_id)


def own_part(facts: SheetFacts, person_id: str) -> str | None:
    """Return in words which part of the work is this person's own, or None."""
    if facts.lot.made_by.id == person_id:
        return "You made up this lot; somebody else countersigns."
    if person_id in _writers(facts):
        return "You wrote on this sheet; somebody else countersigns."
    if any(one.person_id == person_id and one.meaning == "measured" for one in facts.signatures):
        return "You handed in this sheet; somebody else countersigns."
    if any(one.by.id == person_id for one in facts.overrides):
        return "You let something out of date be used here; somebody else countersigns."
    return None


def release_refusal(held_by: str, person_id: str) -> str | None:
    """Return in words why this person may not release a hold, or None where she may."""
    return "You held it; somebody else releases." if held_by == person_id else None


def pull_refusal(proposed_by: str, person_id: str) -> str | None:
    """Return in words why this person may not confirm a pull, or None where she may."""
    return "You proposed the pull; somebody else confirms." if proposed_by == person_id else None


def _writers(facts: SheetFacts) -> set[str]:
    return set(_flat((one.person_id, one.posted_by) for one in facts.entries))


def _flat(pairs: Iterable[tuple[str, str]]) -> Iterable[str]:
    for pair in pairs:
        yield from pair

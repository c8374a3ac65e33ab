"""What a sheet or certificate rests on, with the state at the time of use; and its cautions."""

from collections.abc import Iterable, Mapping
from typing import Any

from server.chemistry.cautions import cautions_for
from server.lab.in_use import InUse, things_in_use
from server.lab.sheet_facts import STANDARD_LOT, SheetFacts
from server.sheets.bench import CautionView, RestsOn
from server.sheets.parts.calibration_views import error_table, stated_facts
from server.sheets.parts.telling import moment_words, quantity_words

_OF_STANDARD = {
    "mass_fraction": "Mass fraction", "molar_mass": "Molar mass", "density": "Density",
}  # fmt: skip


def rests_on(facts: SheetFacts) -> tuple[RestsOn, ...]:
    """Return the recipe, the standard lot and the instruments of a sheet."""
    recipe = facts.recipe
    written = RestsOn(
        kind="recipe",
        name=f"{recipe.name}, version {recipe.version}",
        says=recipe.document.title,
        state="",
        override=None,
        url=f"/stores/recipes/{recipe.id}",
    )
    return (written, *(_thing(facts, one) for one in things_in_use(facts)))


def certificate_roots(document: Mapping[str, Any]) -> tuple[RestsOn, ...]:
    """Return what an issued certificate says that it rests on."""
    return tuple(
        RestsOn(
            kind=one["kind"],
            name=one["name"],
            says=f"{one['says']} {_paper(one)}",
            state=one["state"],
            override=_override(one["override"]),
            url=_url(one["kind"], one["id"]),
        )
        for one in document["traceability"]
    )


def root_urls(things: Iterable[Mapping[str, Any]]) -> dict[str, str]:
    """Return the pages of the roots that budget lines name, by the root's own words."""
    urls = {}
    for one in things:
        lot = one["kind"] == STANDARD_LOT
        root = f"standard lot {one['id']}" if lot else f"calibration {one['calibration_id']}"
        urls[root] = _url(one["kind"], one["id"])
    return urls


def root_urls_of_sheet(facts: SheetFacts) -> dict[str, str]:
    """Return the pages of the roots of a sheet that is not certified yet."""
    things: list[dict[str, Any]] = [
        {"kind": one.kind, "id": one.instrument_id, "calibration_id": one.calibration_id}
        for one in facts.instruments
    ]
    if facts.standard_lot is not None:
        things.append({"kind": STANDARD_LOT, "id": facts.standard_lot.id})
    return root_urls(things)


def caution_views(substances: Iterable[str]) -> tuple[CautionView, ...]:
    """Return the cautions about substances by key."""
    return tuple(
        CautionView(one.substance, one.lines, one.source) for one in cautions_for(substances)
    )


def _thing(facts: SheetFacts, one: InUse) -> RestsOn:
    paper = facts.standard_lot if one.kind == STANDARD_LOT else facts.instrument(one.kind)
    about = {"certificate_number": "", "issuer": "", "version": None}
    if paper is not None:
        about = {
            "certificate_number": paper.certificate_number,
            "issuer": paper.issuer,
            "version": getattr(paper, "version", None),
        }
    override = None
    if one.override is not None:
        at = moment_words(one.override.at, facts.laboratory.zone)
        override = f"{one.override.reason} ({one.override.by.printed_name}, {at})"
    return RestsOn(
        kind=one.kind,
        name=one.name,
        says=f"{one.says} {_paper(about)}".strip(),
        state=one.state,
        override=override,
        url=_url(one.kind, one.thing_id),
        flag=one.flag,
        stated=_stated(one.kind, paper.document) if paper is not None else (),
    )


def _stated(kind: str, document: Mapping[str, Any]) -> tuple[tuple[str, str], ...]:
    """Return what a certificate or calibration states for use, its corrections row by row."""
    lines = [(one.label, one.value) for one in stated_facts(kind, document)]
    if kind == STANDARD_LOT:
        lines += [
            (label, quantity_words(document[key]))
            for key, label in _OF_STANDARD.items()
            if document.get(key)
        ]
    table = error_table(kind, document)
    if table is not None:
        lines.append((f"{table.heads[0]}: {table.heads[1]}", "; ".join(map(": ".join, table.rows))))
    return tuple(lines)


def _paper(about: Mapping[str, Any]) -> str:
    if not about["certificate_number"]:
        return ""
    version = f", version {about['version']}" if about.get("version") else ""
    return f"Certificate {about['certificate_number']}{version}, {about['issuer']}."


def _override(stated: Mapping[str, str] | None) -> str | None:
    return f"{stated['reason']} ({stated['by']})" if stated else None


def _url(kind: str, thing_id: str) -> str:
    room = "stores/standard-lots" if kind == STANDARD_LOT else "instruments"
    return f"/{room}/{thing_id}"

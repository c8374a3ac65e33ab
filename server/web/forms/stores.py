"""Forms of standard lots and recipes."""

import re
from collections.abc import Mapping
from typing import Any

from server.lab.refusal import Unacceptable
from server.lab.sheet_facts import RecipeFact
from server.procedures.stores import ReceiveStandardLot, WriteRecipe
from server.web.forms.fields import quantity
from server.web.forms.typed import Typed

_EACH = "each:"


def read_standard_lot(form: Typed) -> ReceiveStandardLot:
    """Return a standard lot as its certificate states it."""
    file = form.file("certificate_file")
    return ReceiveStandardLot(
        name=form.text("name"),
        substance=form.text("substance"),
        certificate_number=form.text("certificate_number"),
        issuer=form.text("issuer"),
        due_on=form.text("due_on"),
        due_basis=form.text("due_basis"),
        mass_fraction=quantity(form, "mass_fraction") or {},
        basis=form.text("basis", "as is"),
        drying=form.text("drying"),
        molar_mass=quantity(form, "molar_mass"),
        density=quantity(form, "density"),
        minimum_sample_g=form.decimal("minimum_sample_g"),
        storage=form.text("storage"),
        received_g=form.decimal("received_g"),
        received_on=form.text("received_on"),
        period_after_opening=form.text("period_after_opening"),
        retest_on=form.text("retest_on"),
        drying_demand=_drying_demand(form),
        file_name=file.name if file else "",
        content_base64=file.base64 if file else "",
    )


def _drying_demand(form: Typed) -> dict[str, Any] | None:
    """Return what a certificate asks for before weighing in figures, None where nothing is."""
    names = ("low_C", "high_C", "hours", "hours_most", "good_for_hours")
    read: dict[str, Any] = {
        name: value for name in names if (value := form.decimal(f"drying_demand_{name}"))
    }
    kind = form.text("drying_demand_kind")
    if kind == "never":
        return {"oven": False}
    if read and form.text("drying_demand_desiccator") == "yes":
        read["desiccator"] = True
    return read or None


def read_recipe_form(form: Typed) -> WriteRecipe:
    """Return a recipe, or its next version, as a keeper wrote it."""
    document: dict[str, Any] = {
        "title": form.text("name").strip(),
        "titrant": {
            "substance": form.text("titrant_substance").strip(),
            "nominal": form.decimal("titrant_nominal"),
            "medium": form.text("titrant_medium").strip() or "water",
        },
        "standard": form.text("standard").strip(),
        "weighing": form.text("weighing", "difference"),
        "replicates": form.text("replicates").strip(),
        "end_point": _end_point(form),
        "blank": form.text("blank", "none"),
        "temperature": form.text("temperature", "once"),
        "buoyancy": form.text("buoyancy", "yes") == "yes",
        "interval_days": form.text("interval_days").strip(),
        "notice_days": form.text("notice_days").strip(),
        "steps": _steps(form.text("steps")),
        "limits": _limits(form.text("limits")),
    }
    for name in ("ratio", "valid_for"):
        if form.text(name).strip():
            document[name] = form.text(name).strip()
    if form.text("repeatability_relative_u").strip():
        document["repeatability"] = _repeatability(form)
    expansion = quantity(form, "liquid_expansion")
    if expansion is not None:
        document["liquid_expansion"] = expansion
    version = form.whole("version", example="1") if form.text("version") else 0
    return WriteRecipe(name=form.text("name"), document=document, version=version)


def fill_recipe_form(recipe: RecipeFact) -> dict[str, str]:
    """Return what the recipe form holds when the next version of a recipe is written."""
    document = recipe.document
    filled = {
        "name": recipe.name,
        "version": str(recipe.version),
        "titrant_substance": document.titrant.substance,
        "titrant_nominal": document.titrant.nominal,
        "titrant_medium": document.titrant.medium,
        "standard": document.standard,
        "ratio": document.ratio or "",
        "weighing": document.weighing,
        "replicates": str(document.replicates),
        "end_point_mode": document.end_point.mode,
        "end_point_indicator": document.end_point.indicator or "",
        "end_point_method": document.end_point.method or "",
        "end_point_system": document.end_point.system or "",
        "end_point_flask_volume_mL": document.end_point.flask_volume_mL or "",
        "valid_for": document.valid_for,
        "interval_days": str(document.interval_days),
        "notice_days": str(document.notice_days),
        "blank": document.blank or "none",
        "temperature": document.temperature,
        "buoyancy": "yes" if document.buoyancy else "no",
        "steps": "\n".join(
            f"{_EACH} {step.label}" if step.when == "replicate" else step.label
            for step in document.steps
        ),
        "limits": "\n".join(f"{name} {value}" for name, value in document.limits.items()),
    }
    return filled | _quantity_filled(document.liquid_expansion) | _stated(document.repeatability)


def _end_point(form: Typed) -> dict[str, str]:
    read = {"mode": form.text("end_point_mode", "visual")}
    if read["mode"] == "visual" and form.text("end_point_indicator").strip():
        read["indicator"] = form.text("end_point_indicator").strip()
    for name in ("method", "system", "flask_volume_mL"):
        value = form.decimal(f"end_point_{name}")
        if value:
            read[name] = value
    return read


def _repeatability(form: Typed) -> dict[str, str]:
    read = {
        "relative_u": form.decimal("repeatability_relative_u"),
        "applies_to": form.text("repeatability_applies_to") or "one",
    }
    for name in ("dof", "source"):
        value = form.decimal(f"repeatability_{name}")
        if value:
            read[name] = value
    return read


def _steps(text: str) -> list[dict[str, str]]:
    """Return steps, one a line; each gets a key of its own from its words."""
    steps: list[dict[str, str]] = []
    for line in filter(None, (line.strip() for line in text.splitlines())):
        each = line.lower().startswith(_EACH)
        label = line[len(_EACH) :].strip() if each else line
        word = re.sub(r"[^a-z0-9]+", "-", label.lower()).strip("-")[:30].strip("-")
        if not word[:1].isalpha():
            word = f"step-{word}".strip("-")
        key, n = word, 1
        while key in {step["key"] for step in steps}:
            n += 1
            key = f"{word}-{n}"
        steps.append({"key": key, "label": label, "when": "replicate" if each else "before"})
    return steps


def _limits(text: str) -> dict[str, str]:
    limits = {}
    for line in filter(None, (line.strip() for line in text.splitlines())):
        words = line.split()
        if len(words) != 2:
            says = f"“{line[:60]}” is not a name and a value."
            raise Unacceptable(says, field="limits", example="spread_percent 0.20")
        limits[words[0]] = words[1].replace(",", ".")
    return limits


def _quantity_filled(stated: Mapping[str, Any] | None) -> dict[str, str]:
    if stated is None:
        return {}
    statement = next((one for one in ("U", "u", "half_width") if one in stated), "U")
    keys = {"value": "value", "bound": statement, "k": "k", "shape": "shape", "source": "source"}
    filled = {name: str(stated[key]) for name, key in keys.items() if key in stated}
    return {f"liquid_expansion_{name}": value for name, value in filled.items()} | {
        "liquid_expansion_statement": statement
    }


def _stated(repeatability: Mapping[str, Any] | None) -> dict[str, str]:
    return {f"repeatability_{name}": str(value) for name, value in (repeatability or {}).items()}

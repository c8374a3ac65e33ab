"""A recipe: how the laboratory standardizes one titrant."""

import re
from collections.abc import Mapping
from dataclasses import dataclass
from fractions import Fraction
from typing import Any

from server.lab import reading_documents as reading
from server.lab.curve_entry import CURVE_METHODS, CURVE_SYSTEMS
from server.lab.limits import check_limits
from server.lab.refusal import Unacceptable
from server.metrology.decimal_text import DecimalProblem, read_wire_decimal

ROUTES = ("weighed", "aliquot", "against-titrant")
_KEYS = (
    "title", "titrant", "route", "standard", "ratio", "weighing", "replicates", "end_point",
    "valid_for", "blank", "excess", "buoyancy", "temperature", "liquid_expansion",
    "repeatability", "interval_days", "notice_days", "steps", "limits",
)  # fmt: skip
_STANDARDS = {"khp-naoh": "KHP", "tris-hcl": "TRIS", "carbonate-hcl": "Na2CO3"}
_RATIO = re.compile(r"[0-9]{1,9}([./][0-9]{1,9})?")
_STEP_KEY = re.compile(r"[a-z][a-z0-9_-]{0,39}")


@dataclass(frozen=True, slots=True)
class RecipeTitrant:
    """What is standardized: substance key, nominal concentration in mol/L as text, medium."""

    substance: str
    nominal: str
    medium: str


@dataclass(frozen=True, slots=True)
class EndPoint:
    """How the end point is told: ``mode`` visual or potentiometric, and the indicator.

    With a ``method`` the recipe takes a curve, and the volume is what this method finds on it;
    ``system`` is the reaction for the model fit (None: told by titrant and standard), and
    ``flask_volume_mL`` the volume in the flask before the first drop, as text.
    """

    mode: str
    indicator: str | None
    method: str | None = None
    system: str | None = None
    flask_volume_mL: str | None = None

    @property
    def takes_curve(self) -> bool:
        """Whether each replicate is a probe's curve in place of burette readings."""
        return self.method is not None


@dataclass(frozen=True, slots=True)
class RecipeStep:
    """A step to be ticked or described. ``when``: before (once) or replicate (each time)."""

    key: str
    label: str
    when: str


@dataclass(frozen=True, slots=True)
class RecipeDocument:
    """A recipe as read; ``limits`` maps the name of a limit to its value as text."""

    title: str
    titrant: RecipeTitrant
    route: str
    standard: str
    ratio: str | None
    weighing: str
    replicates: int
    end_point: EndPoint
    valid_for: str
    blank: str | None
    excess: dict[str, Any] | None
    buoyancy: bool
    temperature: str
    liquid_expansion: dict[str, Any] | None
    repeatability: dict[str, Any] | None
    interval_days: int
    notice_days: int
    steps: tuple[RecipeStep, ...]
    limits: dict[str, str]


def read_recipe(document: Any) -> RecipeDocument:
    """Return the recipe that a JSON document states.

    Raises:
        Unacceptable: an unknown key or a value that cannot be taken, named by its path.
    """
    doc = reading.known_keys(document, "", _KEYS)
    titrant, end_point = _titrant(doc), _end_point(doc)
    blank = reading.choice_at(
        doc, "blank", "", choices=("none", "reagent", "indicator"), default="none"
    ) if doc.get("blank") is not None else "none"  # fmt: skip
    if end_point.takes_curve:
        _check_curve(doc, end_point, blank)
    expansion = reading.quantity_at(doc, "liquid_expansion", "", unit="1/K")
    if titrant.medium != "water" and expansion is None:
        says = f"liquid_expansion must be stated: the titrant's medium is {titrant.medium}."
        raise Unacceptable(says, field="liquid_expansion", example='{"value": "2.1e-4"}')
    interval = reading.count_at(doc, "interval_days", "", low=1, high=3660, default=30)
    return RecipeDocument(
        title=reading.text_at(doc, "title", "", example="Sodium hydroxide against KHP", most=120),
        titrant=titrant,
        route=reading.choice_at(doc, "route", "", choices=ROUTES, default="weighed"),
        standard=reading.text_at(doc, "standard", "", example="KHP", most=40),
        ratio=_ratio(doc),
        weighing=reading.choice_at(
            doc, "weighing", "", choices=("difference", "tared"), default="difference"
        ),
        replicates=reading.count_at(doc, "replicates", "", low=1, high=20, default=6),
        end_point=end_point,
        valid_for=reading.text_at(
            doc, "valid_for", "", example="visual, phenolphthalein", default=_words(end_point)
        ),
        blank=None if blank == "none" else blank,
        excess=reading.quantity_at(doc, "excess", "", unit="mL"),
        buoyancy=reading.truth_at(doc, "buoyancy", "", default=True),
        temperature=reading.choice_at(
            doc, "temperature", "", choices=("once", "each"), default="once"
        ),
        liquid_expansion=expansion,
        repeatability=_repeatability(doc),
        interval_days=interval,
        notice_days=reading.count_at(
            doc, "notice_days", "", low=0, high=interval, default=min(3, interval)
        ),
        steps=_steps(doc),
        limits=_limits(doc),
    )


def _titrant(doc: Mapping[str, Any]) -> RecipeTitrant:
    titrant = reading.known_keys(doc.get("titrant"), "titrant", ("substance", "nominal", "medium"))
    nominal = _positive(titrant.get("nominal"), "titrant.nominal", example="0.1")
    return RecipeTitrant(
        substance=reading.text_at(titrant, "substance", "titrant", example="NaOH", most=40),
        nominal=nominal,
        medium=reading.text_at(titrant, "medium", "titrant", example="water", default="water"),
    )


def _end_point(doc: Mapping[str, Any]) -> EndPoint:
    keys = ("mode", "indicator", "method", "system", "flask_volume_mL")
    end_point = reading.known_keys(doc.get("end_point"), "end_point", keys)
    mode = reading.choice_at(end_point, "mode", "end_point", choices=("visual", "potentiometric"))
    if mode == "potentiometric":
        return _on_curve(end_point)
    for key in ("method", "system", "flask_volume_mL"):
        if end_point.get(key):
            says = f"end_point.{key} belongs to a potentiometric end point, not to a visual one."
            raise Unacceptable(says, field=f"end_point.{key}")
    indicator = reading.text_at(
        end_point, "indicator", "end_point", example="phenolphthalein", most=60
    )
    return EndPoint(mode=mode, indicator=indicator)


def _on_curve(end_point: Mapping[str, Any]) -> EndPoint:
    def one_of(key: str, choices: tuple[str, ...]) -> str | None:
        if not end_point.get(key):
            return None
        return reading.choice_at(end_point, key, "end_point", choices=choices)

    method = one_of("method", CURVE_METHODS)
    system = one_of("system", CURVE_SYSTEMS)
    flask = None
    if end_point.get("flask_volume_mL"):
        flask = _positive(end_point["flask_volume_mL"], "end_point.flask_volume_mL", example="50")
    for key, value in (("system", system), ("flask_volume_mL", flask)):
        if method is None and value is not None:
            says = f"end_point.{key} is for a curve: name the method that is taken on it."
            raise Unacceptable(says, field="end_point.method", example=CURVE_METHODS[-1])
    return EndPoint("potentiometric", None, method, system, flask)


def _check_curve(doc: Mapping[str, Any], end_point: EndPoint, blank: str) -> None:
    """Refuse before the work what no curve could be evaluated with."""
    standard = doc.get("standard")
    meant = _STANDARDS.get(end_point.system or "")
    if meant is not None and standard != meant:
        says = f"end_point.system {end_point.system} is a titration of {meant}, not of {standard}."
        raise Unacceptable(says, field="end_point.system", example="none")
    unknown = end_point.system == "none" or (
        end_point.system is None and standard not in _STANDARDS.values()
    )
    if end_point.method == "model fit" and unknown:
        says = "The model fit needs a reaction that it knows: KHP, TRIS or Na2CO3 as the standard."
        raise Unacceptable(says, field="end_point.method", example="first derivative")
    if blank == "indicator" or doc.get("excess") is not None:
        field = "blank" if blank == "indicator" else "excess"
        says = f"{field}: on a curve there is no colour to overshoot; it has none of this kind."
        raise Unacceptable(says, field=field)


def _words(end_point: EndPoint) -> str:
    told = end_point.indicator or end_point.method
    return f"{end_point.mode}, {told}" if told else end_point.mode


def _ratio(doc: Mapping[str, Any]) -> str | None:
    ratio = doc.get("ratio")
    if ratio is None or ratio == "":
        return None
    shaped = isinstance(ratio, str) and _RATIO.fullmatch(ratio)
    try:
        good = bool(shaped) and Fraction(ratio) > 0
    except ZeroDivisionError:
        good = False
    if not good:
        says = "ratio must be a positive number or fraction: amount of titrant per standard."
        raise Unacceptable(says, field="ratio", example="2/5")
    return str(ratio)


def _repeatability(doc: Mapping[str, Any]) -> dict[str, Any] | None:
    stated = doc.get("repeatability")
    if stated is None:
        return None
    keys = ("relative_u", "dof", "applies_to", "source")
    stated = reading.known_keys(stated, "repeatability", keys)
    where = "repeatability.relative_u"
    answer: dict[str, Any] = {
        "relative_u": _positive(stated.get("relative_u"), where, example="0.0005"),
        "applies_to": reading.choice_at(
            stated, "applies_to", "repeatability", choices=("one", "mean"), default="one"
        ),
    }
    if stated.get("dof") not in (None, ""):
        answer["dof"] = _positive(stated["dof"], "repeatability.dof", example="24")
    if stated.get("source"):
        answer["source"] = reading.text_at(
            stated, "source", "repeatability", example="validation of the method"
        )
    return answer


def _steps(doc: Mapping[str, Any]) -> tuple[RecipeStep, ...]:
    steps = doc.get("steps") or []
    if not isinstance(steps, list | tuple):
        raise Unacceptable("steps must be a list.", field="steps")
    read = tuple(_step(step, f"steps[{i}]") for i, step in enumerate(steps))
    keys = [step.key for step in read]
    for i, key in enumerate(keys):
        if key in keys[:i]:
            raise Unacceptable(f"steps[{i}].key “{key}” is there twice.", field=f"steps[{i}].key")
    return read


def _step(step: Any, path: str) -> RecipeStep:
    step = reading.known_keys(step, path, ("key", "label", "when"))
    key = reading.text_at(step, "key", path, example="dried")
    if not _STEP_KEY.fullmatch(key):
        says = f"{path}.key must be a small word of letters and digits."
        raise Unacceptable(says, field=f"{path}.key", example="dried")
    return RecipeStep(
        key=key,
        label=reading.text_at(step, "label", path, example="Dried 2 h at 110 °C"),
        when=reading.choice_at(
            step, "when", path, choices=("before", "replicate"), default="before"
        ),
    )


def _limits(doc: Mapping[str, Any]) -> dict[str, str]:
    limits = doc.get("limits") or {}
    if not isinstance(limits, Mapping):
        raise Unacceptable("limits must be an object.", field="limits")
    read = {
        str(name): _positive(value, f"limits.{name}", example="0.2")
        for name, value in sorted(limits.items())
    }
    check_limits(read, "limits")
    return read


def _positive(value: Any, path: str, *, example: str) -> str:
    if not isinstance(value, str):
        raise Unacceptable(f"{path} must be a number as text.", field=path, example=example)
    try:
        number = read_wire_decimal(value, path)
    except DecimalProblem as problem:
        raise Unacceptable(problem.says, field=path, example=example) from problem
    if number <= 0:
        raise Unacceptable(f"{path} must be more than zero.", field=path, example=example)
    return value

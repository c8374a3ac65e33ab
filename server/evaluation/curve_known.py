"""What a bench record knows of a curve beside its points: system, flask, amount, temperature."""

from server.chemistry.equilibria import HIGHEST_C, LOWEST_C
from server.curves.circumstances import Circumstances, system_named
from server.curves.outcome import METHODS, Method
from server.curves.points import CurveProblem
from server.evaluation.bench_record import BenchRecord
from server.evaluation.constants import Constants
from server.evaluation.methods.standardization_v1 import model_of
from server.evaluation.replicate_reading import Replicate

_STRONG_ACIDS = frozenset({"HCl", "HBr", "HNO3", "HClO4"})
"""Acids of one proton that water takes whole: what the model of an acid in the burette means."""
_STRONG_BASES = frozenset({"NaOH", "KOH"})
USUAL_FLASK_ML = 50.0
"""What a model fit takes to be in the flask where it was asked for and nobody says; half to twice
of it enters the uncertainty."""


def known_of(record: BenchRecord, constants: Constants, one: Replicate) -> Circumstances:
    """Return what is known of a replicate's titration beside its points.

    Raises:
        CurveProblem: a temperature at which the system's constants do not hold.
    """
    model = model_of(record, constants)
    portion = model.portion(one)
    return circumstances_known(
        system_of(record),
        flask_volume_mL=USUAL_FLASK_ML if flask_assumed(record, one) else _flask_stated(record),
        amount_mmol=model.standard_mmol(portion),
        temperature_C=portion.temperature_C,
    )


def flask_assumed(record: BenchRecord, one: Replicate) -> bool:
    """Tell whether a model fit is asked for and the volume in the flask is not stated."""
    wanted = asked_method(record, one) == "model fit" and system_of(record) != "none"
    return wanted and _flask_stated(record) is None


def _flask_stated(record: BenchRecord) -> float | None:
    return record.end_point.flask_volume_mL if record.end_point else None


def asked_method(record: BenchRecord, one: Replicate) -> Method | None:
    """Return the method that was asked for, the replicate's before the record's; None: nobody."""
    of_replicate = one.curve.method if one.curve else None
    of_record = record.end_point.method if record.end_point else None
    asked = of_replicate or of_record
    return next((method for method in METHODS if method == asked), None)


def circumstances_known(
    system: str,
    *,
    flask_volume_mL: float | None,
    amount_mmol: float | None,
    temperature_C: float,
) -> Circumstances:
    """Return circumstances of a curve from figures: volumes mL, amounts mmol, temperature °C.

    Without a system the temperature only scales mV, so that it may lie where no constants hold.

    Raises:
        CurveProblem: a system that is not known, or a temperature at which it does not hold.
    """
    named = system_named(system)
    if named is not None and not LOWEST_C <= temperature_C <= HIGHEST_C:
        says = (
            f"At {temperature_C:g} Cel the constants of {named.says} are not known; they hold "
            f"from {LOWEST_C:g} to {HIGHEST_C:g} Cel. With the system “none” the model is left out."
        )
        raise CurveProblem(says)
    if named is None:
        temperature_C = min(max(temperature_C, LOWEST_C), HIGHEST_C)
    return Circumstances(
        system=named,
        flask_volume_mL=flask_volume_mL,
        amount_mmol=amount_mmol,
        temperature_C=temperature_C,
    )


def system_of(record: BenchRecord) -> str:
    """Return the acid-base system of a record: the stated one, else by titrant and standard."""
    stated = record.end_point.system if record.end_point else None
    if stated is not None:
        return stated
    if record.route in {"back", "mass-titre"}:
        return "none"  # what is left of an excess follows no one acid's or base's curve
    standard = record.standard.substance if record.standard else None
    return system_between(record.titrant.substance, standard, medium=record.titrant.medium)


def system_between(titrant: str, standard: str | None, *, medium: str) -> str:
    """Return the system of a titrant with a standard in water, ``none`` where none is known."""
    if medium != "water":
        return "none"
    if standard == "KHP" and titrant in _STRONG_BASES:
        return "khp-naoh"
    if standard == "TRIS" and titrant in _STRONG_ACIDS:
        return "tris-hcl"
    if standard == "Na2CO3" and titrant in _STRONG_ACIDS:
        return "carbonate-hcl"
    return "none"

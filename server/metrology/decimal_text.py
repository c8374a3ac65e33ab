"""Decimal numbers as text: read without losing a digit, refused in words."""

import re
from decimal import Decimal

_WIRE = re.compile(r"[+-]?\d+(\.\d+)?([eE][+-]?\d{1,3})?", re.ASCII)
_TYPED = re.compile(r"[+\-−]?\d+([.,]\d+)?", re.ASCII)
_MOST_CHARACTERS = 40


class DecimalProblem(ValueError):
    """A text that is no decimal number: what is wrong (``says``), and an ``example``."""

    def __init__(self, says: str, example: str | None = None) -> None:
        super().__init__(says)
        self.says = says
        self.example = example


def read_wire_decimal(text: str, name: str) -> Decimal:
    """Return a decimal number as records carry it: decimal point, exponent allowed.

    ``name`` is the field that a refusal names.

    Raises:
        DecimalProblem: it is no such number, or too long or too large to be a reading.
    """
    if not _WIRE.fullmatch(text):
        hint = " Use a decimal point, not a comma." if "," in text else ""
        says = f"{name}: {_shown(text)} is not a decimal number.{hint}"
        raise DecimalProblem(says, "18.64")
    return _sized(text, name)


def read_typed_decimal(text: str, name: str) -> Decimal:
    """Return a number as a person types it: decimal point or comma, no exponent.

    Raises:
        DecimalProblem: it is no such number; the sentence names the field.
    """
    given = text.strip()
    if not _TYPED.fullmatch(given):
        says = f"{name}: {_shown(text)} is not a number: digits with one decimal point or comma."
        raise DecimalProblem(says, "18.64")
    return _sized(given.replace("−", "-").replace(",", "."), name)


def decimals_of(text: str) -> int:
    """Return how many decimals were typed: 2 for ``18.60``, 0 for ``18``."""
    _, _, decimals = text.strip().lower().partition("e")[0].replace(",", ".").partition(".")
    return len(decimals)


def _sized(text: str, name: str) -> Decimal:
    number = Decimal(text) if len(text) <= _MOST_CHARACTERS else None
    if number is None or abs(number) > Decimal("1e30"):
        raise DecimalProblem(f"{name}: {_shown(text)} is too long or too large.", "18.64")
    return number


def _shown(text: str) -> str:
    return f"“{text[:_MOST_CHARACTERS]}”"

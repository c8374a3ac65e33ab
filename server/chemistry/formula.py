"""Chemical formulas: atoms and molar mass with its uncertainty."""

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass

from server.chemistry.atomic_weights import ATOMIC_WEIGHTS, SET_NAME

_TOKEN = re.compile(r"([A-Z][a-z]?)(\d*)|(\()|(\))(\d*)")
_PART = re.compile(r"(\d*)(.+)", re.DOTALL)
_MOST_CHARACTERS = 100
_MOST_ATOMS = 10_000


class FormulaProblem(ValueError):
    """A formula that cannot be read, or an element that the table lacks."""


@dataclass(frozen=True, slots=True)
class MolarMass:
    """A molar mass in g/mol with its standard uncertainty and the set of atomic weights."""

    value: float
    u: float
    set: str


def atoms_of(formula: str) -> dict[str, int]:
    """Return the number of atoms by element; hydrates are written ``C2H2O4.2H2O``.

    Raises:
        FormulaProblem: the formula cannot be read.
    """
    if not formula or len(formula) > _MOST_CHARACTERS:
        raise FormulaProblem(f"“{formula[:_MOST_CHARACTERS]}” is no formula")
    total: dict[str, int] = {}
    for part in formula.replace("·", ".").replace("*", ".").split("."):
        match = _PART.fullmatch(part)
        if match is None:
            raise FormulaProblem(f"“{formula}” is no formula: a part of it is empty")
        times = int(match[1] or 1)
        for element, count in _atoms_of_part(match[2], formula).items():
            total[element] = total.get(element, 0) + times * count
    if not 0 < sum(total.values()) <= _MOST_ATOMS:
        raise FormulaProblem(f"“{formula}” has no atoms, or too many")
    return total


def molar_mass(formula: str) -> MolarMass:
    """Return M = Σ n·A_r in g/mol with u(M)² = Σ (n·u(A_r))² (QUAM, A2).

    Raises:
        FormulaProblem: the formula cannot be read, or an element is not in the table.
    """
    atoms = atoms_of(formula)
    for element in atoms:
        if element not in ATOMIC_WEIGHTS:
            raise FormulaProblem(f"the atomic weight of {element} is not in the table")
    value = math.fsum(n * ATOMIC_WEIGHTS[element].value for element, n in atoms.items())
    u = math.sqrt(math.fsum((n * ATOMIC_WEIGHTS[el].u) ** 2 for el, n in atoms.items()))
    return MolarMass(value, u, SET_NAME)


def _atoms_of_part(text: str, formula: str) -> dict[str, int]:
    stack: list[dict[str, int]] = [{}]
    at = 0
    while at < len(text):
        match = _TOKEN.match(text, at)
        if match is None:
            raise FormulaProblem(f"“{formula}” is no formula: it cannot be read from “{text[at:]}”")
        at = match.end()
        if match[1]:
            _add(stack[-1], {match[1]: 1}, int(match[2] or 1))
        elif match[3]:
            stack.append({})
        elif len(stack) > 1:
            _add(stack[-2], stack.pop(), int(match[5] or 1))
        else:
            raise FormulaProblem(f"“{formula}” is no formula: a bracket closes that never opened")
    if len(stack) > 1:
        raise FormulaProblem(f"“{formula}” is no formula: a bracket is not closed")
    return stack[0]


def _add(total: dict[str, int], more: Mapping[str, int], times: int) -> None:
    for element, count in more.items():
        total[element] = total.get(element, 0) + times * count

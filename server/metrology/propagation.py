"""Law of propagation of uncertainty, first order (JCGM 100, 5.1 and 5.2; G.4 for ν_eff)."""

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

#: A step so small that its square vanishes beside 1: the derivative is then exact to the last bit.
_STEP = 1e-30


@dataclass(frozen=True, slots=True)
class Input:
    """An input quantity: estimate, standard uncertainty, degrees of freedom (None: ∞), shape.

    Inputs of one ``id`` are one and the same error (correlation +1); ``shared`` tells whether all
    replicates have it in common.
    """

    name: str
    value: float
    u: float
    dof: float | None = None
    shape: str = "normal"
    half_width: float | None = None
    id: str | None = None
    unit: str | None = None
    shared: bool = True


@dataclass(frozen=True, slots=True)
class Propagated:
    """The output: value, u, ν_eff (None: ∞), and c_i·u_i (signed) and c_i by input name."""

    value: float
    u: float
    dof: float | None
    contributions: Mapping[str, float]
    sensitivities: Mapping[str, float]


def propagate(function: Callable[[Mapping[str, Any]], Any], inputs: Sequence[Input]) -> Propagated:
    """Return the output of a model with its standard uncertainty, to first order.

    ``function`` takes the inputs by name and must be made of arithmetic and numpy's functions: its
    derivatives are taken with a complex step, f'(x) = Im f(x + ih)/h, which loses no digit to
    subtraction. Contributions of one root are summed with their signs before squaring
    (JCGM 100, 5.2.2, r = 1).
    """
    estimates = {one.name: one.value for one in inputs}
    value = float(function(estimates))
    sensitivities = {one.name: _derivative(function, estimates, one) for one in inputs}
    contributions = {one.name: sensitivities[one.name] * one.u for one in inputs}
    roots = sum_by_root(inputs, contributions)
    u = math.sqrt(sum(part**2 for part, _ in roots))
    return Propagated(value, u, welch_satterthwaite(u, roots), contributions, sensitivities)


def sum_by_root(
    inputs: Sequence[Input], contributions: Mapping[str, float]
) -> list[tuple[float, float | None]]:
    """Return each root's summed contribution with its degrees of freedom.

    Inputs without a root stand alone; where inputs of one root state different degrees of freedom,
    the smallest counts.
    """
    sums: dict[str, float] = {}
    dofs: dict[str, float | None] = {}
    for i, one in enumerate(inputs):
        key = f"root {one.id}" if one.id is not None else f"input {i}"
        sums[key] = sums.get(key, 0.0) + contributions[one.name]
        stated = [dof for dof in (dofs.get(key), one.dof) if dof is not None]
        dofs[key] = min(stated) if stated else None
    return [(part, dofs[key]) for key, part in sums.items()]


def welch_satterthwaite(
    u: float, contributions: Sequence[tuple[float, float | None]]
) -> float | None:
    """Return ν_eff = u⁴ / Σ (u_i⁴/ν_i), not truncated; None where it is infinite (G.2b)."""
    denominator = sum(part**4 / dof for part, dof in contributions if dof is not None)
    if u == 0 or denominator == 0:
        return None
    return u**4 / denominator


def _derivative(
    function: Callable[[Mapping[str, Any]], Any], estimates: Mapping[str, float], one: Input
) -> float:
    moved = function({**estimates, one.name: complex(one.value, _STEP)})
    return float(moved.imag) / _STEP

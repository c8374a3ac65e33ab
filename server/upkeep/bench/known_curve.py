"""Curves of a known end point, and the usual way to fit them: the pH at each volume by a root.

The charge balance is written here a second time, straight from the equilibria, so that neither
the curves nor the yardstick are made of what is measured. Hydrogen phthalate with sodium
hydroxide at 25 °C: pKw 13.995, pK of phthalic acid 2.950 and 5.408, of carbonic acid 6.352 and
10.329 (the usual tables), activity coefficients by Davies' equation.
"""

from collections.abc import Callable
from dataclasses import dataclass
from math import pow as power
from typing import Any

import numpy as np
from numpy.typing import NDArray

Floats = NDArray[np.float64]

FLASK_ML, AMOUNT_MMOL, MOL_PER_L = 50.0, 2.0, 0.1
_PKW, _A = 13.995, 0.5108
_PHTHALIC, _CARBONIC = (2.950, 5.408), (6.352, 10.329)
_LOW_pH, _HIGH_pH = 0.5, 13.5
_HALVINGS, _ROUNDS = 46, 5


@dataclass(frozen=True, slots=True)
class KnownCurve:
    """A titration that never happened. ``carbonate`` is its amount per alkalinity of the titrant.

    Flask in mL, amount in mmol, titrant in mol/L; ``activities`` False is the ideal solution.
    """

    carbonate: float = 0.0
    activities: bool = True
    mol_per_L: float = MOL_PER_L
    pK2: float = _PHTHALIC[1]

    @property
    def effective_mL(self) -> float:
        """The volume at which the alkalinity, carbonate counted once, meets the acid."""
        return AMOUNT_MMOL / (self.mol_per_L * (1 - self.carbonate))

    def gamma(self, ionic: Any) -> Any:
        """Return the activity coefficient of an ion of one charge at an ionic strength."""
        if not self.activities:
            return ionic**0
        root = ionic**0.5
        return 10 ** (-_A * (root / (1 + root) - 0.3 * ionic))

    def charges(self, pH: Any, V: Any, gamma: Any) -> tuple[Any, Any]:
        """Return the charge that is too much in the flask (mmol), and twice its ionic strength.

        Both for numbers and for arrays; ``gamma`` is that of one charge.
        """
        a = 10.0**-pH
        p1 = 10.0 ** -_PHTHALIC[0] / gamma / a
        p2 = p1 * 10.0**-self.pK2 / gamma**3 / a
        q1 = 10.0 ** -_CARBONIC[0] / gamma / a
        q2 = q1 * 10.0 ** -_CARBONIC[1] / gamma**3 / a
        phthalate = AMOUNT_MMOL / (1 + p1 + p2)
        carbonate = self.mol_per_L * self.carbonate * V / (1 + q1 + q2)
        total = FLASK_ML + V
        h, oh = a / gamma, 10.0**-_PKW / a / gamma
        sodium, potassium = self.mol_per_L * V, AMOUNT_MMOL
        single, double = phthalate * p1 + carbonate * q1, phthalate * p2 + carbonate * q2
        excess = sodium + potassium + total * (h - oh) - single - 2 * double
        strength = (sodium + potassium + single + 4 * double) / total + h + oh
        return excess, strength

    def pH(self, V: Floats) -> Floats:
        """Return the pH at each volume, by halving, the ionic strength followed."""
        ionic = np.full(V.shape, 0.03)
        middle = np.full(V.shape, 7.0)
        for _ in range(_ROUNDS if self.activities else 1):
            gamma = self.gamma(ionic)
            low, high = np.full(V.shape, _LOW_pH), np.full(V.shape, _HIGH_pH)
            for _ in range(_HALVINGS):
                middle = (low + high) / 2
                acid = self.charges(middle, V, gamma)[0] > 0
                low, high = np.where(acid, middle, low), np.where(acid, high, middle)
            ionic = self.charges(middle, V, gamma)[1] / 2
        return middle


def volumes_by_hand(shift: float) -> Floats:
    """Return about 60 volumes as somebody at a burette takes them: closer near the end point."""
    end = AMOUNT_MMOL / MOL_PER_L
    near = np.arange(end - 0.4, end + 0.6, 0.05) + 0.05 * shift
    close = np.arange(end - 1.6, near[0] - 0.05, 0.2)
    early = np.arange(0.0, close[0] - 0.2, 1.0)
    after = np.concatenate([near[-1] + np.arange(0.2, 1.8, 0.2), near[-1] + np.arange(2.4, 6, 1.0)])
    return np.round(np.concatenate([early, close, near, after]), 4)


def volumes_by_drops(points: int, shift: float) -> Floats:
    """Return so many volumes, evenly spaced, to a fifth past the end point."""
    end = AMOUNT_MMOL / MOL_PER_L
    return np.linspace(0, 1.2 * end, points) + shift * end / points * (np.arange(points) > 0)


def fit_by_roots(V: Floats, y: Floats, *, start_mL: float, activities: bool, lmfit: Any) -> float:
    """Fit concentration, pK, offset, slope and carbonate with lmfit; return the effective volume.

    The pH at each volume is found by ``brentq`` of the charge balance in plain numbers, the ionic
    strength taken from the ions that do not react: the usual way, and a fast one of it.
    """
    from scipy.optimize import brentq  # noqa: PLC0415 - scipy waits until it is needed

    def residuals(values: Any) -> Floats:
        c, pK, offset, slope, f = (values[k].value for k in ("c", "pK", "offset", "slope", "f"))
        curve = KnownCurve(carbonate=f, activities=activities, mol_per_L=c, pK2=pK)
        read = [
            7 + offset + slope * (brentq(one, 1.0, _HIGH_pH, xtol=1e-9) - 7)
            for one in (_excess_at(v, curve) for v in V.tolist())
        ]
        return np.array(read) - y

    values = lmfit.Parameters()
    values.add("c", AMOUNT_MMOL / start_mL)
    for name, start in (("pK", 5.40), ("offset", 0.0), ("slope", 1.0), ("f", 0.001)):
        values.add(name, start)
    found = lmfit.minimize(residuals, values).params
    return float(AMOUNT_MMOL / (found["c"].value * (1 - found["f"].value)))


def _excess_at(v: float, curve: KnownCurve) -> Callable[[float], float]:
    """Return the charge that is too much at a volume, as a function of the pH alone.

    All that does not change with the pH is reckoned before: the root finder asks ten times.
    """
    strong = AMOUNT_MMOL + curve.mol_per_L * v
    total = FLASK_ML + v
    gamma = float(curve.gamma(strong / total))
    k1, k2 = power(10.0, -_PHTHALIC[0]) / gamma, power(10.0, -curve.pK2) / gamma**3
    c1, c2 = power(10.0, -_CARBONIC[0]) / gamma, power(10.0, -_CARBONIC[1]) / gamma**3
    water, kw = total / gamma, power(10.0, -_PKW)
    carbonate = curve.mol_per_L * curve.carbonate * v

    def excess(pH: float) -> float:
        a = power(10.0, -pH)
        p1 = k1 / a
        p2 = p1 * k2 / a
        q1 = c1 / a
        q2 = q1 * c2 / a
        return (
            strong
            + water * (a - kw / a)
            - AMOUNT_MMOL * (p1 + 2 * p2) / (1 + p1 + p2)
            - carbonate * (q1 + 2 * q2) / (1 + q1 + q2)
        )

    return excess

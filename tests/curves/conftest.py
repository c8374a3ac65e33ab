"""A second way to a titration curve: pH by bisection of the charge balance, written for the tests.

It shares nothing with the program: other formulas, other loops, constants at 25 Cel typed here
(pKw 13.995 CRC Handbook after Marshall & Franck 1981; pK as in the tests of equilibria).
"""

from dataclasses import astuple, dataclass

import numpy as np
import pytest

_FOUND = {}
PKW, A = 13.995, 0.5108
PHTHALIC, CARBONIC, TRIS = (2.950, 5.4074), (6.352, 10.329), (8.072,)


def _gammas(ionic):
    root = np.sqrt(ionic)
    one = 10 ** (-A * (root / (1 + root) - 0.3 * ionic))
    return {0: np.ones_like(one), 1: one, 2: one**4}


def _shares(h, pKs, top, gammas):
    """Shares of the species, each [A_j] = K_1..K_j a_H^-j / gamma, from the most protonated on."""
    parts, charges, product = [], [], 1.0
    for lost in range(len(pKs) + 1):
        if lost:
            product = product * 10 ** -pKs[lost - 1]
        parts.append(product * h**-lost * gammas[abs(top)] / gammas[abs(top - lost)])
        charges.append(top - lost)
    parts = np.array(parts)
    return parts / parts.sum(axis=0), np.array(charges)


@dataclass
class Titration:
    """A titration that never happened."""

    system: str
    V0: float
    n: float
    c: float
    f: float = 0.0
    n0: float = 0.0
    activities: bool = True
    pK_shift: float = 0.0

    @property
    def effective_mL(self):
        protons = 2 if self.system == "carbonate-hcl" else 1
        return protons * self.n / (self.c * (1 - self.f))

    def _excess(self, pH, V, ionic):
        """Charges that are too many at this pH, and the ionic strength."""
        g = _gammas(ionic) if self.activities else dict.fromkeys((0, 1, 2), np.ones_like(pH))
        a = 10.0**-pH
        total = self.V0 + V
        h, oh = a / g[1], 10.0**-PKW / a / g[1]
        pKs, top, strong, sign = {
            "khp-naoh": (PHTHALIC, 0, 1, 1),
            "tris-hcl": (TRIS, 1, 0, -1),
            "carbonate-hcl": (CARBONIC, 0, 2, -1),
        }[self.system]
        pKs = tuple(pK + self.pK_shift for pK in pKs)
        shares, charges = _shares(a, pKs, top, g)
        carbonate, carbonate_charges = _shares(a, CARBONIC, 0, g)
        n_carbonate = self.n0 + (self.c * self.f * V if sign > 0 else 0.0)
        balance = (
            sign * self.c * V / total
            + strong * self.n / total
            + h
            - oh
            + (charges @ shares) * self.n / total
            + (carbonate_charges @ carbonate) * n_carbonate / total
        )
        strength = 0.5 * (
            self.c * V / total
            + strong * self.n / total
            + h
            + oh
            + (charges**2 @ shares) * self.n / total
            + (carbonate_charges**2 @ carbonate) * n_carbonate / total
        )
        return balance, strength

    def pH(self, V):
        V = np.asarray(V, float)
        key = (astuple(self), V.tobytes())
        if key not in _FOUND:
            _FOUND[key] = self._pH(V)
        return _FOUND[key].copy()

    def _pH(self, V):
        ionic = np.full(V.shape, 0.03)
        for _ in range(6):
            low, high = np.full(V.shape, 0.5), np.full(V.shape, 13.5)
            for _ in range(52):
                middle = (low + high) / 2
                balance, _ = self._excess(middle, V, ionic)
                low, high = np.where(balance > 0, middle, low), np.where(balance > 0, high, middle)
            middle = (low + high) / 2
            _, ionic = self._excess(middle, V, ionic)
        return middle


def manual_volumes(end_mL, rng=None, *, last=None):
    """Coarse, then finer, then 0.05 mL steps around the end point: about 60 volumes."""
    shift = 0.0 if rng is None else 0.0025 * int(rng.integers(20))
    near = np.arange(end_mL - 0.4, end_mL + 0.6, 0.05) + shift
    close = np.arange(end_mL - 1.6, near[0] - 0.05, 0.2)
    early = np.arange(0.0, close[0] - 0.2, 1.0)
    after = np.concatenate([near[-1] + np.arange(0.2, 1.8, 0.2), near[-1] + np.arange(2.4, 6, 1.0)])
    volumes = np.concatenate([early, close, near, after])
    return np.round(volumes if last is None else volumes[volumes <= last], 4)


@pytest.fixture
def titration():
    return Titration


@pytest.fixture
def volumes_by_hand():
    return manual_volumes


@pytest.fixture
def usual():
    """The three systems at usual sizes."""
    return {
        "khp-naoh": Titration("khp-naoh", 50.0, 2.0, 0.1, f=0.004),
        "tris-hcl": Titration("tris-hcl", 50.0, 2.2, 0.1),
        "carbonate-hcl": Titration("carbonate-hcl", 50.0, 1.0, 0.1),
    }

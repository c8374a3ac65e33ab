"""The volume of titrant as an explicit function of pH, from the charge balance, with derivatives.

Strong ions of the titrant, strong ions of the flask, the analyte's species, carbonate and water:

    V (s c - c f nC + D) = n (nA - z) + n0 nC - V0 D,      D = [H] - [OH]

s is +1 for a base and -1 for an acid as titrant, c its total alkalinity or acidity (mol/L), f the
amount of carbonate per amount of alkalinity in it, n and n0 the amounts (mmol) of analyte and of
carbonate in the flask's V0 mL, nA and nC the mean negative charges of their species, z the strong
cations that came with one analyte. Activity coefficients enter every conditional constant.
"""

from dataclasses import dataclass
from typing import NamedTuple

import numpy as np

from server.chemistry.equilibria import CARBONIC, DAVIES_SLOPE, davies_A, water_pKw
from server.curves.model.systems import AcidBaseSystem
from server.curves.points import Floats

LN10 = float(np.log(10.0))


@dataclass(frozen=True, slots=True)
class Flask:
    """What is known before the fit: V0 in mL, the analyte's amount in mmol, the temperature."""

    volume_mL: float
    amount_mmol: float
    temperature_C: float = 25.0


class Chemistry(NamedTuple):
    """What the curve's shape depends on: pK of the analyte's steps, c, f, carbonate in the flask.

    ``c`` is the titrant's total alkalinity or acidity in mol/L, ``f`` carbonate per alkalinity,
    ``flask_carbonate`` in mmol.
    """

    pK: tuple[float, ...]
    c: float
    f: float = 0.0
    flask_carbonate: float = 0.0


class Volumes(NamedTuple):
    """The volumes that the charge balance asks for at given pH, with what derivatives need.

    ``slope`` is dV/dpH in mL; ``per_denominator`` one over the bracket of the balance; ``D`` and
    ``both`` are [H] less and plus [OH]; ``species`` amounts relative to the most protonated one
    (analyte's steps, carbonate's two), then [H] and [OH]; ``bare``, ``lost``, ``lost2`` for
    analyte and carbonate the share of the most protonated species and the mean and mean square
    of protons lost.
    """

    V: Floats
    slope: Floats
    per_denominator: Floats
    D: Floats
    both: Floats
    species: Floats
    bare: Floats
    lost: Floats
    lost2: Floats


class ChargeBalance:
    """A system in a flask at a temperature, ready to be asked for volumes many times."""

    def __init__(self, system: AcidBaseSystem, flask: Flask, *, activities: bool = True) -> None:
        self.system = system
        self.flask = flask
        self.activities = activities
        t = flask.temperature_C
        self.pK = tuple(step.pK(t) for step in system.analyte)
        self.pKw = water_pKw(t)
        self.davies_A = davies_A(t) * LN10
        """Debye and Hückel's A for natural logarithms."""
        self._lay_out([step.pK(t) for step in CARBONIC])

    def _lay_out(self, carbonic: list[float]) -> None:
        """Lay out the rows of species and the sums taken of them.

        The logarithm of each species' amount relative to the most protonated one is linear in pH
        and in ln(gamma of a single charge), so one product and one exponential give them all.
        """
        top, steps = self.system.top_charge, len(self.pK)
        j = np.arange(1, steps + 1)
        rows = steps + 4
        self._exponents = np.zeros((rows, 3))
        self._exponents[:, 0] = LN10 * np.concatenate([j, [1, 2, -1, 1]])
        self._exponents[:steps, 1] = top**2 - (top - j) ** 2
        self._exponents[steps:, 1] = -1, -4, -1, -1
        self._exponents[steps : steps + 2, 2] = -LN10 * np.cumsum(carbonic)
        self._exponents[-1, 2] = -LN10 * self.pKw
        self._sums = np.zeros((8, rows))
        self._sums[0:2, -2:] = [[1, -1], [1, 1]]
        self._sums[2:8:2, :steps] = j ** np.arange(3)[:, None]
        self._sums[3:8:2, steps : steps + 2] = np.array([1, 2]) ** np.arange(3)[:, None]
        self._steps = steps

    def ln_gamma(self, ionic_strength: Floats) -> Floats:
        """Return the natural logarithm of a single charge's activity coefficient (Davies)."""
        if not self.activities:
            return np.zeros_like(ionic_strength)
        root = np.sqrt(ionic_strength)
        return np.asarray(self.davies_A * (DAVIES_SLOPE * ionic_strength - root / (1 + root)))

    def start_ionic_strength(self, V: Floats, c: float) -> Floats:
        """Return a first guess of the ionic strength in mol/L at volumes V."""
        amount = self.flask.amount_mmol * (self.system.strong_charge + 0.5)
        return np.asarray((0.5 * c * V + 0.5 * amount) / (self.flask.volume_mL + V))

    def at(self, pH: Floats, chemistry: Chemistry, *, ln_gamma: Floats) -> Volumes:
        """Return the volumes at given pH (of activity) and activity coefficients."""
        flask, exponents = self.flask, self._exponents
        total = 0.0
        for at, pK in enumerate(chemistry.pK):
            total += pK
            exponents[at, 2] = -LN10 * total
        variables = np.ones((3, pH.size))
        variables[0], variables[1] = pH, ln_gamma
        species = np.exp(exponents @ variables)
        sums = self._sums @ species
        D, both = sums[0], sums[1]
        bare = 1 / (1 + sums[2:4])
        lost, lost2 = sums[4:6] * bare, sums[6:8] * bare
        spread = lost2 - lost * lost
        n, V0, n0 = flask.amount_mmol, flask.volume_mL, chemistry.flask_carbonate
        carried = chemistry.c * chemistry.f
        nC = lost[1]
        per_denominator = 1 / (D + (self.system.sign * chemistry.c) - carried * nC)
        neutral = n * (self.system.top_charge + self.system.strong_charge)
        V = (n * lost[0] - neutral + n0 * nC - V0 * D) * per_denominator
        moving = n * spread[0] + (n0 + carried * V) * spread[1] + (V0 + V) * both
        slope = moving * (LN10 * per_denominator)
        return Volumes(V, slope, per_denominator, D, both, species, bare, lost, lost2)

    def ionic_strength(self, found: Volumes, chemistry: Chemistry, V_read: Floats) -> Floats:
        """Return the ionic strength in mol/L; the dilution is that of the volumes read."""
        top, n, V0 = self.system.top_charge, self.flask.amount_mmol, self.flask.volume_mL
        squares = top * top + found.lost2[0]
        if top:
            squares = squares - (2 * top) * found.lost[0]
        carbonate = chemistry.flask_carbonate + (chemistry.c * chemistry.f) * V_read
        ions = n * (squares + abs(self.system.strong_charge)) + chemistry.c * V_read
        return np.asarray(0.5 * ((ions + carbonate * found.lost2[1]) / (V0 + V_read) + found.both))

    def per_pK(self, found: Volumes, step: int) -> Floats:
        """Return dV/dpK of one of the analyte's steps (from 0), in mL."""
        return self._per_pK(found, found.species[: self._steps], 0, step) * (
            self.flask.amount_mmol * found.per_denominator
        )

    def per_carbonic_pK(self, found: Volumes, chemistry: Chemistry, step: int) -> Floats:
        """Return dV/dpK of one step (from 0) of the carbonate in titrant and flask water, in mL."""
        carbonate = chemistry.flask_carbonate + chemistry.c * chemistry.f * found.V
        species = found.species[self._steps : -2]
        return self._per_pK(found, species, 1, step) * (carbonate * found.per_denominator)

    @staticmethod
    def _per_pK(found: Volumes, species: Floats, row: int, step: int) -> Floats:
        """Return d(mean protons lost)/dpK.

        Raising the pK of a step makes every species beyond it rarer.
        """
        beyond = species[step:]
        if beyond.shape[0] == 1:
            share = beyond[0] * found.bare[row]
            return np.asarray(share * (LN10 * (found.lost[row] - (step + 1))))
        counts = np.arange(step + 1, species.shape[0] + 1)
        share = beyond.sum(axis=0) * found.bare[row]
        count = (counts @ beyond) * found.bare[row]
        return np.asarray(-LN10 * (count - found.lost[row] * share))

    def per_effective(self, found: Volumes, effective_mL: float) -> Floats:
        """Return dV/d(effective volume) at constant carbonate fraction, without unit."""
        return np.asarray(found.V * (1 - found.D * found.per_denominator) * (1 / effective_mL))

    def per_carbonate(self, found: Volumes, chemistry: Chemistry) -> Floats:
        """Return dV/df at constant effective volume, in mL."""
        share, f = chemistry.c * found.per_denominator, chemistry.f
        gained = (1 - found.D * found.per_denominator) * (-1 / (1 - f))
        return np.asarray(found.V * (gained + share * found.lost[1]))

    def per_flask_carbonate(self, found: Volumes) -> Floats:
        """Return dV/d(carbonate in the flask), in mL/mmol."""
        return np.asarray(found.lost[1] * found.per_denominator)

    def per_flask_volume(self, found: Volumes) -> Floats:
        """Return dV/dV0, without unit."""
        return -found.D * found.per_denominator

    def per_pKw(self, found: Volumes) -> Floats:
        """Return dV/dpKw, in mL."""
        water = self.flask.volume_mL + found.V
        return np.asarray(-LN10 * water * found.species[-1] * found.per_denominator)

"""A probe's curve as a meter would write it, simulated with a fixed seed: KHP with lye."""

from dataclasses import dataclass
from random import Random

from server.chemistry.equilibria import CARBONIC, DAVIES_SLOPE, PHTHALIC, davies_A, water_pKw

_FLASK_ML = 50.0
#: A careful hand sets the burette as well, and a good meter reads as well (common practice).
_VOLUME_SCATTER_ML, _PH_SCATTER = 0.002, 0.004
_BISECTIONS = 44


@dataclass(frozen=True, slots=True)
class Flask:
    """What is in the flask and in the burette, and how the probe reads it.

    ``lye`` is the alkalinity in mol/L, ``carbonate`` its share that is carbonate; ``slope`` and
    ``offset`` turn the pH of the flask into the meter's.
    """

    amount_mmol: float
    lye: float
    celsius: float
    carbonate: float = 0.003
    slope: float = 0.996
    offset: float = 0.015

    @property
    def end_mL(self) -> float:
        """Where the effective alkalinity has met the acid."""
        return self.amount_mmol / (self.lye * (1 - self.carbonate))


def curve_text(flask: Flask, random: Random) -> str:
    """Return the meter's file: a header, then volume and pH line by line, dense at the end."""
    lines = ["Volume (mL);pH"]
    for volume in _volumes(flask.end_mL):
        delivered = max(volume + random.gauss(0, _VOLUME_SCATTER_ML), 0.0)
        pH = 7 + flask.slope * (_pH(flask, delivered) - 7) + flask.offset
        lines.append(f"{volume:.2f};{pH + random.gauss(0, _PH_SCATTER):.2f}")
    return "\n".join(lines) + "\n"


def _volumes(end_mL: float) -> list[float]:
    """Return the volumes at which a hand stops that knows about where the end will be."""
    about = round(end_mL, 1)
    far = [float(n) for n in range(0, int(about) - 2, 2)]
    near = [about + 0.08 * n for n in range(-7, 8)]
    before = [about - 2.0, about - 1.5, about - 1.0, about - 0.7]
    beyond = [about + one for one in (0.7, 1.0, 1.5, 2.0, 2.5, 3.0)]
    return sorted({round(one, 2) for one in [*far, *before, *near, *beyond]})


def _pH(flask: Flask, volume_mL: float) -> float:
    """Return the pH at which all charges cancel, by halving."""
    low, high = 1.0, 13.5
    for _ in range(_BISECTIONS):
        middle = (low + high) / 2
        if _charge(flask, volume_mL, middle) > 0:
            low = middle
        else:
            high = middle
    return (low + high) / 2


def _charge(flask: Flask, volume_mL: float, pH: float) -> float:
    """Return the charges in mmol that are too many positive ones at a pH."""
    t, total = flask.celsius, _FLASK_ML + volume_mL
    alkali = flask.lye * volume_mL
    turned = min(alkali, flask.amount_mmol)
    # potassium, sodium, both anions of the acid, and the lye that is left over
    ions = flask.amount_mmol + alkali + (flask.amount_mmol - turned) + 4 * turned
    strength = (ions + alkali - turned) / 2 / total
    root = strength**0.5
    gamma = 10 ** (-davies_A(t) * (root / (1 + root) - DAVIES_SLOPE * strength))
    a = 10**-pH
    charge = flask.amount_mmol + alkali
    charge += total * (a / gamma - 10 ** (pH - water_pKw(t)) / gamma)
    charge -= flask.amount_mmol * _protons_lost(a, [one.pK(t) for one in PHTHALIC], gamma)
    carbonate = alkali * flask.carbonate
    return float(charge) - carbonate * _protons_lost(a, [one.pK(t) for one in CARBONIC], gamma)


def _protons_lost(a: float, pKs: list[float], gamma: float) -> float:
    """Return the mean negative charge of an acid that is neutral when it has all its protons."""
    shares, product = [1.0], 1.0
    for lost, pK in enumerate(pKs, start=1):
        product *= 10**-pK / a
        shares.append(product / gamma ** (lost * lost))
    return float(sum(n * share for n, share in enumerate(shares)) / sum(shares))

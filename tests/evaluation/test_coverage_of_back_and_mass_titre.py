"""Drawn errors of every input and reading: the interval covers the true value as often as it says.

The truth is reckoned here from the equations of the flask, at the true inputs; the record states
the inputs with their errors, and its readings scatter.
"""

import random

import pytest

from server.evaluation.entrance import evaluate
from tests.evaluation.test_back_and_mass_titre import (
    mass_titre,
    to_standard,
    to_unknown,
    zero_by_blank,
)

LABORATORIES = 600
REPLICATES = 4
SCATTER_ML = 0.008


class Laboratory:
    """One laboratory: its errors of the shared inputs, the same in all its replicates."""

    def __init__(self, seed):
        self.rng = random.Random(seed)

    def true(self, stated, u):
        return self.rng.gauss(stated, u)

    def readings(self, record, volume, **more):
        """Fill in the readings of the burette, 0.0001 mL, each with its own scatter."""
        record["replicates"] = [
            {"burette": [["0.00", f"{self.rng.gauss(volume, SCATTER_ML):.4f}"]], **more}
            for _ in range(REPLICATES)
        ]
        record["repeatability"] = {"from": "replicates"}
        record.get("reference", {}).pop("components", None)
        return record


def standard_with_excess(lab):
    c, w, reference = 0.1, lab.true(1.0, 0.0005), lab.true(0.1, 0.0001)
    pipetted, delta = lab.true(50.0, 0.01), lab.true(0.0, 0.01)
    volume = (c * pipetted - 2.0 * 1000.0 * 0.2 * w / 100.0) / reference
    return c, lab.readings(to_standard(), volume - delta, mass="0.2000")


def unknown_with_excess(lab):
    c, acid, reference = 0.1, lab.true(0.1, 0.0001), lab.true(0.1, 0.0001)
    pipetted, added, delta = lab.true(20.0, 0.01), lab.true(25.0, 0.01), lab.true(0.0, 0.01)
    volume = (acid * added - c * pipetted) / reference
    return c, lab.readings(to_unknown(), volume - delta)


def unknown_with_blank(lab):
    c, reference, pipetted = 0.1, lab.true(0.1, 0.0001), lab.true(20.0, 0.01)
    # an error ten times as large as stated: it cancels in the difference of two fillings
    delta, zero = lab.true(0.0, 0.1), 25.0
    volume = zero - c * pipetted / reference
    record = lab.readings(zero_by_blank(), volume - delta)
    blank = {"value": f"{lab.true(zero - delta, 0.01):.4f}", "unit": "mL", "u": "0.01"}
    record["blank"] = {**blank, "kind": "zero"}
    return c, record


def water_titre(lab):
    titre, w, drift = 5.0, lab.true(0.01, 0.00001), lab.true(20.0, 2.0)
    volume = (1000.0 * 1.5 * w + drift * 5.0 / 1000.0) / titre
    return titre, lab.readings(mass_titre(), volume, mass="1.5000", minutes="5.0")


@pytest.mark.parametrize(
    "of", [standard_with_excess, unknown_with_excess, unknown_with_blank, water_titre]
)
def test_interval_of_new_routes_covers_the_truth_in_95_of_100_laboratories(of):
    covered = 0
    for seed in range(LABORATORIES):
        truth, record = of(Laboratory(seed))
        found = evaluate(record)["concentration"]
        covered += abs(found["value"] - truth) <= found["U"]
    # the binomial's standard deviation is 0.9 %; k is not below 2, which covers 95.4 %
    assert covered / LABORATORIES == pytest.approx(0.95, abs=0.03)

import math
import random

import numpy as np
import pytest

from server.evaluation.published import end_gauge
from server.metrology.propagation import Input, propagate, welch_satterthwaite


def test_propagate_end_gauge_gives_the_guide_s_figures():
    # JCGM 100:2008, H.1: l = 50 000 838 nm, u = 32 nm, ν_eff = 16 (H.1.6 truncates 16.7)
    found = end_gauge()
    assert round(found.value) == 50_000_838
    assert round(found.u) == 32
    assert math.floor(found.dof) == 16


def test_propagate_same_root_adds_with_its_sign():
    # JCGM 100, 5.2.2 with r = 1: one burette twice in a product doubles, in a quotient cancels
    inputs = [Input("a", 10.0, 0.01, id="burette"), Input("b", 10.0, 0.01, id="burette")]
    product = propagate(lambda x: x["a"] * x["b"], inputs)
    quotient = propagate(lambda x: x["a"] / x["b"], inputs)
    assert product.u / product.value == pytest.approx(0.002, rel=1e-12)
    assert quotient.u == pytest.approx(0.0, abs=1e-15)


def test_propagate_one_root_with_two_dofs_takes_the_smaller():
    inputs = [Input("a", 1.0, 0.3, dof=9, id="r"), Input("b", 1.0, 0.4, dof=4, id="r")]
    assert propagate(lambda x: x["a"] + x["b"], inputs).dof == pytest.approx(4.0)


def test_welch_satterthwaite_without_finite_dof_is_infinite():
    assert welch_satterthwaite(1.0, [(1.0, None)]) is None
    assert welch_satterthwaite(0.0, [(0.0, 5.0)]) is None


def test_propagate_random_models_agree_with_the_uncertainties_package_to_1e_12():
    # uncertainties 3 (E. Lebigot): automatic derivatives of the same expression
    from uncertainties import ufloat
    from uncertainties.umath import exp

    rng = random.Random(4)
    for _ in range(200):
        values = {name: rng.uniform(0.5, 2.0) for name in "abcdefghijkl"}
        inputs = [Input(n, v, rng.uniform(1e-5, 1e-2)) for n, v in values.items()]

        def model(x, e):
            top = x["a"] * x["b"] ** 2 * e(x["c"] / 10) + x["d"] * x["e"]
            return top / (x["f"] + x["g"] * x["h"]) - x["i"] * x["j"] / x["k"] ** 3 + x["l"]

        found = propagate(lambda x, m=model: m(x, np.exp), inputs)
        other = model({one.name: ufloat(one.value, one.u) for one in inputs}, exp)
        assert found.value == pytest.approx(other.nominal_value, rel=1e-14)
        assert found.u == pytest.approx(other.std_dev, rel=1e-12)


def test_propagate_random_models_agree_with_gtc_on_dof():
    # GTC (Measurement Standards Laboratory of New Zealand): Welch-Satterthwaite of its own
    import GTC

    rng = random.Random(5)
    for _ in range(200):
        inputs = [
            Input(
                n, rng.uniform(0.5, 2.0), rng.uniform(1e-4, 1e-2), dof=rng.choice([2.5, 4, 9, 30])
            )
            for n in "abcd"
        ]
        found = propagate(lambda x: x["a"] * x["b"] / (x["c"] + x["d"]), inputs)
        x = {one.name: GTC.ureal(one.value, one.u, one.dof) for one in inputs}
        other = x["a"] * x["b"] / (x["c"] + x["d"])
        assert found.u == pytest.approx(other.u, rel=1e-12)
        assert found.dof == pytest.approx(GTC.dof(other), rel=1e-9)

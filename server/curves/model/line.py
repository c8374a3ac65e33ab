"""The fitted curve as a line: the reading that the model has at each volume, densely."""

import numpy as np

from server.curves.model.fit import ModelFit, PIVOT_pH
from server.curves.points import Floats


def fitted_line(fit: ModelFit, *, size: int = 400) -> tuple[Floats, Floats]:
    """Return volumes in mL and readings in pH along the fitted curve, between its end points.

    Even steps of pH make the line dense where the curve is steep; activity coefficients are those
    of the fit, interpolated. A probe's slope and offset are in it, a lag of the probe is not.
    """
    latent = fit.latent_pH
    order = np.argsort(latent)
    pH = np.linspace(latent[order[0]], latent[order[-1]], size)
    ln_gamma = np.interp(pH, latent[order], fit.ln_gamma[order])
    V = fit.balance.at(pH, fit.chemistry, ln_gamma=ln_gamma).V
    reading = PIVOT_pH + fit.value("offset") + fit.value("slope") * (pH - PIVOT_pH)
    ahead = np.argsort(V, kind="stable")
    return V[ahead], reading[ahead]

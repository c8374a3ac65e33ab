"""Coverage factors (JCGM 100, G.3 and G.6)."""

from functools import lru_cache

#: Printed certificates never state less than two standard uncertainties (common practice).
LEAST_PRINTED = 2.0


@lru_cache(maxsize=1024)
def coverage_factor(dof: float | None, coverage: float) -> float:
    """Return t_p(ν), the two-sided quantile of Student's t; ν is not truncated, None is ∞."""
    from scipy.special import ndtri, stdtrit  # noqa: PLC0415 - half of a bare start-up

    probability = 0.5 * (1.0 + coverage)
    return float(ndtri(probability) if dof is None else stdtrit(dof, probability))


def printed_factor(dof: float | None, coverage: float) -> float:
    """Return the k that is printed: t_p(ν), but 2 at least."""
    return max(LEAST_PRINTED, coverage_factor(dof, coverage))

"""Rounding for print: U to two significant digits, the value to the same decimal, half to even."""

from decimal import ROUND_HALF_EVEN, Decimal

SIGNIFICANT = 2


def rounded_pair(value: float, U: float) -> tuple[str, str]:
    """Return value and expanded uncertainty as they are printed (JCGM 100, 7.2.6).

    ``U`` gets two significant digits and the value the same decimal; digits are those of the
    shortest text of the double, ties go to even. A U of 0 leaves the value as it stands.
    """
    if U <= 0:
        return repr(value), "0"
    exponent = rounding_exponent(U)
    return _to(value, exponent), _to(U, exponent)


def rounding_exponent(u: float, *, digits: int = SIGNIFICANT) -> int:
    """Return the power of ten of the last digit kept when u keeps so many significant digits.

    A u that rounds up to one digit more (0.0996 to 0.10) keeps its digits there.
    """
    number = Decimal(repr(u))
    exponent = number.adjusted() - digits + 1
    rounded = number.quantize(Decimal(1).scaleb(exponent), rounding=ROUND_HALF_EVEN)
    return rounded.adjusted() - digits + 1


def rounded(value: float, exponent: int) -> str:
    """Return a value rounded half to even at a power of ten, never in exponent form."""
    return _to(value, exponent)


def significant(value: float, digits: int = SIGNIFICANT) -> str:
    """Return a value with so many significant digits, in plain digits where they are short."""
    if value == 0:
        return "0"
    exponent = rounding_exponent(abs(value), digits=digits)
    plain = _to(value, exponent)
    return plain if -8 < exponent < 7 else f"{value:.{digits - 1}e}"


def printed_k(k: float) -> str:
    """Return a coverage factor with one decimal, or with two where they say more."""
    two = f"{k:.2f}"
    return two.removesuffix("0")


def report(value: float, U: float, unit: str, k: float) -> str:
    """Return a result as printed, such as ``0.10214 ± 0.00020 mol/L (k = 2.0)``."""
    shown, uncertainty = rounded_pair(value, U)
    return f"{shown} ± {uncertainty} {unit} (k = {printed_k(k)})"


def _to(value: float, exponent: int) -> str:
    quantized = Decimal(repr(value)).quantize(Decimal(1).scaleb(exponent), rounding=ROUND_HALF_EVEN)
    return f"{quantized:f}"

"""Numbers as words of the page: few digits, the signs of print."""

from __future__ import annotations

import math

_RAISED = str.maketrans("-0123456789", "⁻⁰¹²³⁴⁵⁶⁷⁸⁹")


def number(value: float, digits: int = 3) -> str:
    """A figure for the page: few digits, no exponent in the common range."""
    if not math.isfinite(value):
        return "-"
    if value == 0.0:
        return "0"
    size = abs(value)
    power = math.floor(math.log10(size))
    if -3 <= power < 6:
        return f"{value:.{max(0, digits - 1 - power)}f}".replace("-", "−")
    mantissa = f"{value / 10.0**power:.{digits - 1}f}".replace("-", "−")
    return f"{mantissa} × 10{str(power).translate(_RAISED)}"


def percent(share: float) -> str:
    """A share in per cent."""
    return f"{number(100.0 * share, 2)} %"
